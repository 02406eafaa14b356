import { InputError, nearest, type Where } from '../errors.js';
import { parseFrequency, parseTime } from '../units.js';
import type { Path } from './tree.js';

/** Where each value of a document stands, for the errors of everything that resolves it. */
export type Place = (path: Path) => Where;

export function unknownName(name: string, known: readonly string[], what: string, where: Where): InputError {
  const like = nearest(name, known);
  return new InputError({
    where,
    found: `'${name}'`,
    expected: `${what}: ${known.join(', ')}`,
    hint: like === undefined ? undefined : `Did you mean '${like}'?`,
  });
}

export function positive(value: number, text: string, where: Where): number {
  if (value > 0) return value;
  throw new InputError({ where, found: `'${text}'`, expected: 'more than zero' });
}

export function negative(text: string, where: Where): InputError {
  return new InputError({ where, found: `'${text}'`, expected: 'zero or more' });
}

export function whole(value: number, where: Where, unit: string): number {
  if (Number.isInteger(value)) return value;
  throw new InputError({ where, found: `${value} ${unit}`, expected: `a whole number of ${unit}` });
}

/** Period of a clock, ps: between 1 MHz and 50 GHz, beyond which no table of the engine is sized for it. */
export function clockPeriod(text: string, where: Where): number {
  const hertz = positive(parseFrequency(text, where), text, where);
  if (hertz >= 1e6 && hertz <= 50e9) return 1e12 / hertz;
  throw new InputError({ where, found: `'${text}'`, expected: 'a clock from 1 MHz to 50 GHz' });
}

export const LONGEST_LATENCY_PS = 10e6;

/** A fixed latency, ps, at most 10 us: what is under way in that time has to be kept. */
export function latency(text: string, where: Where): number {
  const ps = Math.round(parseTime(text, where));
  if (ps < 0) throw negative(text, where);
  if (ps <= LONGEST_LATENCY_PS) return ps;
  throw new InputError({ where, found: `'${text}'`, expected: 'at most 10 us' });
}
