/** The bytes of a trace on their way to its reader: hashed as they are stored, then decompressed if they are gzip or zstd. */
import { createHash } from 'node:crypto';
import { pipeline } from 'node:stream';
import { createGunzip } from 'node:zlib';
import { InputError, SystemError } from '../errors.js';
import { unzstd, ZSTD_MAGIC } from './zstd.js';

export const CHUNK = 1 << 20; // bytes read or un-gzipped at a time

/** sha256 of the bytes of a file as they are stored; asked for when the last of them has been read. */
export interface FileHash {
  hex(): Promise<string>;
}

/** Bytes of a stream and, after the last of them, their hash. Throws SystemError when the source cannot be read on. */
export function hashed(
  source: AsyncIterable<Buffer>,
  file: string,
): { readonly bytes: AsyncGenerator<Buffer>; readonly hash: FileHash } {
  const hash = createHash('sha256');
  async function* bytes(): AsyncGenerator<Buffer> {
    try {
      for await (const chunk of source) {
        hash.update(chunk);
        yield chunk;
      }
    } catch (error) {
      throw unreadable(file, error);
    }
  }
  return { bytes: bytes(), hash: { hex: async () => hash.digest('hex') } };
}

/** The error for a file the system will not let us read. */
export function unreadable(file: string, error: unknown): SystemError {
  return new SystemError(`${file}: cannot be read: ${(error as Error).message}`, { cause: error });
}

/** How a file is compressed. */
export type Form = 'plain' | 'gzip' | 'zstd';
const ENDINGS: Readonly<Record<Form, string>> = { plain: '', gzip: '.gz', zstd: '.zst' };

/** The form a file's name promises. */
export function formOf(file: string): Form {
  return /\.gz$/i.test(file) ? 'gzip' : /\.zst$/i.test(file) ? 'zstd' : 'plain';
}

/** Looks at the first bytes, which in gzip are 1f 8b (RFC 1952), in zstd 28 b5 2f fd (RFC 8878), and decompresses or not. */
export async function* decode(
  source: AsyncGenerator<Buffer>,
  file: string,
  promised: Form | 'by content',
): AsyncGenerator<Buffer> {
  let head = Buffer.alloc(0);
  while (head.length < 4) {
    const next = await source.next();
    if (next.done) break;
    head = Buffer.concat([head, next.value]);
  }
  const form: Form =
    head[0] === 0x1f && head[1] === 0x8b ? 'gzip' : head.subarray(0, 4).equals(ZSTD_MAGIC) ? 'zstd' : 'plain';
  if (head.length > 0 && form !== promised && promised !== 'by content') {
    await source.return(undefined);
    throw new InputError({
      where: { file },
      found:
        form === 'plain'
          ? `a file named ${ENDINGS[promised]} that is not ${promised}`
          : `${form} data in a file not named ${ENDINGS[form]}`,
      expected: form === 'plain' ? `${promised} data` : `plain text, or a name that ends in ${ENDINGS[form]}`,
      hint: form === 'plain' ? 'rename it to .csv, or compress it' : `rename it to .csv${ENDINGS[form]}`,
    });
  }
  const whole = withHead(head, source);
  if (form === 'gzip') yield* gunzipped(whole, file);
  else if (form === 'zstd') yield* unzstd(whole, file);
  else yield* whole;
}

async function* gunzipped(source: AsyncIterable<Buffer>, file: string): AsyncGenerator<Buffer> {
  const gunzip = createGunzip({ chunkSize: CHUNK });
  pipeline(source, gunzip, () => {}); // its errors arrive in the loop below
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
