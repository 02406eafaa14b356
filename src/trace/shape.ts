/**
 * The shape of a captured trace: which of its columns are which of ours, in which unit, which words mean read and write, and what
 * stands between cells. Written on the command line or in a file; without one a trace has our own column names.
 */
import { InputError, nearest, type Where } from '../errors.js';
import { READ, WRITE } from './batch.js';
import { ACCESS_COLUMNS } from './columns.js';

/** Where a column of ours comes from: a column of the file, by name, or one value for every row. */
export type ColumnSource =
  | { readonly kind: 'column'; readonly name: string; readonly unit: string }
  | { readonly kind: 'value'; readonly text: string };

export interface Shape {
  /** By our column: op, address, bytes, time, die, engine, kernel, tile, flops, after. Columns not named keep our own names. */
  readonly columns: ReadonlyMap<string, ColumnSource>;
  /** Words of the op column in small letters; null: r, read, w, write. */
  readonly ops: ReadonlyMap<string, number> | null;
  /** The character between cells. */
  readonly delimiter: string;
}

/** A trace with our own column names. */
export const OWN_SHAPE: Shape = { columns: new Map(), ops: null, delimiter: ',' };

const NAMES = [...ACCESS_COLUMNS.required, 'time', ...ACCESS_COLUMNS.optional];
const UNITS: Readonly<Record<string, readonly string[]>> = {
  time: ['ps', 'ns', 'us', 'ms', 's', 'cycle'],
  address: ['hex'],
};
const OP_NAMES = ['read', 'write'];
const DELIMITERS: Readonly<Record<string, string>> = { tab: '\t', '\\t': '\t', comma: ',', semicolon: ';' };

/** A shape as text: `columns` as `address=Addr:hex,op=Kind,bytes==64,time=Stamp:us`, `ops` as `read=LD|load,write=ST`. */
export interface ShapeText {
  readonly columns?: string | undefined;
  readonly ops?: string | undefined;
  readonly delimiter?: string | undefined;
}

/** Understands a shape. `from` says where each part was written. Throws InputError. */
export function parseShape(text: ShapeText, from: (part: keyof ShapeText) => Where): Shape {
  return {
    columns: text.columns === undefined ? OWN_SHAPE.columns : parseColumns(text.columns, from('columns')),
    ops: text.ops === undefined ? OWN_SHAPE.ops : parseOps(text.ops, from('ops')),
    delimiter: text.delimiter === undefined ? OWN_SHAPE.delimiter : parseDelimiter(text.delimiter, from('delimiter')),
  };
}

function parseColumns(text: string, where: Where): ReadonlyMap<string, ColumnSource> {
  const columns = new Map<string, ColumnSource>();
  for (const part of text.split(',')) {
    const match = /^\s*([a-z]+)\s*(==?)\s*(.*?)\s*$/.exec(part);
    if (match === null)
      throw new InputError({ where, found: `'${part.trim()}'`, expected: 'column=name, for example address=Addr' });
    const [, name, sign, right] = match;
    known(name, NAMES, 'a column of an access trace', where);
    if (columns.has(name)) throw new InputError({ where, found: `'${name}' twice`, expected: 'each column once' });
    if (right === '')
      throw new InputError({ where, found: `'${name}' without a name behind it`, expected: `${name}=name` });
    if (sign === '==') {
      columns.set(name, { kind: 'value', text: right });
      continue;
    }
    const units = UNITS[name] ?? [];
    const colon = right.lastIndexOf(':');
    const unit = colon < 0 ? '' : right.slice(colon + 1).trim();
    if (colon >= 0) known(unit, units, `a unit of '${name}'`, where);
    if (name === 'time' && unit === '') {
      throw new InputError({
        where,
        found: `'${part.trim()}'`,
        expected: `a time with its unit: ${units.map((u) => `time=${right}:${u}`).join(', ')}`,
      });
    }
    columns.set(name, { kind: 'column', name: colon < 0 ? right : right.slice(0, colon).trim(), unit });
  }
  return columns;
}

function parseOps(text: string, where: Where): ReadonlyMap<string, number> {
  const ops = new Map<string, number>();
  for (const part of text.split(',')) {
    const [name, words, more] = part.split('=').map((side) => side.trim());
    if (words === undefined || words === '' || more !== undefined)
      throw new InputError({ where, found: `'${part.trim()}'`, expected: 'read=word|word or write=word|word' });
    known(name, OP_NAMES, 'an operation', where);
    for (const word of words.split('|').map((one) => one.trim().toLowerCase())) {
      if (word === '' || ops.has(word))
        throw new InputError({
          where,
          found: word === '' ? 'an empty word' : `'${word}' twice`,
          expected: 'each word once',
        });
      ops.set(word, name === 'read' ? READ : WRITE);
    }
  }
  return ops;
}

function parseDelimiter(text: string, where: Where): string {
  const delimiter = DELIMITERS[text.toLowerCase()] ?? text;
  if (delimiter.length === 1 && /[^\w"\s#.\-+]|\t/.test(delimiter) && delimiter.charCodeAt(0) < 128) return delimiter;
  throw new InputError({
    where,
    found: `'${text}'`,
    expected: 'one character between cells, for example ; or | or tab',
  });
}

function known(name: string, names: readonly string[], what: string, where: Where): void {
  if (names.includes(name)) return;
  const like = nearest(name, names);
  throw new InputError({
    where,
    found: `'${name}'`,
    expected: names.length === 0 ? `no unit: only time and address have one` : `${what}: ${names.join(', ')}`,
    hint: like === undefined ? undefined : `did you mean '${like}'?`,
  });
}
