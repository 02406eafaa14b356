import { describe, expect, it } from 'vitest';
import { copyWords, hashSeed, mixNumber, stream, streamFrom } from '../../src/random.js';
import { Scatter } from '../../src/trace/scatter.js';
import { ZipfRanks } from '../../src/trace/zipf.js';

const draws = (random: () => number, count: number) => Array.from({ length: count }, () => random());

describe('seeded streams', () => {
  it('gives equal numbers for equal names and others for every other name', () => {
    const names: [string, ...(string | number)[]][] = [
      ['1', 'a', 'bc'],
      ['1', 'ab', 'c'],
      ['1', 'abc'],
      ['1a', 'bc'],
      ['1', 0],
      ['1', 1],
      ['1', 2 ** 32],
      ['1', 2 ** 32 + 1],
      ['1', -1],
      ['1', 0, 1],
      ['1', 1, 0],
      ['1', '1'],
      ['', ''],
      [''],
    ];
    const seen = new Map<string, string>();
    for (const name of names) {
      const numbers = draws(stream(...name), 4).join();
      expect(draws(stream(...name), 4).join()).toBe(numbers);
      expect(seen.get(numbers), `${name} and ${seen.get(numbers)}`).toBeUndefined();
      seen.set(numbers, name.join());
    }
  });

  it('opens the same stream by the short cut for hot code', () => {
    const base = mixNumber(hashSeed('seed'), 3);
    const scratch = { x: 0, y: 0, z: 0, w: 0 };
    for (let tile = 0; tile < 5; tile++) {
      const quick = streamFrom(mixNumber(copyWords(base, scratch), tile));
      expect(draws(quick, 3)).toEqual(draws(stream('seed', 3, tile), 3));
    }
  });

  it('gives neighbouring keys streams that do not go together', () => {
    // mean of n draws of a uniform: 1/2 with deviation sqrt(1/12/n); correlation of n pairs: 0 with deviation sqrt(1/n).
    // Both are held to four deviations; the seeds are fixed, so this either always passes or never.
    const n = 20000;
    const first = Array.from({ length: n }, (_, tile) => stream('x', 0, 0, 0, tile)());
    const mean = first.reduce((sum, u) => sum + u, 0) / n;
    expect(Math.abs(mean - 0.5)).toBeLessThan(4 * Math.sqrt(1 / 12 / n));
    let product = 0;
    for (let i = 1; i < n; i++) product += (first[i] - 0.5) * (first[i - 1] - 0.5) * 12;
    expect(Math.abs(product / n)).toBeLessThan(4 / Math.sqrt(n));
    // 256 bins, chi-square with 255 degrees of freedom: mean 255, deviation sqrt(2 x 255)
    const bins = new Array(256).fill(0);
    for (const u of first) bins[Math.floor(u * 256)]++;
    const chi = bins.reduce((sum, count) => sum + (count - n / 256) ** 2 / (n / 256), 0);
    expect(Math.abs(chi - 255)).toBeLessThan(4 * Math.sqrt(2 * 255));
  });
});

describe('scatter', () => {
  it.each([1, 2, 3, 5, 64, 100, 1000, 4097])('is a bijection on %i items', (items) => {
    const scatter = new Scatter();
    scatter.reset(items, hashSeed(`key ${items}`));
    const places = new Set(Array.from({ length: items }, (_, i) => scatter.place(i)));
    expect(places.size).toBe(items);
    expect(Math.min(...places)).toBe(0);
    expect(Math.max(...places)).toBe(items - 1);
  });

  it('stays inside and injective where items need more than 32 bits', () => {
    const scatter = new Scatter();
    const items = 2 ** 40 + 12345;
    scatter.reset(items, hashSeed('wide'));
    const places = Array.from({ length: 20000 }, (_, i) => scatter.place(i));
    expect(new Set(places).size).toBe(20000);
    expect(places.every((place) => Number.isInteger(place) && place >= 0 && place < items)).toBe(true);
    // a uniform place is in the upper half half of the time: deviation sqrt(n)/2
    const upper = places.filter((place) => place >= items / 2).length;
    expect(Math.abs(upper - 10000)).toBeLessThan(4 * Math.sqrt(20000) * 0.5);
  });

  it('orders by its key and leaves hardly any neighbours together', () => {
    const one = new Scatter();
    const two = new Scatter();
    one.reset(10000, hashSeed('one'));
    two.reset(10000, hashSeed('two'));
    let same = 0;
    let neighbours = 0;
    for (let i = 0; i < 10000; i++) {
      if (one.place(i) === two.place(i)) same++;
      if (i > 0 && Math.abs(one.place(i) - one.place(i - 1)) === 1) neighbours++;
    }
    // a random order has about 1 fixed point and 2 pairs of neighbours; 15 is far outside either Poisson law
    expect(same).toBeLessThan(15);
    expect(neighbours).toBeLessThan(15);
  });
});

describe('zipf ranks', () => {
  // The law: P(k) = k^-s / H. Chosen beforehand: a chi-square test over the ranks whose expected count is at least 20, the rest
  // in one bin, must lie within four deviations (sqrt(2 x bins)) of its mean; the ten likeliest ranks within 4 deviations each.
  it.each([
    [0.5, 1000],
    [0.99, 1000],
    [1, 1000],
    [1.1, 1000],
    [1 + 1e-12, 1000],
    [2, 50],
    [5, 1000],
    [1.1, 1],
    [0.8, 2],
  ])('follow k^-s for s = %f over %i items', (s, items) => {
    const ranks = new ZipfRanks();
    ranks.reset(items, s);
    const random = stream('zipf', s, items);
    const n = 200000;
    const counts = new Array(items + 1).fill(0);
    for (let i = 0; i < n; i++) counts[ranks.draw(random)]++;
    const weights = Array.from({ length: items }, (_, i) => (i + 1) ** -s);
    const sum = weights.reduce((a, b) => a + b, 0);
    let chi = 0;
    let bins = 0;
    let restExpected = 0;
    let restCount = 0;
    for (let k = 1; k <= items; k++) {
      const p = weights[k - 1] / sum;
      if (k <= 10) expect(Math.abs(counts[k] - n * p)).toBeLessThanOrEqual(4 * Math.sqrt(n * p * (1 - p)) + 1e-9);
      if (n * p >= 20) {
        chi += (counts[k] - n * p) ** 2 / (n * p);
        bins++;
      } else {
        restExpected += n * p;
        restCount += counts[k];
      }
    }
    if (restExpected >= 5) {
      chi += (restCount - restExpected) ** 2 / restExpected;
      bins++;
    }
    if (bins > 1) expect(Math.abs(chi - (bins - 1))).toBeLessThan(4 * Math.sqrt(2 * (bins - 1)));
    expect(counts[0]).toBe(0);
  });

  it('costs no table: a law over 2^40 items starts at once and draws its head as often as it should', () => {
    const ranks = new ZipfRanks();
    const s = 1.2;
    ranks.reset(2 ** 40, s);
    const random = stream('wide');
    const n = 100000;
    let ones = 0;
    for (let i = 0; i < n; i++) if (ranks.draw(random) === 1) ones++;
    // zeta(1.2) = 5.591582441, summed to 10^5 with the Euler-Maclaurin tail; what is cut off beyond 2^40 items is
    // 2^(-0.2 x 40) / 0.2 = 0.0195
    const p = 1 / (5.591582441 - 0.0195);
    expect(Math.abs(ones - n * p)).toBeLessThan(4 * Math.sqrt(n * p * (1 - p)));
  });
});
