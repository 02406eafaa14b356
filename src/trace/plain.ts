/**
 * Plain rows of an access trace, from bytes to the batch without a string in between. A row is plain when it has no quotes and each
 * cell is what it most often is; of any other row nothing is taken, and it goes the slow way, which accepts or refuses it with the
 * same rules and words (access.ts). So this file decides nothing: it is only fast.
 */
import { type AccessRows, BATCH_ROWS, FARTHEST_AFTER, LATEST_PS } from './access.js';
import { READ, WRITE } from './batch.js';
import { fourDigits, fourHexDigits, HEX_DIGIT } from './digits.js';
import type { Header } from './header.js';
import { LONGEST_RECORD } from './records.js';

// constants one by one: taken apart from an array they are no constants to the compiler of the loop, which then costs a third more
const NONE = 0;
const OP = 1;
const ADDRESS = 2;
const BYTES = 3;
const TIME = 4;
const DIE = 5;
const ENGINE = 6;
const KERNEL = 7;
const TILE = 8;
const FLOPS = 9;
const AFTER = 10;
const TAB = 0x09;
const NEWLINE = 0x0a;
const RETURN = 0x0d;
const SPACE = 0x20;
const QUOTE = 0x22;
const POINT = 0x2e;
const ZERO = 0x30;
const X = 0x78;
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
  private readonly fixedOp: number; // of all rows, where it is no column of the file; else -1
  private readonly fixedBytes: number; // … else 0
  private readonly usable: boolean; // false where another column has one value for all rows: then they go the slow way
  taken = 0; // rows the last call took
  private at = 0; // next byte, behind what a method below has read
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
    this.delimiter = header.shape.delimiter.charCodeAt(0);
    this.blank = this.delimiter === TAB ? SPACE : TAB;
    this.hex = header.hex;
    this.ops = [...rows.ops].map(([word, op]) => ({ bytes: Buffer.from(word), op }));
    const fixed = (position: number): string | undefined => header.values[position - header.names.length];
    const [op, bytes] = [fixed(at.op), fixed(at.bytes)];
    this.fixedOp = op === undefined ? -1 : (rows.ops.get(op.toLowerCase()) ?? -1);
    this.fixedBytes = bytes !== undefined && /^[1-9]\d{0,8}$/.test(bytes) ? Number(bytes) : 0;
    const known = (this.fixedOp >= 0 ? 1 : 0) + (this.fixedBytes > 0 ? 1 : 0);
    this.usable = header.values.length === known;
  }

  /**
   * Takes rows of `data` (`view` is the same bytes) from byte `from` until the batch is full, a row is not plain, or byte `end`, just
   * behind a newline, is reached. Returns where the first row not taken begins; `taken` says how many were. `line` is that of the
   * first row.
   */
  take(data: Uint8Array, view: DataView, from: number, end: number, line: number): number {
    const { rows, fields, delimiter, blank, hex } = this;
    const { batch } = rows;
    const { op: ops, address: addresses, bytes: lengths, timePs: times, kernel: kernels } = batch;
    const { die: dies, engine: engines, tile: tiles, flops: works, after: afters } = batch;
    const last = fields.length - 1;
    const lastWord = data.length - 4; // where four bytes can still be read at once
    const scale = rows.timeScale;
    const letters = this.ops.length === 4; // R and W have their usual meaning
    let { lastTime } = rows;
    let from0 = 0; // the range of addresses of one owner, as far as it was looked up
    let end0 = -1;
    let owner = -1;
    let i = batch.count;
    let at = from;
    let row = from;
    each: while (i < BATCH_ROWS && at < end && this.usable) {
      let op = this.fixedOp;
      let address = 0;
      let bytes = this.fixedBytes;
      let timePs = 0;
      let die = -1;
      let engine = -1;
      let tile = -1;
      let flops = 0;
      let after = 0;
      let nameFrom = -1; // of the kernel's cell
      let nameEnd = -1;
      for (let position = 0; position <= last; position++) {
        let byte = data[at];
        while (byte === SPACE || byte === blank) byte = data[++at];
        switch (fields[position]) {
          case OP: {
            const letter = byte | 0x20;
            const next = data[at + 1];
            if (letters && (letter === 0x72 || letter === 0x77) && (next === delimiter || next <= RETURN)) {
              op = letter === 0x72 ? READ : WRITE; // r or w
              at++;
            } else {
              op = this.word(data, at, end);
              if (op < 0) break each;
              at = this.at;
            }
            break;
          }
          case ADDRESS: {
            const prefixed = byte === ZERO && (data[at + 1] | 0x20) === X;
            if (prefixed) at += 2;
            const start = at;
            if (prefixed || hex) {
              for (; at <= lastWord; at += 4) {
                const four = fourHexDigits(view.getInt32(at, true));
                if (four < 0) break;
                address = 65536 * address + four;
              }
              for (; ; at++) {
                const digit = HEX_DIGIT[data[at]];
                if (digit < 0) break;
                address = 16 * address + digit;
              }
              if (at - start > 16) break each;
            } else {
              for (; at <= lastWord; at += 4) {
                const four = fourDigits(view.getInt32(at, true));
                if (four < 0) break;
                address = 10000 * address + four;
              }
              for (; ; at++) {
                const digit = data[at] - ZERO;
                if (digit < 0 || digit > 9) break;
                address = 10 * address + digit;
              }
              if (at - start > MOST_DIGITS) break each;
            }
            if (at === start || address >= HIGH) break each;
            break;
          }
          case BYTES: {
            const start = at;
            for (;;) {
              const digit = byte - ZERO;
              if (digit < 0 || digit > 9) break;
              bytes = (10 * bytes + digit) | 0;
              byte = data[++at];
            }
            if (at === start || at - start > 9 || bytes < 1) break each;
            break;
          }
          case TIME: {
            const start = at;
            for (; at <= lastWord; at += 4) {
              const four = fourDigits(view.getInt32(at, true));
              if (four < 0) break;
              timePs = 10000 * timePs + four;
            }
            for (; ; at++) {
              const digit = data[at] - ZERO;
              if (digit < 0 || digit > 9) break;
              timePs = 10 * timePs + digit;
            }
            if (data[at] === POINT) {
              timePs = this.number(data, start, end);
              at = this.at;
              if (timePs < 0) break each;
            } else if (at === start || at - start > MOST_DIGITS) break each;
            timePs = Math.round(timePs * scale);
            if (timePs > LATEST_PS || timePs < lastTime) break each;
            break;
          }
          case NONE:
            while (byte !== delimiter && byte !== NEWLINE && byte !== RETURN) {
              if (byte === QUOTE || byte === 0) break each; // the row may go on behind this line, or be none
              byte = data[++at];
            }
            break;
          case KERNEL:
            nameFrom = at;
            while (byte !== delimiter && byte !== NEWLINE && byte !== RETURN) {
              if (byte === QUOTE || byte === 0) break each;
              byte = data[++at];
            }
            nameEnd = at;
            break;
          default: {
            const value = this.number(data, at, end);
            if (value === ODD) break each;
            at = this.at;
            if (fields[position] === FLOPS) {
              flops = value === EMPTY ? 0 : value;
            } else if (value !== EMPTY) {
              if (value > 0x7fffffff || this.pointed) break each;
              if (fields[position] === DIE) die = value;
              else if (fields[position] === ENGINE) engine = value;
              else if (fields[position] === TILE) tile = value;
              else after = value;
            }
          }
        }
        byte = data[at];
        while (byte === SPACE || byte === blank) byte = data[++at];
        if (position < last) {
          if (byte !== delimiter) break each;
          at++;
        } else if (byte === RETURN) byte = data[++at];
        if (position === last && byte !== NEWLINE) break each;
      }
      at++;
      if (at - row > LONGEST_RECORD) break;
      if (address < from0 || address + bytes > end0) {
        owner = rows.ownerOf(address, address + bytes);
        if (owner === -2) break;
        from0 = rows.firstOf(owner);
        end0 = rows.endOf(owner);
      }
      if (after > FARTHEST_AFTER || (die >= 0 && die >= rows.dieCount())) break;
      if (engine >= 0 && engine >= rows.enginesOf(die >= 0 ? die : owner)) break;
      // last, because a name is remembered
      const kernel = nameFrom < 0 ? this.onlyKernel() : this.kernel(data, nameFrom, nameEnd);
      if (kernel < 0) break;
      ops[i] = op;
      addresses[i] = address;
      lengths[i] = bytes;
      kernels[i] = kernel;
      if (times !== null) times[i] = timePs;
      if (dies !== null) dies[i] = die;
      if (engines !== null) engines[i] = engine;
      if (tiles !== null) tiles[i] = tile;
      if (works !== null) works[i] = flops;
      if (afters !== null) afters[i] = after;
      lastTime = timePs;
      row = at;
      i++;
    }
    this.taken = i - batch.count;
    batch.count = i;
    if (times !== null && this.taken > 0) rows.setLastTime(lastTime, line + this.taken - 1);
    return row;
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
