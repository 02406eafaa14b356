/** Reads a large file on a thread of its own, a few buffers ahead of its user, and hashes it there. */
import { existsSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { Worker } from 'node:worker_threads';
import { SystemError } from '../errors.js';
import type { Piece } from './ahead-thread.js';
import type { FileHash } from './bytes.js';

const BUFFERS = 4; // two would do when both threads go at one speed; more even out what differs
const BUFFER_BYTES = 1 << 20;
/** Files smaller than this are read by their user: a thread takes about 40 ms to start, in which 60 MB could be read. */
export const WORTH_A_THREAD = 32 << 20;

const SCRIPT = new URL('./ahead-thread.js', import.meta.url);
/** False where the program runs from its sources, without having been built. */
export const HAS_THREAD: boolean = existsSync(fileURLToPath(SCRIPT));

/** Bytes of a file and, after the last of them, its hash. Each buffer is valid until the next is asked for: then it is filled again. */
export function readAhead(file: string): { readonly bytes: AsyncGenerator<Buffer>; readonly hash: FileHash } {
  let found = '';
  async function* bytes(): AsyncGenerator<Buffer> {
    // shared, not handed over: once any buffer has been detached, every access to any is checked for it, at a third of the speed
    const buffers = Array.from({ length: BUFFERS }, () => new SharedArrayBuffer(BUFFER_BYTES));
    const reader = new Reader(file, buffers);
    try {
      for (let i = 0; i < BUFFERS; i++) reader.give(i);
      for (;;) {
        const piece = await reader.next();
        if (piece.kind === 'end') {
          found = piece.hash;
          return;
        }
        if (piece.kind === 'failure') throw failed(file, piece);
        yield Buffer.from(buffers[piece.buffer], 0, piece.length);
        reader.give(piece.buffer);
      }
    } finally {
      await reader.close();
    }
  }
  return { bytes: bytes(), hash: { hex: async () => found } };
}

/** The hash of a file that others read: begun now, waited for when it is asked for. */
export function hashAhead(file: string): FileHash & { readonly close: () => Promise<void> } {
  const reader = new Reader(file, []);
  return {
    hex: async () => {
      const piece = await reader.next();
      await reader.close();
      if (piece.kind === 'end') return piece.hash;
      throw piece.kind === 'failure' ? failed(file, piece) : new Error(`${file}: bytes where a hash was expected`);
    },
    close: () => reader.close(),
  };
}

/** The thread, and what has come from it. */
class Reader {
  private readonly worker: Worker;
  private readonly come: Piece[] = [];
  private failure: Error | null = null;
  private wake: () => void = () => {};

  constructor(file: string, buffers: readonly SharedArrayBuffer[]) {
    this.worker = new Worker(SCRIPT, { workerData: { file, buffers } });
    this.worker.unref(); // only who waits for it keeps the process
    this.worker.on('message', (piece: Piece) => {
      this.come.push(piece);
      this.wake();
    });
    this.worker.on('error', (error) => {
      this.failure = error;
      this.wake();
    });
  }

  give(buffer: number): void {
    this.worker.postMessage(buffer);
  }

  async next(): Promise<Piece> {
    for (;;) {
      const piece = this.come.shift();
      if (piece !== undefined) return piece;
      if (this.failure !== null) throw this.failure;
      this.worker.ref();
      await new Promise<void>((resolve) => {
        this.wake = resolve;
      });
      this.worker.unref();
    }
  }

  async close(): Promise<void> {
    await this.worker.terminate();
  }
}

function failed(file: string, { code, message }: { readonly code: string; readonly message: string }): SystemError {
  return new SystemError(`${file}: cannot be read: ${message}`, { cause: Object.assign(new Error(message), { code }) });
}
