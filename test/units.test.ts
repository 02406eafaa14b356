import { describe, expect, it, test } from 'vitest';
import { toClocks } from '../src/config/timing.js';
import * as units from '../src/units.js';

const where = { file: 'f.yaml', line: 3, column: 9, path: 'a.b' };

describe('quantities', () => {
  it.each([
    [units.parseTime, '14 ns', 14_000],
    [units.parseTime, '3.9us', 3_900_000],
    [units.parseTime, '1.1 ns', 1100], // not 1100.0000000000002
    [units.parseTime, '2 ms', 2e9],
    [units.parseTime, '1e-3 s', 1e9],
    [units.parseTime, '.5 ps', 0.5],
    [units.parseBytes, '64 MiB', 64 * 2 ** 20],
    [units.parseBytes, '1.5 GB', 1.5e9],
    [units.parseBytes, '256 B', 256],
    [units.parseFrequency, '1.6 GHz', 1.6e9],
    [units.parseTransfers, '32 GT/s', 32e9],
    [units.parseTransfers, '6400 MT/s', 6.4e9],
    [units.parseFlopRate, '900 TFLOP/s', 9e14],
    [units.parseFlops, '137.4 GFLOP', 1.374e11],
    [units.parseFlops, '1e6', 1e6], // a plain count of operations
    [units.parseLength, '32 mm', 32],
    [units.parseLength, '500 um', 0.5],
    [units.parseTemperature, '-40 C', -40],
    [units.parseTime, '2 µs', 2e6], // the micro sign
    [units.parseTime, '2 μs', 2e6], // the Greek letter
    [units.parseTime, '  7   ns ', 7000],
    [units.parseTime, '+7 ns', 7000],
    [units.parseTime, '-7 ns', -7000], // whether less than zero makes sense is for the key to say
    [units.parseTime, '1e300 ps', 1e300],
    [units.parseBytes, '1 KiB', 1024],
    [units.parseBytes, '1 kB', 1000],
    [units.parseBytes, '3 MB', 3e6],
    [units.parseBytes, '2 GiB', 2 ** 31],
    [units.parseBytes, '2 TB', 2e12],
    [units.parseBytes, '2 TiB', 2 ** 41],
    [units.parseFrequency, '50 Hz', 50],
    [units.parseFrequency, '3 kHz', 3000],
    [units.parseFrequency, '900 MHz', 9e8],
    [units.parseFlopRate, '5 GFLOP/s', 5e9],
    [units.parseFlopRate, '1.6 PFLOP/s', 1.6e15],
    [units.parseFlops, '0', 0],
    [units.parseFlops, '7 FLOP', 7],
    [units.parseFlops, '2 PFLOP', 2e15],
    [units.parseLength, '1.2 cm', 12],
  ] as const)('%p of %s', (parse, text, value) => {
    expect(parse(text, where)).toBe(value);
  });

  it.each([
    [units.parseTime, '14', "found '14', a number without a unit; expected a time with a unit (ps, ns, us, ms, s)"],
    [
      units.parseTime,
      '14 nS',
      "found '14 nS', whose unit 'nS' is not one of a time; expected a time with a unit (ps, ns, us, ms, s). Did you mean '14 ns'?",
    ],
    [units.parseTime, 'soon', "found 'soon'; expected a time with a unit (ps, ns, us, ms, s)"],
    [units.parseTime, '', "found ''; expected a time with a unit (ps, ns, us, ms, s)"],
    [
      units.parseBytes,
      '64 ns',
      "found '64 ns', whose unit 'ns' is not one of a size; expected a size with a unit (B, kB, MB, GB, TB, KiB, MiB, GiB, TiB)",
    ],
    [
      units.parseFlops,
      '3 FLOPS',
      "found '3 FLOPS', whose unit 'FLOPS' is not one of an amount of work; expected an amount of work with a unit (FLOP, kFLOP, MFLOP, GFLOP, TFLOP, PFLOP). Did you mean '3 FLOP'?",
    ],
    [
      units.parseTime,
      '1e300 s',
      "found '1e300 s', beyond any number the program can hold; expected a time with a unit (ps, ns, us, ms, s)",
    ],
    [
      units.parseLength,
      '-1e400 mm',
      "found '-1e400 mm', beyond any number the program can hold; expected a length with a unit (um, mm, cm)",
    ],
    [
      units.parseFrequency,
      '1.6 ghz',
      "found '1.6 ghz', whose unit 'ghz' is not one of a clock frequency; expected a clock frequency with a unit (Hz, kHz, MHz, GHz). Did you mean '1.6 GHz'?",
    ],
    [
      units.parseTransfers,
      '16',
      "found '16', a number without a unit; expected a transfer rate with a unit (MT/s, GT/s)",
    ],
    [
      units.parseFlopRate,
      '400 TFLOP',
      "found '400 TFLOP', whose unit 'TFLOP' is not one of a compute rate; expected a compute rate with a unit (GFLOP/s, TFLOP/s, PFLOP/s). Did you mean '400 TFLOP/s'?",
    ],
    [units.parseTemperature, '60', "found '60', a number without a unit; expected a temperature with a unit (C)"],
    [
      units.parseTemperature,
      '330 K',
      "found '330 K', whose unit 'K' is not one of a temperature; expected a temperature with a unit (C)",
    ],
    [
      units.parseBytes,
      '64 KB',
      "found '64 KB', whose unit 'KB' is not one of a size; expected a size with a unit (B, kB, MB, GB, TB, KiB, MiB, GiB, TiB). Did you mean '64 kB'?",
    ],
    [
      units.parseTime,
      '0x10 ns',
      "found '0x10 ns', whose unit 'x10 ns' is not one of a time; expected a time with a unit (ps, ns, us, ms, s)",
    ],
    [units.parseTime, 'NaN ns', "found 'NaN ns'; expected a time with a unit (ps, ns, us, ms, s)"],
    [
      units.parseTime,
      '1,5 ns',
      "found '1,5 ns', whose unit ',5 ns' is not one of a time; expected a time with a unit (ps, ns, us, ms, s)",
    ],
    [
      units.parseTime,
      '1 constructor',
      "found '1 constructor', whose unit 'constructor' is not one of a time; expected a time with a unit (ps, ns, us, ms, s)",
    ],
  ] as const)('%p refuses %j', (parse, text, message) => {
    expect(() => parse(text, where)).toThrow(`f.yaml:3:9: a.b: ${message}`);
  });
});

describe('separations', () => {
  it.each([
    ['4 ck', { ck: 4, ps: 0 }],
    ['2.5 ns', { ck: 0, ps: 2500 }],
    ['max(4 ck, 2.5 ns)', { ck: 4, ps: 2500 }],
    ['max(2.5ns,4ck)', { ck: 4, ps: 2500 }],
  ])('%s', (text, value) => {
    expect(units.parseSeparation(text, where)).toEqual(value);
  });
  test('clocks are whole', () => {
    expect(() => units.parseSeparation('1.5 ck', where)).toThrow('a whole number of clocks, for example 4 ck');
    expect(() => units.parseSeparation('max(4 ck)', where)).toThrow('a time or a whole number of clocks');
  });
});

/*
 * JEDEC times become clocks rounding up, less a guard for times that are whole but for their own rounding (rounding algorithm of
 * JESD79-5, from memory); tREFI rounds down.
 */
describe('times to clocks', () => {
  const up = (ns: number, clockPs: number): number => toClocks({ ck: 0, ps: 1000 * ns }, clockPs);
  it.each([
    [16, 625, 26], // 25.6
    [2.5, 625, 4], // exactly 4
    [15, 1000 / 3, 45], // HBM4 at 3 GHz: 45 ck is 15.0 ns (JESD270-4, through a cross-standard digest)
    [14.3, 1000 / 3, 43], // tRCDWR of the same: 42.9
    [19, 1000 / 3, 57],
    [13.75, 625, 22], // DDR4-3200, CL 22
    [45.75, 625, 74], // 73.2
    [16.67, 1000 / 2.4, 41], // 40.008: beyond the guard
    [16.668, 1000 / 2.4, 41],
    [16.667, 1000 / 2.4, 40], // 40.0008: within it
  ])('%d ns at %d ps are %d ck', (ns, clockPs, ck) => {
    expect(up(ns, clockPs)).toBe(ck);
  });
  test('tREFI rounds down, also where it is whole but for its rounding', () => {
    expect(toClocks({ ck: 0, ps: 3_900_000 }, 625, 'down')).toBe(6240);
    expect(toClocks({ ck: 0, ps: 3_900_400 }, 625, 'down')).toBe(6240);
    expect(toClocks({ ck: 0, ps: 3_899_999 }, 625, 'down')).toBe(6240);
    expect(toClocks({ ck: 0, ps: 3_899_000 }, 625, 'down')).toBe(6238);
  });
  test('the guard forgives 0.3 % of a clock and no more', () => {
    expect(toClocks({ ck: 0, ps: 4 * 625 + 0.0029 * 625 }, 625)).toBe(4);
    expect(toClocks({ ck: 0, ps: 4 * 625 + 0.0031 * 625 }, 625)).toBe(5);
    expect(toClocks({ ck: 0, ps: 4 * 625 - 0.0029 * 625 }, 625, 'down')).toBe(4);
    expect(toClocks({ ck: 0, ps: 4 * 625 - 0.0031 * 625 }, 625, 'down')).toBe(3);
    expect(toClocks({ ck: 0, ps: 0 }, 625)).toBe(0);
  });
  test('the greater of clocks and time', () => {
    expect(toClocks({ ck: 4, ps: 2500 }, 1000)).toBe(4);
    expect(toClocks({ ck: 4, ps: 2500 }, 500)).toBe(5);
  });
});

describe('for people', () => {
  it.each([
    [units.formatTime(322_286_000), '322.3 us'],
    [units.formatTime(999), '999.0 ps'],
    [units.formatTime(0), '0 ps'],
    [units.formatTime(3_900_000), '3.90 us'],
    [units.formatBytes(2 ** 34), '16.0 GiB'],
    [units.formatBytes(96), '96.0 B'],
    [units.formatBandwidth(819.2e9), '819.2 GB/s'],
    [units.formatBandwidth(4.9152e12), '4.92 TB/s'],
    [units.formatCount(1234), '1234'],
    [units.formatCount(1_234_567), '1.23 M'],
    [units.formatFlops(1.57e15), '1.57 PFLOP/s'],
    [units.formatPercent(0.4076), '40.8 %'],
    [units.formatPercent(1), '100.0 %'],
    // what rounds up to the next unit is written in it
    [units.formatTime(999_949), '999.9 ns'],
    [units.formatTime(999_960), '1.00 us'],
    [units.formatTime(-999_960), '-1.00 us'],
    [units.formatBytes(2 ** 20 - 1), '1.00 MiB'],
    [units.formatBytes(1023 * 1024), '1023 KiB'],
    [units.formatBandwidth(999.97e9), '1.00 TB/s'],
    [units.formatCount(999_960), '1.00 M'],
    [units.formatCount(9999), '9999'],
    [units.formatCount(10_000), '10.0 k'],
    [units.formatCount(2.5), '2.50'],
    [units.formatTime(0.25), '0.250 ps'],
    [units.formatBandwidth(3.2e15), '3200 TB/s'],
  ])('%s', (text, expected) => {
    expect(text).toBe(expected);
  });
});
