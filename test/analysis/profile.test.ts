import { describe, expect, it } from 'vitest';
import { type ProfileResult, profile } from '../../src/analysis/index.js';
import { Footprint } from '../../src/analysis/profile/footprint.js';
import { Frequent } from '../../src/analysis/profile/frequent.js';
import { ReuseDistance } from '../../src/analysis/profile/reuse.js';
import type { Package } from '../../src/config/package.js';
import { stream } from '../../src/random.js';
import { profileReport } from '../../src/report/index.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

const of = (rows: Iterable<Row>, pkg: Package | null = null): Promise<ProfileResult> =>
  profile(accessTrace(rows, ['a', 'b']), pkg, async () => true);

describe('footprint', () => {
  it('is exact up to a million lines, and within three standard errors beyond', () => {
    const footprint = new Footprint();
    for (let i = 0; i < 100_000; i++) footprint.add((i % 70_000) * 12345);
    expect([footprint.lines, footprint.exact]).toEqual([70_000, true]);
    for (let i = 0; i < 4_000_000; i++) footprint.add(1e9 + i);
    expect(footprint.exact).toBe(false);
    expect(Math.abs(footprint.lines / 4_070_000 - 1)).toBeLessThan(3 * 0.0081);
  });
});

describe('reuse distance', () => {
  it('of a loop over n lines is n, to the line while all are followed', () => {
    const reuse = new ReuseDistance();
    for (let round = 0; round < 30; round++) for (let line = 0; line < 5000; line++) reuse.add(line * 7);
    expect(reuse.cold).toBe(5000);
    // 5000 is between 2^12 and 2^13
    expect([...reuse.buckets].map((n, k) => [k, n]).filter(([, n]) => n > 0)).toEqual([[12, 29 * 5000]]);
  });
  it('of a long loop is found from a sample, within a tenth of its octave', () => {
    const reuse = new ReuseDistance();
    const lines = 100_000; // between 2^16 and 2^17
    for (let round = 0; round < 8; round++) for (let line = 0; line < lines; line++) reuse.add(line);
    const all = reuse.adjusted();
    expect(all[16] / (7 * lines)).toBeGreaterThan(0.95);
    expect(Math.abs(reuse.cold / lines - 1)).toBeLessThan(0.05); // 8192 sampled lines or less: about 1/sqrt(4096) at worst
  });
  it('of a line touched again at once is next to nothing, however few such lines there are', () => {
    const reuse = new ReuseDistance();
    for (let line = 0; line < 50_000; line++) reuse.add(line);
    for (let i = 0; i < 450_000; i++) reuse.add(123_456_789);
    const all = reuse.adjusted();
    expect(all[0] / 500_000).toBeGreaterThan(0.88);
  });
});

it('frequent values are kept, counts too high by no more than said', () => {
  const random = stream('frequent', 1);
  const frequent = new Frequent(100);
  const exact = new Map<number, number>();
  for (let i = 0; i < 100_000; i++) {
    const value = Math.floor(10_000 ** random()) - 1;
    frequent.add(value);
    exact.set(value, (exact.get(value) ?? 0) + 1);
  }
  for (const { value, count } of frequent.top(10)) {
    expect(count).toBeGreaterThanOrEqual(exact.get(value) ?? 0);
    expect(count - (exact.get(value) ?? 0)).toBeLessThanOrEqual(frequent.error);
  }
  const best = [...exact].sort((a, b) => b[1] - a[1])[0][0];
  expect(frequent.top(1)[0].value).toBe(best);
});

describe('a profile', () => {
  it('of a stream', async () => {
    const rows = Array.from(
      { length: 4096 },
      (_, i): Row => ({
        op: i % 4 ? 'R' : 'W',
        address: 256 * i,
        bytes: 256,
        timePs: 1000 * i,
        kernel: i & 1,
        flops: 512,
      }),
    );
    const p = await of(rows);
    expect(p).toMatchObject({
      rows: 4096,
      reads: 3072,
      writes: 1024,
      bytes: 2 ** 20,
      read_bytes: 3 * 2 ** 18,
      span_ps: 4_095_000,
    });
    expect(p.sequential_share).toBe(4095 / 4096);
    expect(p.strides).toEqual([{ bytes: 256, share: 4095 / 4096 }]);
    expect(p.sizes).toEqual([{ bytes: 256, share: 1 }]);
    expect(p.footprint).toMatchObject({ lines: 2 ** 14, bytes: 2 ** 20, exact: true });
    expect(p.reuse.cold_share).toBe(1);
    // bits 0 to 7 never change, bit 8 always, bit 9 every other time …
    expect(p.bits.map(({ toggles }) => Math.round(4095 * toggles)).slice(0, 11)).toEqual([
      0, 0, 0, 0, 0, 0, 0, 0, 4095, 2047, 1023,
    ]);
    expect(p.bits.at(-1)).toMatchObject({ bit: 19 });
    expect(p.bits[19].ones).toBe(0.5);
    expect(p.kernels).toEqual(
      ['a', 'b'].map((name) => ({ name, rows: 2048, bytes: 2 ** 19, flops: 2 ** 20, flops_per_byte: 2 })),
    );
    expect(p.burstiness).toBeCloseTo(1, 1);
  });

  it('says how the map spreads it, atom by atom as a run does', async () => {
    const pkg = smallPackage();
    const random = stream('spread', 1);
    const rows = Array.from(
      { length: 3000 },
      (): Row => ({
        op: 'R',
        address: Math.floor(random() ** 2 * 2 ** 20) * 16,
        bytes: 1 + Math.floor(random() * 600),
        timePs: 0,
      }),
    );
    const { spread } = await of(rows, pkg);
    const { recording } = await simulate(pkg, accessTrace(rows));
    const moved = recording.dram.reads.reduce((a, b) => a + b, 0);
    expect(spread?.atoms).toBe(moved);
    expect(spread?.pseudo_channels.max_share).toBeCloseTo(Math.max(...recording.dram.reads) / moved, 12);
    expect(spread?.banks).toMatchObject({ places: 32 * 32, mean_share: 1 / 1024 });
    expect(spread?.stacks).toMatchObject({ places: 1, effective: 1 });
  });

  it('of one row again and again is as uneven as can be', async () => {
    const pkg = smallPackage();
    const { spread, sequential_share } = await of(
      Array.from({ length: 100 }, (): Row => ({ op: 'R', address: 0, bytes: 32 })),
      pkg,
    );
    expect(spread).toMatchObject({
      row_hit_share: 0.99,
      banks: { effective: 1, max_share: 1 },
      hot_rows: [{ place: 'stack 0 channel 0.0 bank 0 row 0', share: 1 }],
    });
    expect(sequential_share).toBe(0);
  });

  it('is reported in lines of 100 columns', async () => {
    const random = stream('report', 1);
    const rows = Array.from(
      { length: 5000 },
      (): Row => ({ op: 'R', address: Math.floor(random() * 2 ** 26) * 64, bytes: 64, kernel: 1 }),
    );
    const text = profileReport(await of(rows, smallPackage()), { colour: false, width: 100 });
    expect(text.split('\n').filter((line) => [...line].length > 100)).toEqual([]);
    expect(text).toMatch(/^What is in it\n {2}5000 accesses of memory\.csv/);
  });
});
