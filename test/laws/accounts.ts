import { expect } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { type Recording, STACK_CLASSES } from '../../src/engine/index.js';

/** The classes of each pseudo-channel's bandwidth stack are whole, never negative, and add up; data clocks are those of bursts. */
export function everyClockIsAccountedFor(pkg: Package, recording: Recording): void {
  const classes = STACK_CLASSES.length;
  const { organisation: o } = pkg.memory[0];
  recording.dram.reads.forEach((reads, p) => {
    const stack = [...recording.bandwidthStack.subarray(p * classes, (p + 1) * classes)];
    for (const ck of stack) {
      expect(ck).toBeGreaterThanOrEqual(0);
      expect(Number.isInteger(ck)).toBe(true);
    }
    expect(stack.reduce((a, b) => a + b, 0)).toBe(recording.elapsedCk);
    expect(stack[STACK_CLASSES.indexOf('read_data')]).toBe(reads * o.burst_ck);
    expect(stack[STACK_CLASSES.indexOf('write_data')]).toBe(recording.dram.writes[p] * o.burst_ck);
  });
}
