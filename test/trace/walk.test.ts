import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { placeKernels, READ, WRITE } from '../../src/trace/index.js';
import { bytesOf, die, kernel, trace, walkSide, walkTile } from './build.js';

/** Where a list of accesses goes, byte by byte, in order. */
const touched = (accesses: readonly { address: number; bytes: number }[]) =>
  accesses.flatMap(({ address, bytes }) => Array.from({ length: bytes }, (_, i) => address + i));

function one(readText: string, readBytes: number, part: Parameters<typeof kernel>[0] = {}, geometry = [die()]) {
  const [placed] = placeKernels(trace(kernel({ readText, readBytes, ...part })), geometry);
  const base = placed.shares[0].readBase;
  const accesses = walkSide(geometry, placed, 0, READ).map(({ address, bytes }) => ({
    address: address - base,
    bytes,
  }));
  return { placed, geometry, accesses };
}

describe('linear patterns by hand', () => {
  it('reads 600 bytes in order as 256 + 256 + 88', () => {
    expect(one('sequential', 600).accesses).toEqual([
      { address: 0, bytes: 256 },
      { address: 256, bytes: 256 },
      { address: 512, bytes: 88 },
    ]);
  });

  it('cuts tiles at i x B / n and accesses at request boundaries', () => {
    // 1000 B in tiles of 400 B: 3 tiles, edges at 0, 333, 666, 1000; requests end at 256, 512, 768
    const { accesses } = one('sequential', 1000, { tileBytes: 400 });
    expect(accesses).toEqual([
      { address: 0, bytes: 256 },
      { address: 256, bytes: 333 - 256 },
      { address: 333, bytes: 512 - 333 },
      { address: 512, bytes: 666 - 512 },
      { address: 666, bytes: 768 - 666 },
      { address: 768, bytes: 1000 - 768 },
    ]);
  });

  it('strides with one request an element, the last one shorter', () => {
    expect(one('strided stride=4KiB', 600).accesses).toEqual([
      { address: 0, bytes: 256 },
      { address: 4096, bytes: 256 },
      { address: 8192, bytes: 88 },
    ]);
  });

  it('never takes more than the stride, and splits elements longer than a request', () => {
    expect(one('strided stride=64B', 128).accesses.map((a) => a.bytes)).toEqual([64, 64]);
    expect(one('strided stride=1KiB granule=512B', 1024).accesses).toEqual([
      { address: 0, bytes: 256 },
      { address: 256, bytes: 256 },
      { address: 1024, bytes: 256 },
      { address: 1280, bytes: 256 },
    ]);
  });

  it('starts a strided pass again one element further on', () => {
    // span 3 x 128 B, elements of 64 B: 0 128 256, then 64 192 320, then all over
    const { accesses } = one('strided stride=128B granule=64B span=384B', 7 * 64);
    expect(accesses.map((a) => a.address)).toEqual([0, 128, 256, 64, 192, 320, 0]);
  });

  it('lays blocks side by side across the pitch and then below', () => {
    // rows of 32 B, two rows a block, pitch 64 B: two blocks side by side, then the next line of blocks
    const { accesses } = one('block rows=2 width=32B pitch=64B', 6 * 32);
    expect(accesses.map((a) => a.address)).toEqual([0, 64, 32, 96, 128, 192]);
  });

  it('touches every byte of a matrix once, whether by columns or by blocks', () => {
    const all = Array.from({ length: 16384 }, (_, i) => i);
    for (const text of ['strided stride=1KiB granule=64B span=16KiB', 'block rows=4 width=256B pitch=1KiB']) {
      const { accesses } = one(text, 16384, { tileBytes: 1000 });
      expect(touched(accesses).sort((a, b) => a - b)).toEqual(all);
    }
  });

  it('keeps requests that are no power of two, from a base that is no multiple of them', () => {
    const geometry = [die({ requestBytes: 100 })];
    const { accesses, placed } = one('sequential', 1000, {}, geometry);
    const base = placed.shares[0].readBase;
    for (const { address, bytes } of accesses) {
      expect(Math.floor((base + address) / 100)).toBe(Math.floor((base + address + bytes - 1) / 100));
    }
    expect(bytesOf(accesses)).toBe(1000);
  });
});

describe('granule patterns', () => {
  it('chases through every item once a round, in an order that depends on the seed', () => {
    const { accesses, placed, geometry } = one('chase granule=64B span=64000B', 2 * 64000, { tileBytes: 5000 });
    const first = accesses.slice(0, 1000).map((a) => a.address);
    expect(new Set(first).size).toBe(1000);
    expect(accesses.slice(1000).map((a) => a.address)).toEqual(first);
    const other = walkTile(geometry, placed, { seed: '2', tile: 0 }).map((a) => a.address);
    expect(other).not.toEqual(walkTile(geometry, placed, { seed: '1', tile: 0 }).map((a) => a.address));
  });

  it('spreads uniform accesses evenly', () => {
    // 64 bins of 1563 expected: chi-square with 63 degrees of freedom, four deviations of sqrt(2 x 63)
    const { accesses } = one('uniform granule=64B span=4MiB', 64 * 100032, { tileBytes: 6400 });
    const bins = new Array(64).fill(0);
    for (const { address } of accesses) bins[Math.floor(address / 65536)]++;
    const expected = accesses.length / 64;
    const chi = bins.reduce((sum, n) => sum + (n - expected) ** 2 / expected, 0);
    expect(Math.abs(chi - 63)).toBeLessThan(4 * Math.sqrt(2 * 63));
  });

  it('gives zipf accesses their law, and scatters the hot items', () => {
    const n = 50000;
    const items = 1000;
    const { accesses } = one('zipf s=1.1 granule=256B span=256000B', n * 256, { tileBytes: 25600 });
    const counts = new Map<number, number>();
    for (const { address } of accesses) counts.set(address, (counts.get(address) ?? 0) + 1);
    const ranked = [...counts].sort((a, b) => b[1] - a[1]);
    let sum = 0;
    for (let k = 1; k <= items; k++) sum += k ** -1.1;
    // the five hottest, in order, within four deviations of their law
    for (let k = 1; k <= 5; k++) {
      const p = k ** -1.1 / sum;
      expect(Math.abs(ranked[k - 1][1] - n * p)).toBeLessThan(4 * Math.sqrt(n * p * (1 - p)));
    }
    const hot = ranked.slice(0, 20).map(([address]) => address / 256);
    const neighbours = hot.filter((item) => hot.includes(item + 1)).length;
    expect(neighbours).toBeLessThan(5);
  });

  it('gives each tile, die, side, kernel and seed numbers of its own', () => {
    const geometry = [die(), die({ base: 2 ** 30 })];
    const text = 'uniform granule=64B span=16MiB';
    const [placed] = placeKernels(
      trace(kernel({ readText: text, writeText: text, readBytes: 2 ** 20, writeBytes: 2 ** 20 })),
      geometry,
    );
    const start = (options: Parameters<typeof walkTile>[2]) => {
      const { readBase, writeBase } = placed.shares[options?.onDie ?? 0];
      const base = options?.side === WRITE ? writeBase : readBase;
      return walkTile(geometry, placed, options)
        .map((a) => a.address - base)
        .join();
    };
    const variants = [{}, { seed: '2' }, { index: 1 }, { onDie: 1 }, { side: WRITE }, { tile: 1 }];
    expect(new Set(variants.map(start)).size).toBe(variants.length);
  });
});

const size = fc.integer({ min: 1, max: 4096 }).map((n) => `${n}B`);
const patternText = fc.oneof(
  fc.constant('sequential'),
  fc
    .tuple(fc.integer({ min: 1, max: 5000 }), fc.integer({ min: 1, max: 700 }), fc.integer({ min: 0, max: 3 }))
    .map(
      ([stride, granule, span]) =>
        `strided stride=${stride}B${granule <= stride ? ` granule=${granule}B` : ''}${span > 0 ? ` span=${span * 5000}B` : ''}`,
    ),
  fc
    .tuple(fc.integer({ min: 1, max: 9 }), fc.integer({ min: 1, max: 700 }), fc.integer({ min: 0, max: 900 }))
    .map(([rows, width, more]) => `block rows=${rows} width=${width}B pitch=${width + more}B`),
  size.map((granule) => `uniform granule=${granule}`),
  fc.integer({ min: 1, max: 200 }).map((granule) => `uniform granule=${granule}B span=20000B`),
  fc.integer({ min: 1, max: 200 }).map((granule) => `zipf s=0.9 granule=${granule}B span=20000B`),
  size.map((granule) => `chase granule=${granule}`),
);

const scene = fc.record({
  readText: patternText,
  writeText: patternText,
  readBytes: fc.integer({ min: 0, max: 60000 }),
  writeBytes: fc.integer({ min: 1, max: 60000 }),
  tileBytes: fc.integer({ min: 500, max: 20000 }),
  onDie: fc.integer({ min: -1, max: 1 }),
  dies: fc.integer({ min: 2, max: 3 }),
  requestBytes: fc.constantFrom(32, 64, 100, 256),
});

describe('laws of every pattern', () => {
  it('conserves bytes, stays in its regions and respects request boundaries', () => {
    fc.assert(
      fc.property(scene, ({ readText, writeText, readBytes, writeBytes, tileBytes, onDie, dies, requestBytes }) => {
        const capacity = 2 ** 26;
        const geometry = Array.from({ length: dies }, (_, d) => die({ base: d * capacity, capacity, requestBytes }));
        const k = kernel({ readText, writeText, readBytes, writeBytes, tileBytes, die: onDie });
        const [placed] = placeKernels(trace({ ...k, read: readBytes > 0 ? k.read : null }), geometry);
        for (const side of [READ, WRITE]) {
          const pattern = side === READ ? placed.kernel.read : placed.kernel.write;
          const wanted = side === READ ? readBytes : writeBytes;
          let bytes = 0;
          let expected = 0;
          placed.shares.forEach((share, d) => {
            const base = side === READ ? share.readBase : share.writeBase;
            const span = side === READ ? share.readSpan : share.writeSpan;
            const part = side === READ ? share.readBytes : share.writeBytes;
            const accesses = walkSide(geometry, placed, d, side);
            bytes += bytesOf(accesses);
            const linear = pattern === null || ['sequential', 'strided', 'block'].includes(pattern.name);
            expected += linear ? part : Math.ceil(part / pattern.granule) * pattern.granule;
            if (part > 0) {
              expect(base).toBeGreaterThanOrEqual(geometry[d].base);
              expect(base + span).toBeLessThanOrEqual(geometry[d].base + capacity);
            }
            // plain conditions here: an `expect` for each of a million accesses would take minutes
            const wrong = accesses.filter(({ address, bytes: length }) => {
              const inside = address >= base && length > 0 && address + length <= base + span;
              if (!linear) return !inside || length !== pattern.granule || (address - base) % length !== 0;
              return (
                !inside || Math.floor(address / requestBytes) !== Math.floor((address + length - 1) / requestBytes)
              );
            });
            expect(wrong).toEqual([]);
          });
          expect(bytes).toBe(expected);
          const shared = placed.shares.reduce((n, s) => n + (side === READ ? s.readBytes : s.writeBytes), 0);
          expect(shared).toBe(wanted);
        }
      }),
      { numRuns: 300, seed: 20240601 },
    );
  });

  it('gives the same accesses whatever the fill sizes and whatever was walked before', () => {
    fc.assert(
      fc.property(patternText, fc.integer({ min: 1, max: 50 }), fc.nat(3), (readText, room, tile) => {
        const geometry = [die()];
        const [placed] = placeKernels(trace(kernel({ readText, readBytes: 20000, tileBytes: 5000 })), geometry);
        const whole = walkTile(geometry, placed, { tile, room: 100000 });
        expect(walkTile(geometry, placed, { tile, room })).toEqual(whole);
        expect(whole.length).toBeGreaterThan(0);
      }),
      { numRuns: 200, seed: 20240602 },
    );
  });
});
