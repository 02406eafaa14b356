import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type PlacedKernel, placeKernels } from '../../src/trace/index.js';
import { die, kernel, trace } from './build.js';

const MiB = 2 ** 20;
const sum = (numbers: readonly number[]) => numbers.reduce((a, b) => a + b, 0);
const regions = (placed: PlacedKernel, d: number) => {
  const { readBase, readSpan, writeBase, writeSpan } = placed.shares[d];
  return [
    { from: readBase, to: readBase + readSpan },
    { from: writeBase, to: writeBase + writeSpan },
  ].filter(({ from, to }) => to > from);
};

describe('sharing out', () => {
  it('cuts bytes, flops and tiles evenly over all dies and loses nothing', () => {
    const geometry = [0, 1, 2].map((d) => die({ base: d * 2 ** 30 }));
    const [{ shares }] = placeKernels(
      trace(
        kernel({
          readText: 'sequential',
          writeText: 'sequential',
          readBytes: 1000001,
          writeBytes: 77,
          flops: 1e12,
          tileBytes: 65536,
        }),
      ),
      geometry,
    );
    // edges at floor(d x 1000001 / 3): 0, 333333, 666667, 1000001
    expect(shares.map((s) => s.readBytes)).toEqual([333333, 333334, 333334]);
    expect(shares.map((s) => s.writeBytes)).toEqual([25, 26, 26]);
    expect(sum(shares.map((s) => s.flops))).toBe(1e12);
    expect(shares.map((s) => s.tiles)).toEqual([6, 6, 6]); // ceil(333334 / 65536)
  });

  it('leaves dies out when the kernel names its own', () => {
    const [{ shares }] = placeKernels(
      trace(kernel({ readText: 'uniform span=1MiB', readBytes: 4096, die: 1, flops: 8 })),
      [die(), die({ base: 2 ** 30 })],
    );
    expect(shares[0]).toMatchObject({ tiles: 0, readBytes: 0, flops: 0 });
    expect(shares[1]).toMatchObject({ tiles: 1, readBytes: 4096, flops: 8, readSpan: MiB });
  });

  it('cuts a span, a figure of the whole package, like the bytes', () => {
    const [{ shares }] = placeKernels(trace(kernel({ readText: 'zipf granule=256B span=1MiB', readBytes: 4096 })), [
      die(),
      die({ base: 2 ** 30 }),
    ]);
    expect(shares.map((s) => s.readSpan)).toEqual([MiB / 2, MiB / 2]);
  });

  it('makes tiles of the stored side when nothing is loaded, and one an engine when nothing moves', () => {
    const [stores, computes] = placeKernels(
      trace(kernel({ writeText: 'sequential', writeBytes: 10 * 65536 }), kernel({ flops: 1e9, format: 'bf16' })),
      [die({ engines: 7 })],
    );
    expect(stores.shares[0].tiles).toBe(10);
    expect(computes.shares[0].tiles).toBe(7);
  });
});

describe('regions', () => {
  it('follow one another on 4 KiB boundaries and overlap nowhere', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            readBytes: fc.integer({ min: 1, max: 9 * MiB }),
            writeBytes: fc.integer({ min: 1, max: 9 * MiB }),
          }),
          { minLength: 1, maxLength: 20 },
        ),
        (sizes) => {
          const geometry = [die(), die({ base: 2 ** 30 + 100, capacity: 2 ** 30 - 100 })];
          const placed = placeKernels(
            trace(...sizes.map((s) => kernel({ readText: 'sequential', writeText: 'sequential', ...s }))),
            geometry,
          );
          for (const d of [0, 1]) {
            const all = placed.flatMap((p) => regions(p, d));
            for (let i = 0; i < all.length; i++) {
              expect(all[i].from % 4096).toBe(0);
              if (i > 0) expect(all[i].from).toBeGreaterThanOrEqual(all[i - 1].to);
            }
            expect(all[0].from).toBeGreaterThanOrEqual(geometry[d].base);
          }
        },
      ),
      { seed: 7, numRuns: 50 },
    );
  });

  it('of equal power-of-two sizes start in many different places of a row of banks', () => {
    const kernels = Array.from({ length: 32 }, () => kernel({ readText: 'sequential', readBytes: 4 * MiB }));
    const placed = placeKernels(trace(...kernels), [die()]);
    const offsets = placed.map((p) => p.shares[0].readBase % MiB);
    expect(new Set(offsets).size).toBeGreaterThan(24);
  });

  it('begin again at the start of the range when the end is reached', () => {
    const three = Array.from({ length: 3 }, () => kernel({ readText: 'sequential', readBytes: 4 * MiB }));
    const placed = placeKernels(trace(...three), [die({ base: 2 ** 30, capacity: 9 * MiB })]);
    const bases = placed.map((p) => p.shares[0].readBase);
    expect(bases[0]).toBe(2 ** 30);
    expect(bases[1]).toBeGreaterThan(bases[0]);
    expect(bases[2]).toBe(2 ** 30);
  });

  it('of one kernel never overlap, even at the end of the range', () => {
    const first = kernel({ readText: 'sequential', readBytes: 4 * MiB });
    const second = kernel({
      readText: 'sequential',
      writeText: 'sequential',
      readBytes: 5 * MiB,
      writeBytes: 5 * MiB,
    });
    const placed = placeKernels(trace(first, second), [die({ capacity: 10 * MiB })]);
    const [read, write] = regions(placed[1], 0);
    expect(read).toEqual({ from: 0, to: 5 * MiB });
    expect(write).toEqual({ from: 5 * MiB, to: 10 * MiB });
  });

  it('of a strided kernel cover its strides, and wrap inside the memory when they are too many', () => {
    const [small] = placeKernels(trace(kernel({ readText: 'strided stride=4KiB', readBytes: MiB })), [die()]);
    expect(small.shares[0].readSpan).toBe(4096 * (MiB / 256));
    const [large] = placeKernels(trace(kernel({ readText: 'strided stride=4KiB', readBytes: 256 * MiB })), [die()]);
    expect(large.shares[0].readSpan).toBe(2 ** 29); // half of the 1 GiB; all of it would be 4 GiB
  });

  it('are refused when one kernel alone is larger than the memory', () => {
    const big = kernel({ name: 'big', line: 17, readText: 'sequential', readBytes: 2 ** 31 });
    expect(() => placeKernels(trace(big), [die()])).toThrow(/test\.csv:17[\s\S]*big/);
    const wide = kernel({ readText: 'uniform span=4GiB', readBytes: 64 });
    expect(() => placeKernels(trace(wide), [die()])).toThrow(/memory/);
    expect(() => placeKernels(trace(wide), [die({ capacity: 2 ** 33 })])).not.toThrow();
  });

  it('are refused on a die the package has not', () => {
    const k = kernel({ readText: 'sequential', readBytes: 64, die: 5 });
    expect(() => placeKernels(trace(k), [die()])).toThrow(/die 5/);
  });
});
