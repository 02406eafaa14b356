/** Pattern text, such as `zipf s=1.1 granule=256B span=8GiB`, to a Pattern. */
import { InputError, nearest, type Where } from '../errors.js';
import { parseBytes } from '../units.js';
import type { Pattern, PatternName } from './batch.js';

type Parameter = 'granule' | 'span' | 'stride' | 's' | 'rows' | 'width' | 'pitch';

/**
 * What each pattern takes, and the value a parameter has when it is left out; `null` means it must be given. A span of 0 is the
 * kernel's own size, a strided granule of 0 one request of the die. 64 B, a cache line, and s = 1 are common practice, no source.
 */
export const PATTERNS: Readonly<Record<PatternName, Readonly<Partial<Record<Parameter, number | null>>>>> = {
  sequential: {},
  strided: { stride: null, granule: 0, span: 0 },
  uniform: { granule: 64, span: 0 },
  zipf: { s: 1, granule: 64, span: 0 },
  chase: { granule: 64, span: 0 },
  block: { rows: null, width: null, pitch: null },
};

const NAMES = Object.keys(PATTERNS) as PatternName[];
const EXAMPLES: Readonly<Record<PatternName, string>> = {
  sequential: 'sequential',
  strided: 'strided stride=4KiB',
  uniform: 'uniform granule=64B span=2GiB',
  zipf: 'zipf s=1.1 granule=256B span=8GiB',
  chase: 'chase granule=64B span=1GiB',
  block: 'block rows=128 width=256B pitch=16KiB',
};
const LARGEST_GRANULE = 2 ** 30; // bytes: one access must fit a signed 32-bit length
const LARGEST_SPAN = 2 ** 52;
const LARGEST_S = 20; // beyond it rank 1 takes all but one in a million

/** Understands a pattern. `where` goes into the errors. Throws InputError. */
export function parsePattern(text: string, where: Where): Pattern {
  const [word = '', ...rest] = text.trim().split(/\s+/);
  const name = NAMES.find((known) => known === word);
  if (name === undefined) {
    const like = nearest(word, NAMES);
    throw new InputError({
      where,
      found: word === '' ? 'an empty pattern' : `unknown pattern '${word}'`,
      expected: `one of ${NAMES.join(', ')}`,
      hint: like === undefined ? `for example '${EXAMPLES.zipf}'` : `did you mean '${like}'?`,
    });
  }
  const taken = PATTERNS[name];
  const values: Record<Parameter, number> = { granule: 0, span: 0, stride: 0, s: 0, rows: 0, width: 0, pitch: 0 };
  const given = new Set<string>();
  for (const part of rest) {
    const [key, value] = splitPair(part, name, where);
    if (!Object.hasOwn(taken, key)) {
      const like = nearest(key, Object.keys(taken));
      throw new InputError({
        where,
        found: `parameter '${key}' of pattern '${name}'`,
        expected: Object.keys(taken).length > 0 ? `one of ${Object.keys(taken).join(', ')}` : 'no parameters',
        hint: like === undefined ? `for example '${EXAMPLES[name]}'` : `did you mean '${like}'?`,
      });
    }
    if (given.has(key)) {
      throw new InputError({
        where,
        found: `parameter '${key}' twice`,
        expected: 'each parameter once',
        hint: 'remove one of them',
      });
    }
    given.add(key);
    values[key as Parameter] = parameterValue(key as Parameter, value, where);
  }
  for (const [key, byDefault] of Object.entries(taken)) {
    if (given.has(key)) continue;
    if (byDefault === null) {
      throw new InputError({
        where,
        found: `pattern '${name}' without '${key}'`,
        expected: `'${name}' with ${Object.keys(taken).join(', ')}`,
        hint: `for example '${EXAMPLES[name]}'`,
      });
    }
    values[key as Parameter] = byDefault;
  }
  checkTogether(name, values, where);
  return { name, ...values, text: text.trim() };
}

/** The pattern of a size that comes without one. */
export const SEQUENTIAL: Pattern = {
  name: 'sequential',
  granule: 0,
  span: 0,
  stride: 0,
  s: 0,
  rows: 0,
  width: 0,
  pitch: 0,
  text: 'sequential',
};

function splitPair(part: string, name: PatternName, where: Where): [string, string] {
  const equals = part.indexOf('=');
  if (equals > 0 && equals < part.length - 1) return [part.slice(0, equals), part.slice(equals + 1)];
  throw new InputError({
    where,
    found: `'${part}' after '${name}'`,
    expected: 'parameters written name=value, without blanks inside',
    hint: `for example '${EXAMPLES[name]}'`,
  });
}

function parameterValue(key: Parameter, text: string, where: Where): number {
  const at = { ...where, path: where.path === undefined ? key : `${where.path}.${key}` };
  if (key === 's') {
    const s = /^\d*\.?\d+$/.test(text) ? Number(text) : Number.NaN;
    if (s > 0 && s <= LARGEST_S) return s;
    throw new InputError({
      where: at,
      found: `s=${text}`,
      expected: `a number above 0, up to ${LARGEST_S}`,
      hint: 'the likelihood of rank k goes as 1/k^s; s=0 would be the pattern uniform',
    });
  }
  if (key === 'rows') {
    const rows = /^\d+$/.test(text) ? Number(text) : Number.NaN;
    if (rows >= 1 && rows <= 2 ** 31) return rows;
    throw new InputError({
      where: at,
      found: `rows=${text}`,
      expected: 'a whole number from 1 up',
      hint: 'rows of one block, a count without unit',
    });
  }
  const bytes = parseBytes(text, at);
  const most = key === 'granule' ? LARGEST_GRANULE : LARGEST_SPAN;
  if (Number.isInteger(bytes) && bytes >= 1 && bytes <= most) return bytes;
  throw new InputError({
    where: at,
    found: `${key}=${text}`,
    expected: `a whole number of bytes from 1 to ${most}`,
    hint: 'for example 64B, 4KiB or 2GiB',
  });
}

function checkTogether(name: PatternName, values: Readonly<Record<Parameter, number>>, where: Where): void {
  const { granule, span, stride, width, pitch } = values;
  const refuse = (found: string, expected: string, hint: string) => {
    throw new InputError({ where, found, expected, hint });
  };
  if (name === 'block' && pitch < width) {
    refuse(`a width of ${width} B and a pitch of ${pitch} B`, 'a pitch of at least the width', 'rows would overlap');
  }
  if (name === 'strided' && granule > stride) {
    refuse(
      `a granule of ${granule} B and a stride of ${stride} B`,
      'a stride of at least the granule',
      'elements would overlap',
    );
  }
  if (name === 'strided' && span > 0 && span < stride) {
    refuse(
      `a span of ${span} B and a stride of ${stride} B`,
      'a span of at least one stride',
      'leave the span out to go once over the kernel',
    );
  }
  if (name !== 'strided' && span > 0 && span < granule) {
    refuse(
      `a span of ${span} B and a granule of ${granule} B`,
      'a span of at least one granule',
      'make the span larger',
    );
  }
}
