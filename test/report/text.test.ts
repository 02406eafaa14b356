import { describe, expect, test } from 'vitest';
import { buildResult, type Result } from '../../src/analysis/index.js';
import { jsonReport, textReport } from '../../src/report/index.js';
import { kernelDone, kernelRow, made, traceOf } from '../analysis/recording.js';

const PLAIN = { colour: false, width: 100 };
const ORIGIN = {
  version: '9.9.9',
  options: { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY },
  overrides: [],
} as const;

function sample(): Result {
  const { pkg, trace, recording, delays } = made();
  return buildResult(pkg, trace, ORIGIN, recording, delays);
}

/** Columns the text takes in a terminal: letters, not bytes or colour codes. */
function widest(text: string): number {
  return Math.max(...text.split('\n').map((line) => [...bare(line)].length));
}

function bare(text: string): string {
  // biome-ignore lint/suspicious/noControlCharactersInRegex: colour codes are what is looked for
  return text.replaceAll(/\u001b\[\d+m/g, '');
}

describe('terminal report', () => {
  test('plain, at 100 columns', () => {
    expect(textReport(sample(), PLAIN)).toMatchSnapshot();
  });

  test('with colour it says the same', () => {
    const coloured = textReport(sample(), { colour: true, width: 100 });
    expect(coloured).toMatchSnapshot();
    expect(bare(coloured)).toBe(textReport(sample(), PLAIN));
    expect(coloured).toContain('\u001b[');
  });

  test('asks of interface: verdict first, then bandwidth, stack, latency, compute, kernels', () => {
    const text = textReport(sample(), PLAIN);
    const order = [
      'binds',
      'Bandwidth',
      'Where the DRAM clocks went',
      'Read latency',
      'Compute utilization',
      'Kernels',
      'Checks',
      'estimates',
    ];
    const places = order.map((word) => text.indexOf(word));
    expect(places.every((at) => at >= 0)).toBe(true);
    expect([...places].sort((a, b) => a - b)).toEqual(places);
  });

  test('never wider than 100 columns, whatever the names and numbers', () => {
    const result = sample();
    const [gather, product] = result.kernels;
    const long = {
      name: 'a_kernel_with_a_name_that_goes_on_and_on',
      duration_ps: 123_456_789_012,
      roofline_ratio: 0.123456,
      estimate_ps: 1,
    };
    const busy: Result = {
      ...result,
      kernels: [
        { ...gather, ...long },
        { ...product, ...long, estimate_ps: 1e11 },
      ],
    };
    expect(widest(textReport(busy, PLAIN))).toBeLessThanOrEqual(100);
  });

  test('eleven kernels take at most 48 lines', () => {
    const result = sample();
    const eleven = { ...result, kernels: Array.from({ length: 11 }, () => result.kernels[0]) };
    expect(textReport(eleven, PLAIN).split('\n').length).toBeLessThanOrEqual(48);
  });

  test('a line never breaks between a number and its unit', () => {
    const result = sample();
    const sentence = `${'x'.repeat(96)} 5.25 % and ${'x'.repeat(85)} 5.00 GB/s.`;
    const text = textReport({ ...result, verdict: { ...result.verdict, sentence } }, PLAIN);
    expect(text).toContain('\n5.25 % and');
    expect(text).toContain('\n5.00 GB/s.');
  });

  test('classes below a thousandth of the clocks are one line, and the shares still add up', () => {
    const result = sample();
    const stack = { ...result.bandwidth_stack, turnaround: 20, column_gap: 20, starved_drain: 32 * 400 - 40 };
    const text = textReport({ ...result, bandwidth_stack: stack }, PLAIN);
    expect(text).not.toMatch(/turnaround|column gap/); // 20 of 51,200 clocks each
    expect(text).toMatch(/other \(2\) +0\.1 %/);
    const section = text.slice(text.indexOf('Where the DRAM'), text.indexOf('Read latency'));
    const shares = [...section.matchAll(/(\d+\.\d) %/g)].map(([, share]) => Number(share));
    expect(shares.reduce((a, b) => a + b, 0)).toBeCloseTo(100, 0);
  });

  test('of very many kernels the longest are shown and the rest counted', () => {
    const result = sample();
    const kernels = Array.from({ length: 50 }, (_, i) => ({ ...result.kernels[0], name: `k${i}.`, duration_ps: i }));
    const text = textReport({ ...result, kernels }, PLAIN);
    expect(text).toContain('k49.');
    expect(text).not.toContain('k10.');
    expect(text).toContain('and 30 shorter ones');
  });

  test('a failed check is shown with its figures, and that the result must not be used', () => {
    const check = { name: 'bytes asked are answered', ok: false, got: 5, expected: 6, tolerance: 0 };
    const text = textReport({ ...sample(), checks: [check] }, PLAIN);
    expect(text).toContain('1 of 1 FAILED; this result must not be used');
    expect(text).toContain('bytes asked are answered: 5, expected 6');
  });

  test('a partial run, skipped rows, overrides and the package’s caution are said', () => {
    const result = sample();
    const { provenance } = result;
    const text = textReport(
      {
        ...result,
        partial: true,
        package: { ...result.package, caution: 'Invented.' },
        provenance: {
          ...provenance,
          skipped_rows: 3,
          options: { ...provenance.options, overrides: ['memory.0.stacks=2'] },
        },
      },
      PLAIN,
    );
    for (const part of ['Partial', '3 bad rows skipped', 'memory.0.stacks=2', 'Invented.'])
      expect(text).toContain(part);
  });

  test('names from files cannot steer the terminal', () => {
    const result = sample();
    const kernels = [{ ...result.kernels[0], name: 'evil\u001b[2J\u202e\nname' }];
    const text = textReport({ ...result, kernels }, PLAIN);
    expect(text).not.toContain('\u001b');
    expect(text).toContain('evil?[2J??name');
  });

  test('a run in which nothing happened has no NaN in it', () => {
    const { pkg, recording, delays } = made();
    const empty = {
      ...recording,
      makespanPs: 0,
      elapsedCk: 0,
      kernels: [kernelDone('idle', { startPs: -1, endPs: 0, launches: 0 })],
      bandwidthStack: new Float64Array(recording.bandwidthStack.length),
    };
    const result = buildResult(pkg, traceOf([kernelRow('idle')]), ORIGIN, { ...empty, partial: true }, delays);
    const text = textReport(result, PLAIN);
    expect(text).not.toMatch(/NaN|Infinity|undefined/);
    expect(text).toMatch(/idle +not begun/);
    expect(jsonReport(result)).not.toContain('null,\n  "bandwidth"');
  });
});
