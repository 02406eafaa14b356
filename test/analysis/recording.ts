import { Delays } from '../../src/analysis/index.js';
import type { Package } from '../../src/config/package.js';
import {
  type KernelRecord,
  type Recording,
  type SampleBlock,
  STACK_CLASSES,
  STAGES,
  type StackClass,
} from '../../src/engine/recording.js';
import type { Kernel, KernelTrace } from '../../src/trace/batch.js';
import { smallPackage } from '../helpers/packages.js';

/** Finished requests for a collector: op, kernel, useful bytes and the delays of the eight stages, ps. */
export type Request = readonly [op: 0 | 1 | 2, kernel: number, bytes: number, stages: readonly number[]];

export function block(requests: readonly Request[]): SampleBlock {
  return {
    count: requests.length,
    op: Uint8Array.from(requests, ([op]) => op),
    kernel: Int32Array.from(requests, ([, kernel]) => kernel),
    channel: new Int32Array(requests.length),
    bytes: Float64Array.from(requests, ([, , bytes]) => bytes),
    donePs: new Float64Array(requests.length),
    stages: STAGES.map((_, stage) => Float64Array.from(requests, (request) => request[3][stage])),
  };
}

export function delaysOf(requests: readonly Request[]): Delays {
  const delays = new Delays();
  delays.add(block(requests));
  return delays;
}

export function kernelRow(name: string, over: Partial<Kernel> = {}): Kernel {
  return {
    name,
    line: 1,
    stream: 0,
    format: '',
    flops: 0,
    readBytes: 0,
    writeBytes: 0,
    read: null,
    write: null,
    tileBytes: 1,
    die: -1,
    repeat: 1,
    estimatePs: 0,
    ...over,
  };
}

export function traceOf(kernels: readonly Kernel[]): KernelTrace {
  return {
    kind: 'kernel',
    file: 'made.csv',
    streams: ['main'],
    kernels,
    facts: { rows: kernels.length, skippedRows: 0, hash: 'ab12' },
  };
}

export function kernelDone(name: string, over: Partial<KernelRecord> = {}): KernelRecord {
  return {
    name,
    startPs: 0,
    endPs: 1_000_000,
    flops: 0,
    computePs: 0,
    readBytes: 0,
    writeBytes: 0,
    movedReadBytes: 0,
    movedWriteBytes: 0,
    requests: 0,
    launches: 1,
    ...over,
  };
}

/**
 * A run written by hand on the small package (one stack, 32 pseudo-channels, 4 engines): 1 us = 1600 clocks of 625 ps. Two kernels;
 * `gather` reads 128 atoms of 32 B for 2,048 useful bytes, `product` writes 64 and computes for half of the time on all engines.
 */
export interface Made {
  readonly pkg: Package;
  readonly trace: KernelTrace;
  readonly recording: Recording;
  readonly delays: Delays;
}

export function made(): Made {
  const pkg = smallPackage();
  const total = 32;
  const elapsedCk = 1600;
  const each = (value: number): Float64Array => new Float64Array(total).fill(value);
  const perBank = (value: number): Float64Array => new Float64Array(2 * total).fill(value);
  const reads = each(4); // x 32 = 128 atoms = 4,096 B
  const writes = each(2); // 64 atoms = 2,048 B
  const stack = new Float64Array(total * STACK_CLASSES.length);
  const parts: Partial<Record<StackClass, number>> = {
    read_data: 8,
    write_data: 4,
    refresh: 160,
    row_cycle: 28,
    starved_compute: 1000,
    starved_drain: 400,
  };
  for (let p = 0; p < total; p++) {
    STACK_CLASSES.forEach((name, c) => {
      stack[p * STACK_CLASSES.length + c] = parts[name] ?? 0;
    });
  }
  const delays = delaysOf([
    [0, 0, 1024, [0, 100, 9000, 300, 10_000, 11_250, 50, 8000]], // 38,700 ps
    [2, 0, 1024, [10, 0, 9000, 0, 0, 5000, 0, 8000]], // 22,010 ps
    [1, 1, 2048, [0, 40, 9000, 5000, 0, 0, 0, 8000]], // 22,040 ps to its acknowledgement
  ]);
  const inWindows = 38_700 + 22_000 + 22_040; // all stages but the window wait
  return {
    pkg,
    trace: traceOf([
      kernelRow('gather', { estimatePs: 500_000 }),
      kernelRow('product', { format: 'bf16', flops: 1.5e8 }),
    ]),
    delays,
    recording: {
      makespanPs: 1_000_000,
      partial: false,
      elapsedCk,
      kernels: [
        kernelDone('gather', { endPs: 800_000, readBytes: 2048, movedReadBytes: 4096, requests: 2 }),
        kernelDone('product', {
          startPs: 200_000,
          flops: 5e7,
          computePs: 4 * 500_000,
          writeBytes: 2048,
          movedWriteBytes: 2048,
          requests: 1,
        }),
      ],
      links: [{ flitsDown: 30, flitsUp: 40, payloadBytesDown: 2500, payloadBytesUp: 5000 }],
      dram: {
        reads,
        writes,
        activates: each(3),
        precharges: each(2),
        refreshesAll: each(1),
        refreshesBank: each(0),
        rowHits: each(2),
        rowMisses: each(1),
        rowConflicts: each(1),
        forwarded: Float64Array.from({ length: total }, (_, p) => (p === 5 ? 1 : 0)),
        readQueueCk: each(800), // half an entry on the average
        writeQueueCk: each(400),
        readQueueMax: Int32Array.from({ length: total }, (_, p) => p),
        writeQueueMax: new Int32Array(total).fill(2),
      },
      banks: { count: 2, atoms: perBank(3), activates: perBank(1.5), conflicts: perBank(0.5) },
      bandwidthStack: stack,
      kernelStack: stack.slice(0, STACK_CLASSES.length),
      stackTimeline: { sliceCk: 800, slicePs: 500_000, classes: stack.slice(0, 2 * STACK_CLASSES.length) },
      readWaitCk: new Float64Array(STACK_CLASSES.length).fill(10),
      engineComputePs: new Float64Array(4).fill(500_000),
      engineWindowPs: Float64Array.of(inWindows, 0, 0, 0),
      checks: [{ name: 'bytes asked are answered', ok: true, got: 4096, expected: 4096, tolerance: 0 }],
      timeline: { slicePs: 500_000, readBytes: Float64Array.of(4096, 0), writeBytes: Float64Array.of(0, 2048) },
    },
  };
}
