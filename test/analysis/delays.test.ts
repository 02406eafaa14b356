import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Delays } from '../../src/analysis/index.js';
import { STAGES } from '../../src/engine/recording.js';
import { block, delaysOf, type Request } from './recording.js';

const stages = fc.array(fc.integer({ min: 0, max: 1e9 }), { minLength: STAGES.length, maxLength: STAGES.length });
const request: fc.Arbitrary<Request> = fc.tuple(fc.constantFrom(0, 1, 2), fc.nat(3), fc.nat(4096), stages);
const total = (parts: readonly number[]): number => parts.reduce((a, b) => a + b, 0);

describe('delays', () => {
  test('stage sums of reads add up to the sum of their latencies, exactly', () => {
    fc.assert(
      fc.property(fc.array(request), (requests) => {
        const delays = delaysOf(requests);
        const latencies = requests.filter(([op]) => op !== 1).map(([, , , parts]) => total(parts));
        expect(total(delays.reads.map((stage) => stage.sum))).toBe(total(latencies));
        expect(delays.readLatency.sum).toBe(total(latencies));
        expect(delays.readLatency.count).toBe(latencies.length);
      }),
    );
  });

  test('reads and writes are kept apart, and reads served from the write queue count as reads', () => {
    const delays = delaysOf([
      [0, 0, 64, [1, 2, 3, 4, 5, 6, 7, 8]],
      [1, 0, 64, [10, 0, 0, 0, 0, 0, 0, 0]],
      [2, 0, 64, [3, 0, 0, 0, 0, 0, 0, 0]],
    ]);
    expect(delays.reads[0].sum).toBe(1 + 3);
    expect(delays.writes[0].sum).toBe(10);
    expect(delays.readLatency.max).toBe(36); // 1 + 2 + … + 8
    expect(delays.forwarded).toBe(1);
  });

  test('each kernel has its own mean read latency, requests and bytes', () => {
    const none = [0, 0, 0, 0, 0, 0, 0];
    const delays = delaysOf([
      [0, 2, 64, [10, ...none]],
      [0, 2, 32, [30, ...none]],
      [1, 2, 16, [99, ...none]],
      [0, 0, 8, [5, ...none]],
    ]);
    expect(delays.kernels).toEqual([
      { reads: 1, readLatencyPs: 5, requests: 1, bytes: 8 },
      { reads: 0, readLatencyPs: 0, requests: 0, bytes: 0 },
      { reads: 2, readLatencyPs: 40, requests: 3, bytes: 112 },
    ]);
  });

  test('how the rows are cut into blocks makes no difference', () => {
    fc.assert(
      fc.property(fc.array(request, { minLength: 2 }), fc.nat(), (requests, at) => {
        const whole = delaysOf(requests);
        const cut = new Delays();
        const middle = at % requests.length;
        cut.add(block(requests.slice(0, middle)));
        cut.add(block(requests.slice(middle)));
        expect(cut.kernels).toEqual(whole.kernels);
        const seen = ({ reads, writes, readLatency }: Delays) =>
          [...reads, ...writes, readLatency].map((h) => [
            h.count,
            h.sum,
            h.min,
            h.max,
            h.percentile(0.5),
            h.percentile(0.9),
          ]);
        expect(seen(cut)).toEqual(seen(whole));
      }),
    );
  });

  test('a block longer than the engine’s is taken whole', () => {
    const many = Array.from({ length: 10_000 }, (): Request => [0, 0, 1, [1, 0, 0, 0, 0, 0, 0, 0]]);
    const delays = delaysOf([...many, [0, 1, 1, [7, 0, 0, 0, 0, 0, 0, 0]]]);
    expect(delays.readLatency.count).toBe(10_001);
    expect(delays.readLatency.sum).toBe(10_007);
    expect(delays.kernels[1].readLatencyPs).toBe(7);
  });

  test('a delay below zero is not hidden', () => {
    expect(delaysOf([[0, 0, 1, [-1, 0, 0, 0, 0, 0, 0, 5]]]).least).toBe(-1);
  });
});
