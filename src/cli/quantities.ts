/** Options that carry a quantity with a unit. */
import { InputError } from '../errors.js';
import { parseBytes, parseFrequency, parseTime } from '../units.js';

/** Simulated time at which --until stops a run, ps; Infinity when it is not given. Throws InputError. */
export function parseUntil(text: string | undefined): number {
  if (text === undefined) return Number.POSITIVE_INFINITY;
  return positive('--until', text, parseTime(text, { file: '--until' }), 'a time greater than 0, for example 2ms');
}

/** Period of the clock named by --clock, ps; undefined when it is not given. Throws InputError. */
export function parseClock(text: string | undefined): number | undefined {
  if (text === undefined) return undefined;
  const hertz = parseFrequency(text, { file: '--clock' });
  return 1e12 / positive('--clock', text, hertz, 'a frequency greater than 0, for example 1.7GHz');
}

/** A whole number of bytes, `least` or more. Throws InputError. */
export function parseSize(option: string, text: string, least: number): number {
  const bytes = parseBytes(text, { file: option });
  if (Number.isSafeInteger(bytes) && bytes >= least) return bytes;
  throw new InputError({
    where: { file: option },
    found: `'${text}'`,
    expected: `a whole number of bytes, ${least} B or more`,
  });
}

function positive(option: string, text: string, value: number, expected: string): number {
  if (value > 0 && Number.isFinite(value)) return value;
  throw new InputError({ where: { file: option }, found: `'${text}'`, expected });
}
