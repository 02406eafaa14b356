/**
 * The thread that reads a file ahead of its user: fills the buffers it is given, hashes them and hands them over, in order. Without
 * buffers it only hashes. Messages in: buffers to fill (again). Messages out: `Piece`.
 */
import { createHash } from 'node:crypto';
import { closeSync, openSync, readSync } from 'node:fs';
import { parentPort, workerData } from 'node:worker_threads';

/** A filled buffer, the end of the file, or what the system had against it. */
export type Piece =
  | { readonly kind: 'bytes'; readonly buffer: ArrayBuffer; readonly length: number }
  | { readonly kind: 'end'; readonly hash: string }
  | { readonly kind: 'failure'; readonly code: string; readonly message: string };

const { file, hashOnly } = workerData as { readonly file: string; readonly hashOnly: boolean };
const port = parentPort;
if (port === null) throw new Error('this file is run by ahead.ts, as a thread');
const hash = createHash('sha256');

try {
  const fd = openSync(file, 'r');
  const fill = (buffer: ArrayBuffer): number => {
    const length = readSync(fd, new Uint8Array(buffer), 0, buffer.byteLength, null);
    if (length > 0) hash.update(new Uint8Array(buffer, 0, length));
    return length;
  };
  const finish = (): void => {
    closeSync(fd);
    port.postMessage({ kind: 'end', hash: hash.digest('hex') } satisfies Piece);
    port.close();
  };
  if (hashOnly) {
    const buffer = new ArrayBuffer(1 << 20);
    while (fill(buffer) > 0);
    finish();
  } else {
    port.on('message', (buffer: ArrayBuffer) => {
      try {
        const length = fill(buffer);
        if (length > 0) port.postMessage({ kind: 'bytes', buffer, length } satisfies Piece, [buffer]);
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
