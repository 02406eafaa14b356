/** Zstandard data (RFC 8878) through the `zstd` command, since the runtime has no such decoder and encoder in every version. */
import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { Readable } from 'node:stream';
import { InputError, SystemError } from '../errors.js';

/** The first four bytes of a frame. */
export const ZSTD_MAGIC = Buffer.from([0x28, 0xb5, 0x2f, 0xfd]);

/** Decompresses. Throws InputError when the data is damaged or the command is not there. */
export async function* unzstd(source: AsyncIterable<Buffer>, file: string): AsyncGenerator<Buffer> {
  yield* through(['-d', '-c', '-q', '--no-progress'], source, file, (said) => {
    const early = /premature|incomplete|unexpected end/i.test(said);
    return new InputError({
      where: { file },
      found: early ? 'zstd data that ends too early' : `damaged zstd data (${said})`,
      expected: 'a whole zstd file',
      hint: 'the file was cut short or changed on its way; copy or write it again',
    });
  });
}

/** Compresses. Throws InputError when the command is not there, SystemError when it fails. */
export async function* zstd(source: AsyncIterable<string | Uint8Array>, file: string): AsyncGenerator<Buffer> {
  yield* through(
    ['-c', '-q', '--no-progress'],
    source,
    file,
    (said) => new SystemError(`${file}: zstd failed: ${said}`),
  );
}

/** What the command makes of `source`. An error of the source is thrown as it is. */
async function* through(
  args: readonly string[],
  source: AsyncIterable<string | Uint8Array>,
  file: string,
  failed: (said: string) => Error,
): AsyncGenerator<Buffer> {
  const child = spawn('zstd', args, { stdio: ['pipe', 'pipe', 'pipe'] });
  let missing = false;
  let sourceError: unknown = null;
  let said = '';
  child.stderr.setEncoding('utf8').on('data', (text: string) => {
    if (said.length < 1000) said += text;
  });
  const closed = once(child, 'close').catch(() => {
    missing = true; // 'error': the command could not be started
    return [];
  });
  const input = Readable.from(source, { objectMode: true });
  input.on('error', (error) => {
    sourceError = error;
    child.kill();
  });
  child.stdin.on('error', () => {}); // it ended before its input did: its exit code says why
  input.pipe(child.stdin);
  try {
    for await (const chunk of child.stdout) yield chunk as Buffer;
    const [code] = (await closed) as [number | null];
    if (sourceError !== null) throw sourceError;
    if (missing) {
      throw new InputError({
        where: { file },
        found: 'zstd data, and no command zstd on this system',
        expected: 'the command zstd on the path',
        hint: 'install it, or use gzip (.csv.gz)',
      });
    }
    if (code !== 0)
      throw failed(
        said
          .trim()
          .split('\n')[0]
          .replace(/^zstd: /, '') || `exit code ${code}`,
      );
  } finally {
    input.destroy();
    child.kill();
  }
}
