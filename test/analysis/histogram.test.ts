import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { coarseEdge, Histogram } from '../../src/analysis/histogram.js';

const WIDTH = 1 / 128; // most a bucket may be as wide as its values

const ALL = Int32Array.from({ length: 1000 }, (_, row) => row);

function filled(values: readonly number[]): Histogram {
  const histogram = new Histogram();
  histogram.add(Float64Array.from(values), ALL, values.length);
  return histogram;
}

/** The value of rank ceil(fraction x n), as the definition has it. */
function exact(values: readonly number[], fraction: number): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[Math.max(1, Math.ceil(fraction * sorted.length)) - 1];
}

// delays from one ps to hours, as many small as large
const delay = fc.oneof(
  fc.integer({ min: 0, max: 300 }),
  fc.integer({ min: 0, max: 1e6 }),
  fc.integer({ min: 0, max: Number.MAX_SAFE_INTEGER }),
);
const fraction = fc.constantFrom(0, 0.1, 0.5, 0.9, 0.99, 0.999, 1);

describe('histogram', () => {
  test('a percentile is never below the exact one and at most a bucket above it', () => {
    fc.assert(
      fc.property(fc.array(delay, { minLength: 1, maxLength: 400 }), fraction, (values, f) => {
        const want = exact(values, f);
        const got = filled(values).percentile(f);
        expect(got).toBeGreaterThanOrEqual(want);
        expect(got).toBeLessThanOrEqual(want * (1 + WIDTH));
      }),
      { numRuns: 1000 },
    );
  });

  test('whole numbers below 256 come back exactly', () => {
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 255 }), { minLength: 1 }), fraction, (values, f) => {
        expect(filled(values).percentile(f)).toBe(exact(values, f));
      }),
    );
  });

  test('count, sum, mean, minimum and maximum are exact', () => {
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 1e12 }), { minLength: 1, maxLength: 300 }), (values) => {
        const histogram = filled(values);
        const sum = values.reduce((a, b) => a + b, 0);
        expect(histogram.count).toBe(values.length);
        expect(histogram.sum).toBe(sum);
        expect(histogram.mean).toBe(sum / values.length);
        expect(histogram.min).toBe(Math.min(...values));
        expect(histogram.max).toBe(Math.max(...values));
        expect(histogram.percentile(1)).toBe(histogram.max);
      }),
    );
  });

  test('merging two gives what one of both would hold', () => {
    fc.assert(
      fc.property(fc.array(delay), fc.array(delay), fraction, (a, b, f) => {
        const merged = filled(a);
        merged.merge(filled(b));
        const whole = filled([...a, ...b]);
        expect(merged.count).toBe(whole.count);
        expect(merged.percentile(f)).toBe(whole.percentile(f));
        expect([merged.min, merged.max]).toEqual([whole.min, whole.max]);
      }),
    );
  });

  test('only the rows named are taken, also of a column inside a longer buffer', () => {
    const column = new Float64Array([9, 9, 7, 5, 1e9, 3]).subarray(2);
    const histogram = new Histogram();
    histogram.add(column, Int32Array.of(0, 3, 1), 2);
    expect([histogram.count, histogram.sum, histogram.percentile(0.5), histogram.max]).toEqual([2, 10, 3, 7]);
  });

  test('an empty one says 0', () => {
    const histogram = new Histogram();
    expect([histogram.count, histogram.mean, histogram.percentile(0.5)]).toEqual([0, 0, 0]);
  });

  test('adding goes on after a percentile was asked for', () => {
    const histogram = filled([10, 20, 30]);
    expect(histogram.percentile(0.5)).toBe(20);
    histogram.add(Float64Array.of(1, 1, 1, 1), ALL, 4);
    expect([histogram.count, histogram.percentile(0.5), histogram.percentile(0.99)]).toEqual([7, 1, 30]);
  });

  test('what is no delay shows: below zero in the minimum, not a number in the sum', () => {
    expect(filled([1, -1]).min).toBe(-1);
    expect(filled([Number.NaN]).sum).toBeNaN();
  });

  test('wide buckets hold exactly the values between their edges', () => {
    fc.assert(
      fc.property(fc.array(delay, { minLength: 1, maxLength: 1000 }), (values) => {
        const counts = filled(values).coarse();
        const expected = counts.map(
          (_, i) => values.filter((value) => value >= coarseEdge(i) && value < coarseEdge(i + 1)).length,
        );
        expect(counts).toEqual(expected);
        expect(counts.reduce((a, b) => a + b, 0)).toBe(values.length);
      }),
      { numRuns: 50 },
    );
  });

  test('wide buckets are eight to a power of two', () => {
    expect([0, 1, 2, 8, 9, 10].map(coarseEdge)).toEqual([0, 1, 1.125, 1.875, 2, 2.25]);
    expect(new Histogram().coarse()).toEqual([]);
  });
});
