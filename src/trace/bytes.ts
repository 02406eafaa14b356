/** The bytes of a trace on their way to the splitter: hashed as they are stored, then un-gzipped if they are gzip. */
import type { Hash } from 'node:crypto';
import { pipeline } from 'node:stream';
import { createGunzip } from 'node:zlib';
import { InputError, SystemError } from '../errors.js';

export const CHUNK = 1 << 20; // bytes read or un-gzipped at a time

/** Feeds a hash with the bytes that pass. Throws SystemError when the source cannot be read on. */
export async function* hashed(source: AsyncIterable<Buffer>, file: string, hash: Hash): AsyncGenerator<Buffer> {
  try {
    for await (const chunk of source) {
      hash.update(chunk);
      yield chunk;
    }
  } catch (error) {
    throw unreadable(file, error);
  }
}

/** The error for a file the system will not let us read. */
export function unreadable(file: string, error: unknown): SystemError {
  return new SystemError(`${file}: cannot be read: ${(error as Error).message}`, { cause: error });
}

/** Looks at the first two bytes, which in gzip are 1f 8b (RFC 1952), and un-gzips or not. */
export async function* decode(
  source: AsyncGenerator<Buffer>,
  file: string,
  form: 'gzip' | 'plain' | 'by content',
): AsyncGenerator<Buffer> {
  let head = Buffer.alloc(0);
  while (head.length < 2) {
    const next = await source.next();
    if (next.done) break;
    head = Buffer.concat([head, next.value]);
  }
  const zipped = head.length >= 2 && head[0] === 0x1f && head[1] === 0x8b;
  if (head.length > 0 && zipped !== (form === 'gzip') && form !== 'by content') {
    await source.return(undefined);
    throw new InputError({
      where: { file },
      found: zipped ? 'gzip data in a file not named .gz' : 'a file named .gz that is not gzip',
      expected: zipped ? 'plain text, or a name that ends in .gz' : 'gzip data',
      hint: zipped ? 'rename it to .csv.gz' : 'rename it to .csv, or compress it',
    });
  }
  const whole = withHead(head, source);
  if (!zipped) {
    yield* whole;
    return;
  }
  const gunzip = createGunzip({ chunkSize: CHUNK });
  pipeline(whole, gunzip, () => {}); // its errors arrive in the loop below
  try {
    for await (const chunk of gunzip) yield chunk;
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    if (code !== 'Z_BUF_ERROR' && code !== 'Z_DATA_ERROR') throw error;
    throw new InputError({
      where: { file },
      found:
        code === 'Z_BUF_ERROR' ? 'gzip data that ends too early' : `damaged gzip data (${(error as Error).message})`,
      expected: 'a whole gzip file',
      hint: 'the file was cut short or changed on its way; copy or write it again',
    });
  }
}

/** Puts back what was taken to look at; closes the source when it is left early. */
async function* withHead(head: Buffer, source: AsyncGenerator<Buffer>): AsyncGenerator<Buffer> {
  try {
    if (head.length > 0) yield head;
    yield* source;
  } finally {
    await source.return(undefined);
  }
}
