import { InputError, nearest, type Where } from './errors.js';

/**
 * Quantities with units: the only place where a unit becomes a number and a number gets its unit back. Inside the program time
 * is ps, sizes are bytes, rates are per second; decimal prefixes are powers of 1000, binary ones (KiB …) powers of 1024.
 */

type Units = Readonly<Record<string, number>>;

const TIME: Units = { ps: 1, ns: 1e3, us: 1e6, ms: 1e9, s: 1e12 };
const SIZE: Units = {
  B: 1,
  kB: 1e3,
  MB: 1e6,
  GB: 1e9,
  TB: 1e12,
  KiB: 2 ** 10,
  MiB: 2 ** 20,
  GiB: 2 ** 30,
  TiB: 2 ** 40,
};
const FREQUENCY: Units = { Hz: 1, kHz: 1e3, MHz: 1e6, GHz: 1e9 };
const TRANSFERS: Units = { 'MT/s': 1e6, 'GT/s': 1e9 };
const FLOPS: Units = { FLOP: 1, kFLOP: 1e3, MFLOP: 1e6, GFLOP: 1e9, TFLOP: 1e12, PFLOP: 1e15 };
const FLOP_RATE: Units = { 'GFLOP/s': 1e9, 'TFLOP/s': 1e12, 'PFLOP/s': 1e15 };
const LENGTH: Units = { um: 1e-3, mm: 1, cm: 10 };
const TEMPERATURE: Units = { C: 1 };

const QUANTITY = /^([-+]?(?:\d+\.?\d*|\.\d+)(?:e[-+]?\d+)?)\s*(.*)$/i;

/** Reads `number unit` in the given units; throws InputError that names the units that would do. */
function parse(text: string, units: Units, where: Where, what: string): number {
  const names = Object.keys(units);
  const expected = `${what} with a unit (${names.join(', ')})`;
  const match = QUANTITY.exec(text.trim());
  if (match === null) throw new InputError({ where, found: `'${text}'`, expected });
  const unit = match[2].replace(/^[µμ]/, 'u'); // the micro sign and the Greek letter
  const factor = Object.hasOwn(units, unit) ? units[unit] : undefined;
  if (factor === undefined) {
    const like = nearest(unit, names);
    throw new InputError({
      where,
      found:
        match[2] === ''
          ? `'${text}', a number without a unit`
          : `'${text}', whose unit '${match[2]}' is not one of ${what}`,
      expected,
      hint: like === undefined ? undefined : `Did you mean '${match[1]} ${like}'?`,
    });
  }
  const value = Number(match[1]) * factor;
  if (value === Number.POSITIVE_INFINITY || value === Number.NEGATIVE_INFINITY) {
    throw new InputError({ where, found: `'${text}', beyond any number the program can hold`, expected });
  }
  return clean(value);
}

/** Takes the last bits of decimal arithmetic off: 1.1 ns is 1100 ps, not 1100.0000000000002. */
function clean(value: number): number {
  return Number(value.toPrecision(15));
}

/** Time in ps. */
export const parseTime = (text: string, where: Where): number => parse(text, TIME, where, 'a time');
/** Size in bytes. */
export const parseBytes = (text: string, where: Where): number => parse(text, SIZE, where, 'a size');
/** Clock frequency in Hz. */
export const parseFrequency = (text: string, where: Where): number =>
  parse(text, FREQUENCY, where, 'a clock frequency');
/** Transfers a second and lane. */
export const parseTransfers = (text: string, where: Where): number => parse(text, TRANSFERS, where, 'a transfer rate');
/** Compute rate in FLOP/s. */
export const parseFlopRate = (text: string, where: Where): number => parse(text, FLOP_RATE, where, 'a compute rate');
/** Length in mm. */
export const parseLength = (text: string, where: Where): number => parse(text, LENGTH, where, 'a length');
/** Temperature in degrees Celsius. */
export const parseTemperature = (text: string, where: Where): number =>
  parse(text, TEMPERATURE, where, 'a temperature');

/** What a quantity is of; 'number' has no unit. */
export type QuantityKind = keyof typeof KINDS | 'number';

const KINDS = {
  time: TIME,
  size: SIZE,
  bandwidth: { 'B/s': 1, 'kB/s': 1e3, 'MB/s': 1e6, 'GB/s': 1e9, 'TB/s': 1e12 },
  frequency: FREQUENCY,
  'transfer rate': TRANSFERS,
  work: FLOPS,
  'compute rate': { 'FLOP/s': 1, ...FLOP_RATE },
  length: LENGTH,
  temperature: TEMPERATURE,
  clocks: { ck: 1 },
  power: { mW: 1e-3, W: 1, kW: 1e3 },
  energy: { pJ: 1, nJ: 1e3, uJ: 1e6, mJ: 1e9, J: 1e12 },
  'energy per bit': { 'fJ/bit': 1e-3, 'pJ/bit': 1 },
} as const satisfies Record<string, Units>;

/** Every unit with the kind of quantity it belongs to and its factor; `%` is a number. */
export const UNITS: ReadonlyMap<string, readonly [kind: QuantityKind, factor: number]> = new Map([
  ['%', ['number', 0.01]] as const,
  ...Object.entries(KINDS).flatMap(([kind, units]) =>
    Object.entries(units).map(([unit, factor]) => [unit, [kind as QuantityKind, factor]] as const),
  ),
]);

export interface Quantity {
  readonly value: number; // in the base unit of its kind: ps, B, B/s, Hz, transfers/s, FLOP, mm, C, ck, W, pJ, pJ/bit
  readonly kind: QuantityKind;
}

/** A quantity of whatever kind, or a plain number; null when the text is neither. */
export function parseQuantity(text: string): Quantity | null {
  const match = QUANTITY.exec(text.trim());
  if (match === null) return null;
  if (match[2] === '') return { value: Number(match[1]), kind: 'number' };
  const unit = UNITS.get(match[2]);
  return unit === undefined ? null : { value: clean(Number(match[1]) * unit[1]), kind: unit[0] };
}

/** Work in FLOP; a plain number counts operations and needs no unit. */
export function parseFlops(text: string, where: Where): number {
  const plain = Number(text);
  if (text.trim() !== '' && Number.isFinite(plain) && plain >= 0) return plain;
  return parse(text, FLOPS, where, 'an amount of work');
}

/** A separation as files give it: a time, clocks (`4 ck`), or the greater of both (`max(4 ck, 2.5 ns)`). */
export interface Separation {
  readonly ck: number; // 0 when not given
  readonly ps: number; // 0 when not given
}

export function parseSeparation(text: string, where: Where): Separation {
  const both = /^max\(([^,]+),([^,]+)\)$/.exec(text.trim());
  if (both !== null) {
    const [a, b] = [parseSeparation(both[1].trim(), where), parseSeparation(both[2].trim(), where)];
    return { ck: Math.max(a.ck, b.ck), ps: Math.max(a.ps, b.ps) };
  }
  const clocks = /^(\d+)\s*ck$/.exec(text.trim());
  if (clocks !== null) return { ck: Number(clocks[1]), ps: 0 };
  const ps = parse(text, { ...TIME, ck: Number.NaN }, where, 'a time or a whole number of clocks');
  if (Number.isNaN(ps))
    throw new InputError({ where, found: `'${text}'`, expected: 'a whole number of clocks, for example 4 ck' });
  return { ck: 0, ps };
}

// ---- for people: three or four significant digits ----------------------------------------------------------------------------

/** Up to four significant digits, no exponent, no trailing zeros after the point beyond those. */
function digits(value: number): string {
  if (value === 0) return '0';
  const magnitude = Math.floor(Math.log10(Math.abs(value)));
  return value.toFixed(Math.max(0, Math.min(3, 3 - magnitude - (Math.abs(value) >= 100 ? 0 : 1))));
}

function scaled(value: number, steps: readonly (readonly [number, string])[]): string {
  let at = steps.findIndex(([factor]) => Math.abs(value) >= factor);
  if (at < 0) at = steps.length - 1;
  const [factor, unit] = steps[at];
  const text = digits(value / factor);
  const shown = Number(text) * factor;
  // what rounds up to one of the next greater unit is written in that unit
  if (at > 0 && Math.abs(shown) >= steps[at - 1][0]) return `${digits(shown / steps[at - 1][0])} ${steps[at - 1][1]}`;
  return `${text} ${unit}`;
}

/** Bytes with binary prefixes. */
export const formatBytes = (bytes: number): string =>
  scaled(bytes, [
    [2 ** 40, 'TiB'],
    [2 ** 30, 'GiB'],
    [2 ** 20, 'MiB'],
    [2 ** 10, 'KiB'],
    [1, 'B'],
  ]);

/** Bytes a second with decimal prefixes. */
export const formatBandwidth = (bytesPerS: number): string =>
  scaled(bytesPerS, [
    [1e12, 'TB/s'],
    [1e9, 'GB/s'],
    [1e6, 'MB/s'],
    [1e3, 'kB/s'],
    [1, 'B/s'],
  ]);

/** A time in ps. */
export const formatTime = (ps: number): string =>
  scaled(ps, [
    [1e12, 's'],
    [1e9, 'ms'],
    [1e6, 'us'],
    [1e3, 'ns'],
    [1, 'ps'],
  ]);

/** A plain count: 1234 stays, 1234567 becomes 1.235 M. */
export const formatCount = (count: number): string =>
  Math.abs(count) < 1e4
    ? Number.isInteger(count)
      ? String(count)
      : digits(count)
    : scaled(count, [
        [1e12, 'T'],
        [1e9, 'G'],
        [1e6, 'M'],
        [1e3, 'k'],
      ]);

/** FLOP a second. */
export const formatFlops = (flopsPerS: number): string =>
  scaled(flopsPerS, [
    [1e15, 'PFLOP/s'],
    [1e12, 'TFLOP/s'],
    [1e9, 'GFLOP/s'],
    [1e6, 'MFLOP/s'],
    [1, 'FLOP/s'],
  ]);

/** A fraction of one, as per cent. */
export const formatPercent = (fraction: number): string => `${digits(100 * fraction)} %`;
