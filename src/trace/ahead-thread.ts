/**
 * The thread that reads a file ahead of its user: fills shared buffers, hashes them and hands them over, in order. Without buffers it
 * only hashes. Messages in: the number of a buffer to fill (again). Messages out: `Piece`.
 */
import { createHash } from 'node:crypto';
import { closeSync, openSync, readSync } from 'node:fs';
import { parentPort, workerData } from 'node:worker_threads';

/** The number of a filled buffer, the end of the file, or what the system had against it. */
export type Piece =
  | { readonly kind: 'bytes'; readonly buffer: number; readonly length: number }
  | { readonly kind: 'end'; readonly hash: string }
  | { readonly kind: 'failure'; readonly code: string; readonly message: string };

const { file, buffers } = workerData as { readonly file: string; readonly buffers: readonly SharedArrayBuffer[] };
const port = parentPort;
if (port === null) throw new Error('this file is run by ahead.ts, as a thread');
const hash = createHash('sha256');

try {
  const fd = openSync(file, 'r');
  const fill = (buffer: Uint8Array): number => {
    const length = readSync(fd, buffer, 0, buffer.length, null);
    if (length > 0) hash.update(buffer.subarray(0, length));
    return length;
  };
  const finish = (): void => {
    closeSync(fd);
    port.postMessage({ kind: 'end', hash: hash.digest('hex') } satisfies Piece);
    port.close();
  };
  if (buffers.length === 0) {
    const buffer = new Uint8Array(1 << 20);
    while (fill(buffer) > 0);
    finish();
  } else {
    const views = buffers.map((buffer) => new Uint8Array(buffer));
    port.on('message', (buffer: number) => {
      try {
        const length = fill(views[buffer]);
        if (length > 0) port.postMessage({ kind: 'bytes', buffer, length } satisfies Piece);
        else finish();
      } catch (error) {
        fail(error);
      }
    });
  }
} catch (error) {
  fail(error);
}

function fail(error: unknown): void {
  const { code = '', message } = error as NodeJS.ErrnoException;
  port?.postMessage({ kind: 'failure', code, message } satisfies Piece);
  port?.close();
}
