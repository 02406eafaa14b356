import { InputError, nearest, type Where } from '../errors.js';
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
