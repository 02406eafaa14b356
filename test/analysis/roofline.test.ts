import { describe, expect, test } from 'vitest';
import { boundsOf } from '../../src/analysis/index.js';
import { kernelFacts, kernelResult, peakFlops, roofline } from '../../src/analysis/roofline.js';
import { stackOfRows } from '../../src/analysis/stacks.js';
import { smallPackage } from '../helpers/packages.js';
import { kernelDone, kernelRow, traceOf } from './recording.js';

const DRAM = { peak: 1e12, refreshDerated: 0.9e12, link: 2e12, bound: 0.9e12, limit: 'dram' } as const;

describe('roofline', () => {
  test('below the ridge the bound is intensity x bandwidth', () => {
    // 8e6 FLOP over 4e6 moved bytes = 2 FLOP/B; 2 x 0.9e12 = 1.8e12 FLOP/s, under the peak of 10e12
    // 8e6 FLOP in 10 us = 0.8e12 FLOP/s; ratio = 0.8 / 1.8
    const line = roofline({ flops: 8e6, usefulBytes: 2e6, movedBytes: 4e6, durationPs: 10e6 }, 10e12, DRAM);
    expect(line.intensityMoved).toBe(2);
    expect(line.intensityUseful).toBe(4);
    expect(line.boundFlopsPerS).toBeCloseTo(2 * 0.9e12, 0);
    expect(line.limit).toBe('dram');
    expect(line.attainedFlopsPerS).toBeCloseTo(0.8e12, 0);
    expect(line.attainedBytesPerS).toBeCloseTo(0.4e12, 0);
    expect(line.ratio).toBeCloseTo(0.8 / 1.8, 12);
  });

  test('above the ridge it is the peak of the number format', () => {
    // 100 FLOP/B x 0.9e12 = 90e12, over the peak of 10e12
    const line = roofline({ flops: 4e8, usefulBytes: 4e6, movedBytes: 4e6, durationPs: 50e6 }, 10e12, DRAM);
    expect(line.boundFlopsPerS).toBe(10e12);
    expect(line.limit).toBe('compute');
    expect(line.ratio).toBeCloseTo(8e12 / 10e12, 12);
  });

  test('without flops the bandwidth ceiling is the bound', () => {
    const line = roofline({ flops: 0, usefulBytes: 3e6, movedBytes: 6e6, durationPs: 10e6 }, 10e12, DRAM);
    expect(line.boundFlopsPerS).toBeNull();
    expect(line.intensityMoved).toBeNull();
    expect(line.ratio).toBeCloseTo(0.6e12 / 0.9e12, 12);
  });

  test('flops without bytes are bound by compute alone; nothing done has no ratio', () => {
    expect(roofline({ flops: 1e6, usefulBytes: 0, movedBytes: 0, durationPs: 1e6 }, 2e12, DRAM)).toMatchObject({
      limit: 'compute',
      boundFlopsPerS: 2e12,
      ratio: 0.5,
    });
    expect(roofline({ flops: 0, usefulBytes: 0, movedBytes: 0, durationPs: 0 }, 2e12, DRAM)).toMatchObject({
      limit: 'none',
      ratio: null,
    });
  });

  test('peaks add up over the dies used; work without a format runs at the highest', () => {
    const pkg = smallPackage();
    expect(peakFlops(pkg, [0], 'bf16')).toBe(100e12);
    expect(peakFlops(pkg, [0], '')).toBe(200e12);
    expect(peakFlops(pkg, [0], 'int4')).toBe(0);
  });
});

describe('a kernel of the trace', () => {
  test('its estimate counts for all launches, and only once all are done', () => {
    const pkg = smallPackage();
    const facts = kernelFacts(pkg, traceOf([kernelRow('k', { repeat: 3, estimatePs: 100 })]), 0);
    expect(
      kernelResult(pkg, kernelDone('k', { launches: 3 }), facts, undefined, stackOfRows(new Float64Array(0), 0, 1))
        .estimate_ps,
    ).toBe(300);
    expect(
      kernelResult(pkg, kernelDone('k', { launches: 2 }), facts, undefined, stackOfRows(new Float64Array(0), 0, 1))
        .estimate_ps,
    ).toBeNull();
  });
});

describe('bandwidth bounds', () => {
  test('all-bank refresh takes tRFCab of every tREFI', () => {
    const pkg = smallPackage('memory.0.refresh.mode=all-bank');
    const { tRFCab, tREFI } = pkg.memory[0].timings;
    const { peak, refreshDerated } = boundsOf(pkg, [0], 1, 0);
    expect(peak).toBe(819.2e9); // 32 pseudo-channels x 32 B every 2 ck of 625 ps
    expect(refreshDerated).toBeCloseTo(819.2e9 * (1 - tRFCab.ck / tREFI.ck), 0);
    expect(boundsOf(smallPackage(), [0], 1, 0).refreshDerated).toBe(819.2e9); // no refresh
  });

  test('reads and writes cross the links side by side: the longer of both times holds', () => {
    const pkg = smallPackage();
    const reads = boundsOf(pkg, [0], 1000, 0).link;
    const writes = boundsOf(pkg, [0], 0, 1000).link;
    // half and half: each direction needs half the time, so twice the slower direction's rate
    expect(boundsOf(pkg, [0], 1000, 1000).link).toBeCloseTo(2 * Math.min(reads, writes), 0);
    // three reads to a write: the up link is the longer, 4/3 of its rate
    expect(boundsOf(pkg, [0], 3000, 1000).link).toBeCloseTo((4 / 3) * reads, 0);
  });

  test('a narrow link is the bound', () => {
    const narrow = boundsOf(smallPackage('links.0.lanes=64'), [0], 1, 0);
    expect(narrow.limit).toBe('link');
    expect(narrow.bound).toBe(narrow.link);
    expect(narrow.link).toBeLessThan(64 * 2e9); // 64 lanes x 16 Gb/s, less overheads
  });
});
