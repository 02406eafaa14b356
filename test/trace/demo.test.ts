import { describe, expect, it } from 'vitest';
import { type DieGeometry, openTrace, placeKernels } from '../../src/trace/index.js';

const MiB = 2 ** 20;
const geometry: DieGeometry[] = [0, 1].map((d) => ({
  base: d * 72 * 2 ** 30,
  capacity: 72 * 2 ** 30, // three stacks of 24 GiB
  engines: 32,
  requestBytes: 256,
}));

describe('the demo trace', () => {
  it('is a dozen kernels of different character on two streams, 10 to 20 million atoms of 32 B', async () => {
    const trace = await openTrace('traces/wagtail-step.csv');
    if (trace.kind !== 'kernel') throw new Error('not a kernel trace');
    expect(trace.streams).toEqual(['main', 'side']);
    expect(trace.kernels.length).toBeGreaterThanOrEqual(8);
    const names = new Set(trace.kernels.flatMap((k) => [k.read?.name, k.write?.name]).filter((name) => name));
    expect([...names].sort()).toEqual(['block', 'chase', 'sequential', 'strided', 'uniform', 'zipf']);
    const bytes = trace.kernels.reduce((sum, k) => sum + k.repeat * (k.readBytes + k.writeBytes), 0);
    expect(bytes / 32).toBeGreaterThan(10e6);
    expect(bytes / 32).toBeLessThan(20e6);
    expect(trace.kernels.filter((k) => k.estimatePs > 0).length).toBeGreaterThan(4);
  });

  it('fits the memory of its package without going round', async () => {
    const trace = await openTrace('traces/wagtail-step.csv');
    if (trace.kind !== 'kernel') throw new Error('not a kernel trace');
    const placed = placeKernels(trace, geometry);
    for (const d of [0, 1]) {
      let end = geometry[d].base;
      for (const { shares } of placed) {
        expect(shares[d].readBase).toBeGreaterThanOrEqual(end);
        end = shares[d].readBase + shares[d].readSpan;
      }
      expect(placed.reduce((sum, { shares }) => sum + shares[d].readBytes, 0)).toBeGreaterThan(150 * MiB);
    }
  });
});
