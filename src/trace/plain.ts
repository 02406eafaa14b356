/**
 * Plain rows of an access trace, from bytes to the batch without a string in between. A row is plain when it has no quotes and each
 * cell is what it most often is; of any other row nothing is taken, and it goes the slow way, which accepts or refuses it with the
 * same rules and words (access.ts). So this file decides nothing: it is only fast.
 */
import { type AccessRows, FARTHEST_AFTER, LATEST_PS, LONGEST_ACCESS } from './access.js';
import { READ, WRITE } from './batch.js';
import type { Header } from './header.js';

const [NONE, OP, ADDRESS, BYTES, TIME, DIE, ENGINE, KERNEL, TILE, FLOPS, AFTER] = Array(11).keys();
const [SPACE, TAB, NEWLINE, RETURN, POINT, ZERO, X] = [0x20, 0x09, 0x0a, 0x0d, 0x2e, 0x30, 0x78];
const MOST_DIGITS = 15; // a whole number of so many is exact
const POWERS = Float64Array.from({ length: MOST_DIGITS + 1 }, (_, i) => 10 ** i);
const EMPTY = -1; // what number() gives for a cell without digits
const ODD = -2; // … for one it does not understand
const HIGH = 2 ** 52; // end of the address space

export class PlainRows {
  private readonly fields: Uint8Array; // by position: which column of ours, NONE: passed over
  private readonly delimiter: number;
  private readonly blank: number; // beside a space: the tab, where it is not the delimiter
  private readonly hex: boolean;
  private readonly ops: readonly { readonly bytes: Uint8Array; readonly op: number }[]; // small letters
  private readonly usable: boolean; // false where a value stands for a whole column: then all rows go the slow way
  private at = 0; // next byte, while a row is read
  private lastKernel = new Uint8Array(0); // name of the row before, as bytes
  private lastKernelNumber = -1;

  constructor(
    header: Header,
    private readonly rows: AccessRows,
  ) {
    const { at } = rows;
    this.fields = new Uint8Array(header.names.length);
    const columns: [number, number][] = [
      [at.op, OP],
      [at.address, ADDRESS],
      [at.bytes, BYTES],
      [at.time, TIME],
      [at.die, DIE],
      [at.engine, ENGINE],
      [at.kernel, KERNEL],
      [at.tile, TILE],
      [at.flops, FLOPS],
      [at.after, AFTER],
    ];
    for (const [position, field] of columns)
      if (position >= 0 && position < this.fields.length) this.fields[position] = field;
    this.usable = header.values.length === 0;
    this.delimiter = header.shape.delimiter.charCodeAt(0);
    this.blank = this.delimiter === TAB ? SPACE : TAB;
    this.hex = header.hex;
    this.ops = [...rows.ops].map(([word, op]) => ({ bytes: Buffer.from(word), op }));
  }

  /**
   * Takes the row that begins at byte `from`, and returns where the next one begins; 0, with nothing taken, when it is not plain or
   * its line end does not come before byte `end`.
   */
  take(data: Uint8Array, from: number, end: number, line: number): number {
    if (!this.usable) return 0;
    const { fields, delimiter, rows, blank } = this;
    const last = fields.length - 1;
    let op = ODD;
    let address = 0;
    let bytes = 0;
    let timePs = 0;
    let die = -1;
    let engine = -1;
    let nameFrom = -1; // of the kernel's cell
    let nameEnd = -1;
    let tile = -1;
    let flops = 0;
    let after = 0;
    let at = from;
    for (let position = 0; position <= last; position++) {
      while (at < end && (data[at] === SPACE || data[at] === blank)) at++;
      const field = fields[position];
      if (field === OP) {
        const letter = data[at] | 0x20;
        const next = at + 1;
        if (
          (letter === 0x72 || letter === 0x77) &&
          (data[next] === delimiter || data[next] === NEWLINE || data[next] === RETURN) &&
          this.ops.length === 4
        ) {
          op = letter === 0x72 ? READ : WRITE; // r or w
          at = next;
        } else {
          op = this.word(data, at, end);
          if (op < 0) return 0;
          at = this.at;
        }
      } else if (field === ADDRESS) {
        if (this.hex || (at + 1 < end && data[at] === ZERO && (data[at + 1] | 0x20) === X)) {
          if (data[at] === ZERO && at + 1 < end && (data[at + 1] | 0x20) === X) at += 2;
          const start = at;
          let low = 0; // whole numbers as long as they fit: that is quicker
          for (; at < end; at++) {
            const byte = data[at];
            let digit = byte - ZERO;
            if (digit < 0 || digit > 9) {
              digit = (byte | 0x20) - 0x57;
              if (digit < 10 || digit > 15) break;
            }
            if (at - start < 7) low = (low << 4) | digit;
            else address = 16 * (at - start === 7 ? low : address) + digit;
          }
          if (at - start <= 7) address = low;
          if (at === start || at - start > 16) return 0;
        } else {
          const start = at;
          let low = 0;
          for (; at < end; at++) {
            const digit = data[at] - ZERO;
            if (digit < 0 || digit > 9) break;
            if (at - start < 9) low = (10 * low + digit) | 0;
            else address = 10 * (at - start === 9 ? low : address) + digit;
          }
          if (at - start <= 9) address = low;
          if (at === start || at - start > MOST_DIGITS) return 0;
        }
        if (address >= HIGH) return 0;
      } else if (field === BYTES) {
        const start = at;
        for (; at < end; at++) {
          const digit = data[at] - ZERO;
          if (digit < 0 || digit > 9) break;
          bytes = (10 * bytes + digit) | 0;
        }
        if (at === start || at - start > 9 || bytes < 1 || bytes > LONGEST_ACCESS) return 0;
      } else if (field === KERNEL) {
        nameFrom = at;
        while (at < end && data[at] !== delimiter && data[at] !== NEWLINE && data[at] !== RETURN) at++;
        nameEnd = at;
      } else if (field === NONE) {
        while (at < end && data[at] !== delimiter && data[at] !== NEWLINE && data[at] !== RETURN) at++;
      } else {
        const value = this.number(data, at, end);
        if (value === ODD) return 0;
        at = this.at;
        if (field === TIME) {
          timePs = Math.round(value * rows.timeScale);
          if (value < 0 || timePs > LATEST_PS || timePs < rows.lastTime) return 0;
        } else if (field === FLOPS) {
          flops = value === EMPTY ? 0 : value;
        } else if (value !== EMPTY) {
          if (value !== Math.floor(value) || value > 0x7fffffff || this.pointed) return 0;
          if (field === DIE) die = value;
          else if (field === ENGINE) engine = value;
          else if (field === TILE) tile = value;
          else after = value;
        }
      }
      while (at < end && (data[at] === SPACE || data[at] === blank)) at++;
      if (position < last) {
        if (at >= end || data[at] !== delimiter) return 0;
        at++;
      }
    }
    if (data[at] === RETURN) at++;
    if (at >= end || data[at] !== NEWLINE) return 0;
    at++;
    const owner = rows.ownerOf(address, address + bytes);
    if (owner === -2 || after > FARTHEST_AFTER) return 0;
    if (die >= 0 && die >= rows.dieCount()) return 0;
    if (engine >= 0 && engine >= rows.enginesOf(die >= 0 ? die : owner)) return 0;
    // last, because a name is remembered
    const kernel = nameFrom < 0 ? this.onlyKernel() : this.kernel(data, nameFrom, nameEnd);
    if (kernel < 0) return 0;
    rows.put(op, address, bytes, timePs, die, engine, kernel, tile, flops, after, line);
    return at;
  }

  /** The one kernel of a trace without names. */
  private onlyKernel(): number {
    if (this.lastKernelNumber < 0) this.lastKernelNumber = this.rows.kernelOf('');
    return this.lastKernelNumber;
  }

  private pointed = false; // whether number() met a decimal point

  /** A number of digits and at most one point, EMPTY without any, ODD when there is more to it. Leaves `at` behind it. */
  private number(data: Uint8Array, from: number, end: number): number {
    let at = from;
    let value = 0;
    let digits = 0;
    let decimals = 0;
    this.pointed = false;
    for (; at < end; at++) {
      const digit = data[at] - ZERO;
      if (digit >= 0 && digit <= 9) {
        value = 10 * value + digit;
        digits++;
        if (this.pointed) decimals++;
      } else if (data[at] === POINT && !this.pointed) this.pointed = true;
      else break;
    }
    this.at = at;
    if (digits === 0) return this.pointed ? ODD : EMPTY;
    if (digits > MOST_DIGITS) return ODD;
    return decimals === 0 ? value : value / POWERS[decimals]; // both exact, so the quotient is rounded as Number() would
  }

  /** The operation a word stands for, ODD when it is none. Leaves `at` behind it. */
  private word(data: Uint8Array, from: number, end: number): number {
    let to = from;
    while (to < end && data[to] !== this.delimiter && data[to] !== NEWLINE && data[to] !== RETURN) to++;
    this.at = to;
    while (to > from && (data[to - 1] === SPACE || data[to - 1] === this.blank)) to--;
    for (const { bytes, op } of this.ops) {
      if (bytes.length !== to - from) continue;
      let i = 0;
      while (i < bytes.length && lower(data[from + i]) === bytes[i]) i++;
      if (i === bytes.length) return op;
    }
    return ODD;
  }

  /** Number of a kernel by its cell; rows of one kernel mostly follow each other. */
  private kernel(data: Uint8Array, from: number, end: number): number {
    let to = end;
    while (to > from && (data[to - 1] === SPACE || data[to - 1] === this.blank)) to--;
    const { lastKernel } = this;
    if (this.lastKernelNumber >= 0 && lastKernel.length === to - from) {
      let i = 0;
      while (i < lastKernel.length && lastKernel[i] === data[from + i]) i++;
      if (i === lastKernel.length) return this.lastKernelNumber;
    }
    const name = data.slice(from, to);
    // other blanks than these are trimmed the slow way
    if (name.some((byte) => byte > 126 || byte < SPACE)) return -1;
    const kernel = this.rows.kernelOf(Buffer.from(name).toString('latin1'));
    if (kernel < 0) return -1;
    this.lastKernel = name;
    this.lastKernelNumber = kernel;
    return kernel;
  }
}

function lower(byte: number): number {
  return byte >= 0x41 && byte <= 0x5a ? byte | 0x20 : byte;
}
