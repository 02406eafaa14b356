import { describe, expect, test } from 'vitest';
import { buildResult, type Result } from '../../src/analysis/index.js';
import { STACK_CLASSES, STAGES } from '../../src/engine/recording.js';
import { loadPackage, openTrace, simulate } from '../../src/index.js';
import { made } from './recording.js';

const sum = (values: Iterable<number>): number => [...values].reduce((a, b) => a + b, 0);

function byHand(): Result {
  const { pkg, trace, recording, delays } = made();
  const options = { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY } as const;
  return buildResult(pkg, trace, { version: '9.9.9', options, overrides: [] }, recording, delays);
}

describe('bandwidth stacks by hand', () => {
  test('of a stack, of a kernel and over time are rows of what was recorded', () => {
    const { bandwidth, kernels, stack_timeline } = byHand();
    expect(bandwidth.stacks[0].bandwidth_stack).toMatchObject({ refresh: 32 * 160, total: 32 * 1600 });
    // one row for the first kernel, none for the second
    expect(kernels[0].bandwidth_stack).toMatchObject({ read_data: 8, starved_compute: 1000, total: 1600 });
    expect(kernels[1].bandwidth_stack.total).toBe(0);
    expect(stack_timeline).toMatchObject({ slice_ps: 500_000, slice_ck: 800 });
    expect(stack_timeline.classes.refresh).toEqual([160, 160]);
  });

  test('what reads waited for is a mean over the reads', () => {
    // 10 read x ck in each of 16 classes, 625 ps a clock, two reads
    const { queue_wait } = byHand();
    expect(queue_wait.row_cycle_ps).toBe((10 * 625) / 2);
    expect(queue_wait.total_ps).toBe((16 * 10 * 625) / 2);
  });

  test('delays are counted in buckets that all stages share', () => {
    const { delay_counts } = byHand();
    for (const name of ['read_latency', ...STAGES] as const) {
      expect(delay_counts[name]).toHaveLength(delay_counts.from_ps.length);
      expect(sum(delay_counts[name])).toBe(2);
    }
    const at = delay_counts.from_ps.indexOf(2 ** 15); // 38,700 is in [36,864, 40,960): the second eighth above 32,768
    expect(delay_counts.read_latency[at + 1]).toBe(1);
  });

  test('banks stand as they were counted', () => {
    const { banks } = byHand();
    expect(banks.per_pseudo_channel).toBe(2);
    expect([banks.atoms, banks.activates, banks.row_conflicts].map((column) => column.length)).toEqual([64, 64, 64]);
  });
});

test('of the demo: parts add up to the whole, however they are cut', async () => {
  const pkg = loadPackage('configs/wagtail.yaml');
  const result = await simulate(pkg, await openTrace('traces/wagtail-step.csv', { package: pkg }), { untilPs: 60e6 });
  const { bandwidth, bandwidth_stack: whole, stack_timeline, kernels, banks, dram, partial } = result;
  expect(partial).toBe(true);
  for (const name of STACK_CLASSES) {
    expect(sum(bandwidth.stacks.map((stack) => stack.bandwidth_stack[name]))).toBe(whole[name]);
    expect(sum(stack_timeline.classes[name])).toBe(whole[name]);
    expect(sum(kernels.map((kernel) => kernel.bandwidth_stack[name]))).toBeLessThanOrEqual(whole[name]);
  }
  // bursts belong to a kernel always; only the idle ends of pseudo-channels belong to none
  expect(sum(kernels.map((kernel) => kernel.bandwidth_stack.read_data))).toBe(whole.read_data);
  expect(sum(banks.atoms)).toBe(dram.reads + dram.writes);
  expect(sum(banks.activates)).toBe(dram.activates);
  expect(sum(banks.row_conflicts)).toBe(dram.row_conflicts);
});
