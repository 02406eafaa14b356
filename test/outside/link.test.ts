import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

/*
 * UCIe's arithmetic (the Hot Chips 2023 UCIe tutorial and arXiv 2510.06513 table 1, through a digest): lanes x rate / 8 a
 * direction, no line code; a 68 B flit carries 64 B, 94.12 %; of a 256 B flit 240 B when 15 slots of 16 B carry data, 93.75 %, and
 * 236 B in the PCIe layout, 92.2 % (these two splits from memory), about 250 B at best, 97.7 %.
 */
const FLITS = [
  { flit: 68, overhead: 4, percent: 94.12 },
  { flit: 256, overhead: 16, percent: 93.75 },
  { flit: 256, overhead: 20, percent: 92.19 },
  { flit: 256, overhead: 6, percent: 97.66 },
];

/** A stack behind one module of lanes, which is slower than the stack. */
const behind = (lanes: number, rate: string, flit: number, overhead: number): Package =>
  smallPackage(
    `links.0.lanes=${lanes}`,
    `links.0.rate=${rate}`,
    `links.0.flit=${flit} B`,
    `links.0.flit_overhead=${overhead} B`,
    'compute.0.engines=8',
    'compute.0.window=256',
  );

describe('rates', () => {
  it.each([
    { lanes: 16, rate: '32 GT/s', raw: 64 },
    { lanes: 64, rate: '4 GT/s', raw: 32 },
    { lanes: 64, rate: '16 GT/s', raw: 128 },
    { lanes: 64, rate: '32 GT/s', raw: 256 },
    { lanes: 64, rate: '64 GT/s', raw: 512 },
  ])('$lanes lanes at $rate: $raw GB/s a direction', ({ lanes, rate, raw }) => {
    expect(behind(lanes, rate, 68, 4).links[0].rawBytesPerS).toBeCloseTo(raw * 1e9, 3);
  });

  it('64 lanes at 16 GT/s with 68 B flits: 120.5 GB/s of payload', () => {
    expect(behind(64, '16 GT/s', 68, 4).links[0].payloadBytesPerS / 1e9).toBeCloseTo(120.5, 1);
  });
});

/*
 * Tolerance, chosen beforehand: 95 % of the ceiling from below, since the first request and the last answer cross an idle link;
 * none from above, neither for what is carried nor for the flits that carry it.
 */
const LEAST = 0.95;
const ROWS = 4000;

describe.each(FLITS)(
  '$flit B flits with $overhead B of overhead, 64 lanes at 16 GT/s',
  ({ flit, overhead, percent }) => {
    it.each([
      { way: 'up', op: 'R' },
      { way: 'down', op: 'W' },
    ] as const)(`a saturated $way link carries ${percent} % of 128 GB/s, headers included`, async ({ way, op }) => {
      const pkg = behind(64, '16 GT/s', flit, overhead);
      const [link] = pkg.links;
      expect((100 * (flit - overhead)) / flit).toBeCloseTo(percent, 2);
      expect(pkg.memory[0].peakBytesPerS).toBeGreaterThan(4 * link.rawBytesPerS); // the link is what holds
      function* rows(): Generator<Row> {
        for (let i = 0; i < ROWS; i++) yield { op, address: 1024 * i, bytes: 1024 };
      }
      const { recording } = await simulate(pkg, accessTrace(rows()));
      const { makespanPs, links } = recording;
      const seconds = makespanPs * 1e-12;
      const payload = way === 'up' ? links[0].payloadBytesUp : links[0].payloadBytesDown;
      const flits = way === 'up' ? links[0].flitsUp : links[0].flitsDown;
      const header = way === 'up' ? link.responseHeaderBytes : link.requestHeaderBytes;
      expect(payload).toBe(ROWS * 4 * (256 + header)); // requests of 256 B
      expect((flits * flit) / seconds).toBeLessThanOrEqual(128e9);
      expect(payload / seconds / 128e9).toBeLessThanOrEqual((flit - overhead) / flit);
      expect(payload / seconds / 128e9).toBeGreaterThanOrEqual((LEAST * percent) / 100);
    });
  },
);
