/** Reads the cells of a trace row, and says exactly where a bad one stands. */
import { InputError, nearest, type Where } from '../errors.js';
import type { Header } from './header.js';

const WHOLE = /^\d{1,17}$/;
const HEX = /^(?:0[xX])?[0-9a-fA-F]{1,16}$/;
const ADDRESS = /^(?:0[xX][0-9a-fA-F]{1,16}|\d{1,17})$/;
const DECIMAL = /^(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?$/;

/** The row being read; one object serves all rows of a trace. */
export class Cells {
  row: readonly string[] = [];
  line = 0; // negative: the row has quotes, so columns cannot be counted

  constructor(
    readonly file: string,
    private readonly header: Header,
  ) {}

  /** Moves on to a row. Throws when it has too few or too many cells. */
  enter(row: readonly string[], line: number): void {
    this.row = row;
    this.line = line;
    const { names } = this.header;
    if (row.length === names.length) return;
    throw new InputError({
      where: { file: this.file, line: Math.abs(line) },
      found: `${row.length} ${row.length === 1 ? 'cell' : 'cells'}`,
      expected: `${names.length}, one a column: ${names.join(', ')}`,
      hint:
        row.length < names.length
          ? `the row ends before '${names[row.length]}'; leave cells empty, but keep their commas`
          : `put quotes round a cell that contains ${this.header.shape.delimiter === ',' ? 'a comma' : 'the delimiter'}`,
    });
  }

  /** Position of a column, -1 when the trace has none of that name. */
  position(name: string): number {
    return this.header.at.get(name) ?? -1;
  }

  /** The cell at a position without blanks around it; '' when the trace has no such column. */
  text(position: number): string {
    if (position < 0) return '';
    const { names, values } = this.header;
    return (position < names.length ? this.row[position] : values[position - names.length]).trim();
  }

  /** A whole number from `least` to `most`. */
  whole(position: number, least: number, most: number, what: string): number {
    const text = this.text(position);
    const value = WHOLE.test(text) ? Number(text) : Number.NaN;
    if (value >= least && value <= most) return value;
    throw this.fault(position, `${what}: a whole number from ${least} to ${most}`, wholeHint(text, least, most));
  }

  /** An address: decimal or 0x and hexadecimal digits, below 2^52. */
  address(position: number): number {
    const text = this.text(position);
    const { hex } = this.header;
    const value = (hex ? HEX : ADDRESS).test(text)
      ? Number(hex && !/^0x/i.test(text) ? `0x${text}` : text)
      : Number.NaN;
    if (value < 4503599627370496) return value;
    const hint = Number.isNaN(value)
      ? /^[0-9a-fA-F]+$/.test(text)
        ? `hexadecimal needs 0x in front: 0x${text.slice(0, 16)}`
        : 'for example 4096 or 0x1000'
      : 'the address space ends at 2^52';
    const form = hex ? 'hexadecimal digits' : 'decimal, or hexadecimal with 0x';
    throw this.fault(position, `an address: ${form}, below 2^52`, hint);
  }

  /** A number, whole or not, from 0 up. */
  decimal(position: number, what: string, most = Number.MAX_VALUE): number {
    const text = this.text(position);
    const value = DECIMAL.test(text) ? Number(text) : Number.NaN;
    if (value <= most) return value;
    const hint = text.startsWith('-') ? 'it cannot be negative' : 'plain digits, with a point for fractions';
    throw this.fault(position, `${what}: a number from 0${most < 1e300 ? ` to ${most}` : ' up'}`, hint);
  }

  /** A compute die by name or number. `dies` may be empty when the package is not known; then any number will do. */
  die(position: number, dies: readonly string[], count: number): number {
    const text = this.text(position);
    const named = dies.indexOf(text);
    if (named >= 0) return named;
    if (WHOLE.test(text) && Number(text) < count) return Number(text);
    const like = nearest(text, dies);
    const names = dies.length > 0 ? `${dies.join(', ')}, or ` : '';
    throw this.fault(
      position,
      `a compute die: ${names}its number${Number.isFinite(count) ? `, 0 to ${count - 1}` : ''}`,
      like === undefined ? 'the names are those of the package file' : `did you mean '${like}'?`,
    );
  }

  /** Where a cell of this row stands; without its column on the line when quotes make that unknown. */
  where(position: number): Where {
    const line = Math.abs(this.line);
    const { names, at } = this.header;
    // a value of every row stands on the command line, not in the row
    if (position >= names.length)
      return { file: this.file, line, path: [...at].find(([, other]) => other === position)?.[0] };
    const path = names[position];
    if (this.line < 0) return { file: this.file, line, path };
    let column = 1;
    for (let i = 0; i < position; i++) column += this.row[i].length + 1;
    return { file: this.file, line, column, path };
  }

  /** The error for a cell of this row. */
  fault(position: number, expected: string, hint: string, found?: string): InputError {
    const text = this.text(position);
    const shown = text.length > 60 ? `${text.slice(0, 60)}…` : text;
    return new InputError({
      where: this.where(position),
      found: found ?? (text.trim() === '' ? 'an empty cell' : `'${shown.trim()}'`),
      expected,
      hint,
    });
  }
}

function wholeHint(text: string, least: number, most: number): string {
  if (text === '') return 'fill in the cell';
  if (/^-\d/.test(text)) return 'it cannot be negative';
  if (/^\d+$/.test(text)) return Number(text) < least ? `the least is ${least}` : `the most is ${most}`;
  return 'digits only, without unit or separators';
}
