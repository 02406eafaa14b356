import type { KernelRecord } from './recording.js';

/**
 * What the engines have to do, whichever trace it comes from. `peek` leaves the next access of an engine in the fields; `take`
 * marks a leading part of it as issued. Times are ps; an engine's number counts over all dies.
 */
export interface Work {
  address: number; // of the peeked access
  bytes: number; // what is left of it
  op: number; // READ or WRITE
  kernel: number;
  readyPs: number; // since when only the window or an issue slot held it back
  waitedPs: number; // how long it was held back before that
  waitedFor: number; // class of the bandwidth stack for that wait

  /** Whether the engine has an access to issue at `now`; when not, something wakes it later. */
  peek(engine: number, now: number): boolean;
  /** Issues the first `bytes` of the peeked access and returns a tag to hand back with the answer. */
  take(bytes: number, now: number): number;
  /** An issued part was answered. */
  returned(tag: number, op: number, now: number): void;
  /** An alarm set by this work has gone off. */
  alarm(context: number, now: number): void;
  /** Whether everything has been issued, answered and computed. */
  finished(): boolean;
  /** Whether one more clock edge can be handled without reading on; when not, `refill` first. */
  enough(): boolean;
  refill(): Promise<void>;

  readonly kernels: KernelRecord[];
  readonly computePs: Float64Array; // per engine
  readonly lastEventPs: number; // end of the last compute
}

/** Which engines may have something to issue; shared by the work, which wakes them, and the front end, which serves them. */
export class Runnable {
  readonly flags: Uint8Array; // per engine

  constructor(engines: number) {
    this.flags = new Uint8Array(engines).fill(1);
  }

  wake(engine: number): void {
    this.flags[engine] = 1;
  }
}

/** An empty record of a kernel's doings. */
export function kernelRecord(name: string): KernelRecord {
  return {
    name,
    startPs: -1,
    endPs: 0,
    flops: 0,
    computePs: 0,
    readBytes: 0,
    writeBytes: 0,
    movedReadBytes: 0,
    movedWriteBytes: 0,
    requests: 0,
    launches: 0,
  };
}
