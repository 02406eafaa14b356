import { describe, expect, it } from 'vitest';
import {
  type AccessBatch,
  type KernelTrace,
  kernelCsv,
  MIXES,
  makeMix,
  openTrace,
  READ,
} from '../../src/trace/index.js';

const SITE = { dies: 1, engines: 8, region: 2 ** 36, base: 0, seed: '1' };
const WHERE = { file: 'test' };

interface Sums {
  flops: number[];
  read: number[];
  write: number[];
  rows: number;
}

/** What the accesses of a mix add up to, by kernel. */
function sums(batches: Iterable<AccessBatch>): Sums {
  const found: Sums = { flops: [], read: [], write: [], rows: 0 };
  for (const { count, op, bytes, flops, kernel } of batches)
    for (let i = 0; i < count; i++) {
      const k = kernel[i];
      const side = op[i] === READ ? found.read : found.write;
      side[k] = (side[k] ?? 0) + bytes[i];
      found.flops[k] = (found.flops[k] ?? 0) + (flops?.[i] ?? 0);
      found.rows++;
    }
  return found;
}

/** Mixes whose usual sizes make more rows than a test needs. */
const SMALL: Readonly<Record<string, string>> = {
  matmul: 'matmul m=300 n=300 k=300',
  prefill: 'prefill tokens=300',
  decode: 'decode batch=2 context=500',
  norm: 'norm rows=100',
  embedding: 'embedding tokens=300',
  experts: 'experts tokens=5',
  transpose: 'transpose rows=300 columns=300',
  permutation: 'permutation elements=5000',
  spmv: 'spmv rows=3000',
  stencil: 'stencil nx=40',
  ring: 'ring elements=100000',
};

/**
 * Sizes that divide nothing, and flops, bytes read and bytes written worked out by hand from the closed forms the mixes state; a
 * kernel each.
 */
const BY_HAND: readonly (readonly [text: string, flops: number[], read: number[], write: number[]])[] = [
  // 2 x 100 x 70 x 50; A is read for each of ceil(70 / 32) = 3 columns of tiles, B for each of ceil(100 / 48) = 3 rows
  ['matmul m=100 n=70 k=50 tile_m=48 tile_n=32 tile_k=20', [700_000], [2 * (100 * 50 * 3 + 50 * 70 * 3)], [2 * 7000]],
  ['matmul m=64 n=64 k=64 tile_m=64 tile_n=64 tile_k=64 format=fp8', [524_288], [8192], [4096]],
  // x is read for each of ceil(37 / 8) = 5 tiles
  ['matvec m=37 n=129 tile_m=8 format=fp32', [2 * 37 * 129], [4 * (37 * 129 + 129 * 5)], [4 * 37]],
  // 300 tokens in blocks of 128: query blocks of 128, 128 and 44 meet 128, 256 and 300 keys
  [
    'prefill batch=2 tokens=300 heads=4 kv_heads=2 dim=64 block=128',
    [4 * 2 * 4 * 64 * (128 * 128 + 128 * 256 + 44 * 300)],
    [2 * 2 * 4 * 64 * (300 + 2 * (128 + 256 + 300))],
    [2 * 2 * 4 * 64 * 300],
  ],
  [
    'decode batch=3 context=100 heads=6 kv_heads=2 dim=32 page=16 block=48 format=fp8',
    [4 * 3 * 6 * 32 * 100],
    [3 * 32 * (2 * 2 * 100 + 6)],
    [3 * 32 * 6],
  ],
  ['norm rows=10 width=100 tile=4', [4 * 1000], [2 * (1000 + 100 * 3)], [2000]],
  ['embedding tokens=50 vocabulary=1000 width=64 tile=16', [0], [50 * (128 + 4)], [6400]],
  // everyone takes all four experts, so all are read
  [
    'experts tokens=5 experts=4 top_k=4 width=32 hidden=24 tile=7',
    [6 * 5 * 4 * 32 * 24],
    [2 * 32 * (3 * 4 * 24 + 5 * 4)],
    [2 * 32 * 5 * 4],
  ],
  // 20 x 17 pixels, 3 x 3 filters two apart: 9 x 8 outputs; slabs of 4, 4 and 1 rows read 9, 9 and 3 rows
  [
    'convolution batch=2 height=20 width=17 channels=5 filters=7 kernel=3 stride=2 rows=4 tile=3 format=fp32',
    [2 * 2 * 9 * 8 * 7 * 5 * 9],
    [4 * 2 * 5 * (17 * (9 + 9 + 3) + 3 * 9 * 7)],
    [4 * 2 * 9 * 8 * 7],
  ],
  // 10 inner planes in slabs of 4, 4 and 2 load 6, 6 and 4
  ['stencil nx=9 ny=7 nz=12 planes=4', [13 * 7 * 5 * 10], [4 * 63 * 16], [4 * 7 * 5 * 10]],
  ['transpose rows=70 columns=33 tile=16 format=fp64', [0], [8 * 2310], [8 * 2310]],
  ['permutation elements=1000 bytes=12 tile=300', [0], [12_000], [12_000]],
  // pointers: 100 + one more for each of ceil(100 / 16) = 7 tiles
  ['spmv rows=100 nonzeros=7 tile=16', [1400], [700 * 12 + 4 * 107], [400]],
  ['spmv rows=100 nonzeros=7 tile=16 band=9 format=fp64', [1400], [700 * 20 + 4 * 107], [800]],
  ['reduction elements=1000 tile=128', [1000 - 8, 7], [4000, 32], [32, 4]],
];

describe('flops and bytes', () => {
  it.each(BY_HAND)('of %s', (text, flops, read, write) => {
    const mix = makeMix(text, SITE, WHERE);
    expect(mix.kernels.map((k) => [k.flops, k.readBytes, k.writeBytes])).toEqual(
      flops.map((f, k) => [f, read[k], write[k]]),
    );
    for (const request of [256, 64, 100]) expect(sums(mix.batches(request))).toMatchObject({ flops, read, write });
  });

  it.each(Object.keys(MIXES))('of %s at its usual sizes, whoever works on it', (name) => {
    const site = { ...SITE, dies: 3, engines: 5 };
    const mix = makeMix(name, site, WHERE);
    const found = sums(mix.batches(4096));
    expect(found).toMatchObject({
      flops: mix.kernels.map(({ flops }) => flops),
      read: mix.kernels.map(({ readBytes }) => readBytes),
      write: mix.kernels.map(({ writeBytes }) => writeBytes),
    });
  });

  it('of a ring: each die but one step’s worth of every other', () => {
    const mix = makeMix('ring elements=1000 tile=64', { ...SITE, dies: 4, engines: 3 }, WHERE);
    // 3 steps of 4 dies with a quarter of 1000 elements of 4 B each
    expect(sums(mix.batches(256))).toMatchObject({ flops: [3000, 0], read: [24_000, 12_000], write: [12_000, 12_000] });
  });
});

describe('accesses', () => {
  /** Rows as objects. */
  function rows(text: string, site = SITE, request = 256) {
    const found: { read: boolean; address: number; bytes: number; die: number; engine: number; tile: number }[] = [];
    for (const { count, op, address, bytes, die, engine, tile } of makeMix(text, site, WHERE).batches(request))
      for (let i = 0; i < count; i++)
        found.push({
          read: op[i] === READ,
          address: address[i],
          bytes: bytes[i],
          die: die?.[i] ?? -1,
          engine: engine?.[i] ?? -1,
          tile: tile?.[i] ?? -1,
        });
    return found;
  }

  it.each(Object.keys(MIXES))('of %s stay in the memory of their die and are cut at requests', (name) => {
    const site = { ...SITE, dies: 2, engines: 2, region: 2 ** 34, base: 4096 };
    for (const { read, address, bytes, die } of rows(SMALL[name] ?? name, site)) {
      const owner = Math.floor((address - site.base) / site.region);
      if (!(name === 'ring' && read) && owner !== die) throw new Error(`${address} is not of die ${die}`);
      if (Math.floor(address / 256) !== Math.floor((address + bytes - 1) / 256)) throw new Error(`${address}+${bytes}`);
    }
  });

  it('write each element of a result once, and nothing else', () => {
    for (const text of [
      'matmul m=33 n=20 k=9 tile_m=16 tile_n=7',
      'transpose rows=30 columns=22 tile=8',
      'permutation elements=500 bytes=4',
    ]) {
      const seen = new Map<number, number>();
      for (const { read, address, bytes } of rows(text))
        if (!read) for (let i = 0; i < bytes; i++) seen.set(address + i, (seen.get(address + i) ?? 0) + 1);
      const size = makeMix(text, SITE, WHERE).kernels[0].writeBytes;
      expect([...seen.values()].every((n) => n === 1)).toBe(true);
      const first = Math.min(...seen.keys());
      expect([seen.size, Math.max(...seen.keys()) - first + 1]).toEqual([size, size]);
    }
  });

  it('of a tile belong to one engine, loads before stores, and tiles of engines are woven', () => {
    const found = rows('matmul m=256 n=256 k=128 tile_m=64 tile_n=64 tile_k=64', { ...SITE, engines: 4 });
    const engines = new Map<number, number>();
    const stored = new Set<number>();
    for (const { read, engine, tile } of found) {
      if ((engines.get(tile) ?? engine) !== engine) throw new Error(`tile ${tile} is of two engines`);
      engines.set(tile, engine);
      if (!read) stored.add(tile);
      else if (stored.has(tile)) throw new Error(`tile ${tile} loads after it stored`);
    }
    expect(found.slice(0, 8).map(({ engine }) => engine)).toEqual([0, 1, 2, 3, 0, 1, 2, 3]);
    // 4 x 4 tiles of the result, each in two steps of k
    expect([engines.size, stored.size]).toEqual([32, 16]);
  });

  it('of a ring come from the neighbour, and every piece of every die is replaced', () => {
    const site = { ...SITE, dies: 3, engines: 2, region: 2 ** 30 };
    const written = new Set<number>();
    for (const { read, address, die, bytes } of rows('ring elements=300 tile=10', site)) {
      const owner = Math.floor(address / site.region);
      if (read) expect([die, (die + 2) % 3]).toContain(owner);
      else for (let i = 0; i < bytes; i++) written.add(address + i);
    }
    expect(written.size).toBe(3 * 300 * 4);
  });

  it('are the same for the same seed, and others for another where anything is drawn', () => {
    for (const [text, drawn] of [
      ['embedding tokens=64', true],
      ['decode batch=2 context=64', true],
      ['norm rows=8', false],
    ] as const) {
      const [a, b, c] = ['1', '1', '2'].map((seed) => JSON.stringify(rows(text, { ...SITE, seed })));
      expect(b).toBe(a);
      expect(c === a).toBe(!drawn);
    }
  });
});

describe('as kernels', () => {
  it.each(Object.keys(MIXES).filter((name) => name !== 'ring'))(
    '%s reads back with the same flops and bytes',
    async (name) => {
      const mix = makeMix(name, SITE, WHERE);
      async function* input() {
        yield Buffer.from(kernelCsv(mix));
      }
      const trace = (await openTrace('-', { input: input() })) as KernelTrace;
      expect(trace.kernels.map((k) => [k.name, k.flops, k.readBytes, k.writeBytes])).toEqual(
        mix.kernels.map((k) => [k.name, k.flops, k.readBytes, k.writeBytes]),
      );
    },
  );
});

describe('refused', () => {
  it.each([
    ['matmul q=3', "found parameter 'q' of mix 'matmul'; expected one of m, n, k"],
    ['matmul m', "found 'm' after 'matmul'; expected parameters written name=value"],
    ['matmul m=1 m=2', "found parameter 'm' twice"],
    ['matmul m=0', "m: found '0'; expected a whole number from 1 up"],
    ['matmul m=1.5', "m: found '1.5'; expected a whole number"],
    ['matmul format=bf8', "format: found 'bf8'; expected a number format: fp64, fp32"],
    ['embedding s=0', "s: found '0'; expected a number from 0.01 up"],
    ['experts experts=4 top_k=5', 'found top_k=5 of 4 experts'],
    ['convolution kernel=60', 'found kernel=60; expected no more than height and width'],
    ['convolution stride=4', 'found stride=4 and kernel=3'],
    ['decode heads=2 kv_heads=4', 'found kv_heads=4 and heads=2'],
    ['ring', 'found one die; expected two or more'],
    ['stencil nx=2', "nx: found '2'; expected a whole number from 3 up"],
    ['matvec m=1000000 n=1000000', 'found arrays of 2000004005888 bytes on each die'],
  ])('%s', (text, message) => {
    expect(() => makeMix(text, SITE, WHERE)).toThrow(message);
  });
});
