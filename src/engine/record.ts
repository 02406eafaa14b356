import type { Package } from '../config/package.js';
import { memoryOf, systemOf } from '../model/system.js';
import { attribution } from './attribution.js';
import { channelCounters } from './channel.js';
import type { FrontEnd } from './front-end.js';
import { type Check, type KernelRecord, type Recording, STACK_CLASSES } from './recording.js';
import { movedAtoms, timeline } from './traffic.js';
import type { Work } from './work.js';

interface Ending {
  readonly makespanPs: number;
  readonly partial: boolean;
  readonly elapsedCk: number;
  readonly attribution: boolean;
}

/** Gathers the counters of a finished run and the engine's own checks of them. */
export function record(pkg: Package, front: FrontEnd, work: Work, ending: Ending): Recording {
  const system = systemOf(pkg);
  const memory = memoryOf(pkg);
  const counters = channelCounters();
  const lane = (both: Float64Array, op: number): Float64Array =>
    Float64Array.from({ length: system.total }, (_, p) => both[p * 2 + op]);
  const slices = timeline();
  const kernels = work.kernels.map((kernel, k): KernelRecord => {
    const moved = movedAtoms(k);
    return {
      ...kernel,
      movedReadBytes: moved.read * system.atomBytes,
      movedWriteBytes: moved.write * system.atomBytes,
    };
  });

  const charged = attribution(system.total, kernels.length);
  const readWaitCk = new Float64Array(STACK_CLASSES.length);
  charged.readWait.forEach((half, i) => {
    readWaitCk[i % readWaitCk.length] += half / 2;
  });

  const checks: Check[] = [];
  const check = (name: string, got: number, expected: number, tolerance = 0): void => {
    checks.push({ name, ok: Math.abs(got - expected) <= tolerance, got, expected, tolerance });
  };
  const sum = (values: Iterable<number>): number => {
    let total = 0;
    for (const value of values) total += value;
    return total;
  };
  if (!ending.partial) {
    check('bytes asked are answered', front.bytesAnswered, front.bytesAsked);
    check('requests issued are answered', front.answered, front.issued);
    const atoms = sum(counters.reads) + sum(counters.writes);
    check('atoms sent cross a data bus or are forwarded', atoms + front.atomsForwarded, front.atomsSent);
    check(
      'atoms of kernels are those of the data buses',
      kernels.reduce((n, k) => n + k.movedReadBytes + k.movedWriteBytes, 0),
      atoms * system.atomBytes,
    );
    check('no request is left in a queue', counters.queued, 0);
    // Little's law in its integral form: time integral of the number present = sum of the times spent there
    check(
      "Little's law, request windows (request x ps)",
      sum(front.windowPs),
      front.residencePs,
      1e-9 * front.residencePs,
    );
    for (const [op, name] of ['read', 'write'].entries()) {
      const spent = sum(lane(counters.residence, op));
      check(
        `Little's law, ${name} queues (entry x half clocks)`,
        sum(lane(counters.occupancy, op)),
        spent,
        1e-9 * spent,
      );
    }
  }
  if (ending.attribution) {
    const classes = STACK_CLASSES.length;
    let off = 0; // clocks by which the worst pseudo-channel's stack misses the elapsed clocks
    for (let p = 0; p < system.total; p++) {
      off = Math.max(off, Math.abs(sum(charged.stack.subarray(p * classes, (p + 1) * classes)) - ending.elapsedCk));
    }
    check('bandwidth stacks add up to the elapsed clocks (worst difference)', off, 0);
    check('the stack over time adds up to the elapsed clocks', sum(charged.bySlice), system.total * ending.elapsedCk);
    if (!ending.partial) {
      const waited = sum(lane(counters.residence, 0)) / 2;
      check('what reads waited for adds up to their time in the queues', sum(readWaitCk), waited, 1e-9 * waited);
    }
  }

  return {
    makespanPs: ending.makespanPs,
    partial: ending.partial,
    elapsedCk: ending.elapsedCk,
    kernels,
    links: front.down.map((down, s) => ({
      flitsDown: down.flits,
      flitsUp: front.up[s].flits,
      payloadBytesDown: down.payloadBytes,
      payloadBytesUp: front.up[s].payloadBytes,
    })),
    dram: {
      reads: counters.reads,
      writes: counters.writes,
      activates: counters.activates,
      precharges: counters.precharges,
      refreshesAll: counters.refreshesAll,
      refreshesBank: counters.refreshesBank,
      rowHits: counters.rowHits,
      rowMisses: counters.rowMisses,
      rowConflicts: counters.rowConflicts,
      forwarded: counters.forwarded,
      readQueueCk: lane(counters.occupancy, 0).map((n) => n / 2),
      writeQueueCk: lane(counters.occupancy, 1).map((n) => n / 2),
      readQueueMax: Int32Array.from({ length: system.total }, (_, p) => counters.deepest[p * 2]),
      writeQueueMax: Int32Array.from({ length: system.total }, (_, p) => counters.deepest[p * 2 + 1]),
    },
    banks: {
      count: system.banks,
      atoms: counters.bankAtoms,
      activates: counters.bankActivates,
      conflicts: counters.bankConflicts,
    },
    bandwidthStack: charged.stack,
    kernelStack: charged.byKernel,
    stackTimeline: {
      sliceCk: charged.sliceCk,
      slicePs: charged.sliceCk * memory.clockPs,
      classes: charged.bySlice,
    },
    readWaitCk,
    engineComputePs: work.computePs,
    engineWindowPs: front.windowPs,
    checks,
    timeline: {
      slicePs: (slices.sliceHalf * memory.clockPs) / 2,
      readBytes: slices.read.map((atoms) => atoms * system.atomBytes),
      writeBytes: slices.write.map((atoms) => atoms * system.atomBytes),
    },
  };
}
