import { expect } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { type Recording, STACK_CLASSES, type StackClass } from '../../src/engine/index.js';

const CLASSES = STACK_CLASSES.length;
const IDLE_AT_END = ['starved_imbalance', 'starved_drain'] as const;

/**
 * The classes of each pseudo-channel's bandwidth stack are whole, never negative, and add up; data clocks are those of bursts. The
 * same clocks again by kernel and over time, and bank counts are those of their pseudo-channel.
 */
export function everyClockIsAccountedFor(pkg: Package, recording: Recording): void {
  const { organisation: o } = pkg.memory[0];
  const { bandwidthStack, elapsedCk, dram, banks } = recording;
  dram.reads.forEach((reads, p) => {
    const stack = [...bandwidthStack.subarray(p * CLASSES, (p + 1) * CLASSES)];
    whole(stack);
    expect(total(stack)).toBe(elapsedCk);
    expect(stack[STACK_CLASSES.indexOf('read_data')]).toBe(reads * o.burst_ck);
    expect(stack[STACK_CLASSES.indexOf('write_data')]).toBe(dram.writes[p] * o.burst_ck);

    const ofBanks = (counts: Float64Array): number => total(counts.subarray(p * banks.count, (p + 1) * banks.count));
    expect(ofBanks(banks.atoms)).toBe(reads + dram.writes[p]);
    expect(ofBanks(banks.activates)).toBe(dram.activates[p]);
    expect(ofBanks(banks.conflicts)).toBe(dram.rowConflicts[p]);
  });

  const byClass = classSums(bandwidthStack);
  // by kernel: all but what no request ended, the idle tails
  whole(recording.kernelStack);
  const byKernel = classSums(recording.kernelStack);
  STACK_CLASSES.forEach((name, c) => {
    if (!IDLE_AT_END.some((tail) => tail === name)) expect({ [name]: byKernel[c] }).toEqual({ [name]: byClass[c] });
  });
  recording.kernels.forEach((kernel, k) => {
    const data = (name: StackClass): number => recording.kernelStack[k * CLASSES + STACK_CLASSES.indexOf(name)];
    const burst = o.burst_ck / o.atom_bytes;
    if (!recording.partial) {
      expect(data('read_data')).toBe(kernel.movedReadBytes * burst);
      expect(data('write_data')).toBe(kernel.movedWriteBytes * burst);
    }
  });

  // over time: the same clocks once more, every slice but the last one full
  const { sliceCk, classes } = recording.stackTimeline;
  whole(classes);
  expect([...classSums(classes)]).toEqual([...byClass]);
  const slices = classes.length / CLASSES;
  expect(slices).toBe(Math.ceil(elapsedCk / sliceCk));
  for (let slice = 0; slice < slices; slice++) {
    const full = Math.min(sliceCk, elapsedCk - slice * sliceCk) * dram.reads.length;
    expect(total(classes.subarray(slice * CLASSES, (slice + 1) * CLASSES))).toBe(full);
  }

  // what reads waited for: nobody waits while nothing is queued
  STACK_CLASSES.forEach((name, c) => {
    expect(recording.readWaitCk[c]).toBeGreaterThanOrEqual(0);
    if (name.startsWith('starved')) expect(recording.readWaitCk[c]).toBe(0);
  });
}

function whole(counts: Iterable<number>): void {
  for (const ck of counts) {
    expect(ck).toBeGreaterThanOrEqual(0);
    expect(Number.isInteger(ck)).toBe(true);
  }
}

function total(values: Iterable<number>): number {
  let sum = 0;
  for (const value of values) sum += value;
  return sum;
}

function classSums(stacks: Float64Array): Float64Array {
  const sums = new Float64Array(CLASSES);
  stacks.forEach((ck, i) => {
    sums[i % CLASSES] += ck;
  });
  return sums;
}
