/** The files of traces: opened, read whole or ahead, and watched, since a file that changes while it is read makes no sense. */
import { createReadStream, type Stats } from 'node:fs';
import { stat } from 'node:fs/promises';
import { InputError } from '../errors.js';
import { HAS_THREAD, hashAhead, readAhead, WORTH_A_THREAD } from './ahead.js';
import { CHUNK, decode, type FileHash, formOf, hashed, unreadable } from './bytes.js';

export interface ByteSource {
  readonly input: AsyncIterable<Buffer> | undefined; // what file '-' reads
  readonly expected: string; // what kind of file would do, for errors
  /** A buffer may be filled again once the next is asked for: the reader keeps none. */
  readonly reuse?: boolean;
}

/** The bytes of a text file, decompressed when it is gzip or zstd. Throws InputError when there is none to read, or SystemError. */
export async function openBytes(file: string, source: ByteSource): Promise<AsyncIterable<Buffer>> {
  return (await openHashed(file, source)).bytes;
}

/** The same and, after the last of the bytes, the hash of the file. */
export async function openHashed(
  file: string,
  { input, expected, reuse = false }: ByteSource,
): Promise<{ readonly bytes: AsyncIterable<Buffer>; readonly hash: FileHash; fraction(): number }> {
  if (file === '-') {
    if (input === undefined) {
      throw new InputError({
        where: { file },
        found: "'-', and no standard input to read",
        expected: 'a stream handed in with it',
        hint: 'name a file',
      });
    }
    const { bytes, hash } = hashed(input, file);
    return { bytes: decode(bytes, file, 'by content'), hash, fraction: () => Number.NaN };
  }
  const before = await mustBeFile(file, expected);
  const form = formOf(file);
  const ahead = reuse && form === 'plain' && before.isFile() && before.size >= WORTH_A_THREAD && HAS_THREAD;
  const { bytes, hash } = ahead ? readAhead(file) : hashed(createReadStream(file, { highWaterMark: CHUNK }), file);
  let read = 0;
  async function* counted(): AsyncGenerator<Buffer> {
    for await (const chunk of bytes) {
      read += chunk.length;
      yield chunk;
    }
    await mustBeUnchanged(file, before);
  }
  const fraction = (): number => (before.isFile() && before.size > 0 ? Math.min(1, read / before.size) : Number.NaN);
  return { bytes: decode(counted(), file, form), hash, fraction };
}

/** A hash that may be given up before it is known. */
export interface ColumnHash extends FileHash {
  close(): Promise<void>;
}

/** The hash of a file that is read by others, from parts all over it, until `hex` is asked for. */
export function hashOf(file: string, before: Stats): ColumnHash {
  if (HAS_THREAD && before.size >= WORTH_A_THREAD) {
    const ahead = hashAhead(file);
    return {
      ...ahead,
      hex: async () => {
        const hex = await ahead.hex();
        await mustBeUnchanged(file, before);
        return hex;
      },
    };
  }
  return {
    hex: async () => {
      const { bytes, hash } = hashed(createReadStream(file, { highWaterMark: CHUNK }), file);
      for await (const _ of bytes);
      await mustBeUnchanged(file, before);
      return hash.hex();
    },
    close: async () => {},
  };
}

/** Throws InputError when there is no such file, SystemError when the system will not say. */
export async function mustBeFile(file: string, expected: string): Promise<Stats> {
  let found = 'a directory';
  try {
    const found = await stat(file);
    if (!found.isDirectory()) return found;
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? '';
    if (!['ENOENT', 'ENOTDIR', 'ENAMETOOLONG', 'ELOOP', 'ERR_INVALID_ARG_VALUE'].includes(code))
      throw unreadable(file, error);
    found = 'no such file';
  }
  throw new InputError({
    where: { file },
    found,
    expected,
    hint: found === 'a directory' ? 'name a file in it' : 'check the path',
  });
}

/** Throws InputError when a file is no longer what it was when it was opened. */
async function mustBeUnchanged(file: string, before: Stats): Promise<void> {
  if (!before.isFile()) return; // a pipe or a device has neither size nor age
  const now = await stat(file).catch(() => null); // removed meanwhile: what was open was read whole
  if (now === null || (now.size === before.size && now.mtimeMs === before.mtimeMs)) return;
  const grew = now.size - before.size;
  throw new InputError({
    where: { file },
    found:
      grew === 0
        ? 'a file that was written to while it was read'
        : `a file that ${grew > 0 ? 'grew' : 'shrank'} by ${Math.abs(grew)} bytes while it was read`,
    expected: 'a file that nobody writes to',
    hint: 'wait until it is written, or copy it and read the copy',
  });
}
