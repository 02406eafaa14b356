import type { Package } from '../config/package.js';
import { InputError, nearest } from '../errors.js';
import { COMMANDS, KIND_OF, MANY_BANKS, NEEDS_COLUMN, NEEDS_ROW, REFAB } from './commands.js';
import { LOG_COLUMNS, readHeader, shown } from './log-header.js';

/** Takes one command: half clocks, place, what and for which request, line of the log. Fields not used are -1. */
export type LogSink = (
  halfCk: number,
  stack: number,
  channel: number,
  pc: number,
  sid: number,
  bankGroup: number,
  bank: number,
  row: number,
  column: number,
  command: number,
  request: number,
  line: number,
) => void;

export interface LogReader {
  /** Takes the next bytes of the log; rows may be cut anywhere. Throws InputError at the first bad row. */
  push(chunk: Uint8Array): void;
  /** Ends the log; returns how many commands there were. Throws InputError when there was none. */
  end(): number;
}

/** Reads the command log `file` (already un-gzipped) and gives each command to `sink`. `#` lines and empty lines are skipped. */
export function createLogReader(file: string, pkg: Package, sink: LogSink): LogReader {
  return new Reader(file, pkg, sink);
}

const [COMMA, NEWLINE, RETURN, POINT, HASH, ZERO, FIVE] = [0x2c, 0x0a, 0x0d, 0x2e, 0x23, 0x30, 0x35];
const BYTE_ORDER_MARK = [0xef, 0xbb, 0xbf]; // of UTF-8
const LONGEST_LINE = 65536;
const LATEST_CK = 2 ** 51; // so that half clocks and sums of them stay whole numbers
const [CK, STACK, CHANNEL, PC, SID, GROUP, BANK, ROW, COLUMN, COMMAND, REQUEST] = LOG_COLUMNS.keys();
const UNUSED = -1;
const text = new TextDecoder();

class Reader implements LogReader {
  private order: Int8Array | null = null; // which field each cell of a row is; null: header not read yet
  private readonly fields = new Float64Array(LOG_COLUMNS.length); // of the row in hand
  private readonly whenEmpty: Float64Array; // by field: 0 where the device has only one of a thing, else UNUSED
  private readonly needed: readonly (readonly number[])[]; // by command: fields that must not be empty
  private readonly counts: readonly (readonly [field: number, count: number])[]; // fields whose range decides where state is
  private rest = new Uint8Array(0); // the beginning of a line whose end has not come
  private line = 0; // lines begun
  private rows = 0;

  constructor(
    private readonly file: string,
    pkg: Package,
    private readonly sink: LogSink,
  ) {
    const [{ organisation: o, refresh }] = pkg.memory;
    this.counts = [
      [STACK, o.stacks],
      [CHANNEL, o.channels],
      [PC, o.pseudo_channels],
    ];
    this.whenEmpty = new Float64Array(LOG_COLUMNS.length).fill(UNUSED);
    const single = [...this.counts, [SID, o.sids], [GROUP, o.bank_groups], [BANK, o.banks_per_group]] as const;
    for (const [field, count] of single) if (count === 1) this.whenEmpty[field] = 0;
    this.needed = COMMANDS.map((_, command) => [
      CK,
      STACK,
      CHANNEL,
      PC,
      ...(MANY_BANKS[command] === 0 ? [SID, GROUP, BANK] : []),
      ...(KIND_OF[command] === REFAB && refresh.scope === 'sid' ? [SID] : []),
      ...(NEEDS_ROW[command] === 1 ? [ROW] : []),
      ...(NEEDS_COLUMN[command] === 1 ? [COLUMN] : []),
    ]);
  }

  push(chunk: Uint8Array): void {
    let from = 0;
    if (this.rest.length > 0) {
      const end = chunk.indexOf(NEWLINE);
      const piece = end < 0 ? chunk : chunk.subarray(0, end);
      this.rest = joined(this.rest, piece.subarray(0, LONGEST_LINE + 1));
      if (this.rest.length > LONGEST_LINE) this.tooLong();
      if (end < 0) return;
      const whole = this.rest;
      this.rest = new Uint8Array(0);
      this.takeLine(whole, 0, whole.length);
      from = end + 1;
    }
    for (;;) {
      const end = chunk.indexOf(NEWLINE, from);
      if (end < 0) break;
      if (end - from > LONGEST_LINE) this.tooLong();
      this.takeLine(chunk, from, end);
      from = end + 1;
    }
    if (chunk.length - from > LONGEST_LINE) this.tooLong();
    if (from < chunk.length) this.rest = new Uint8Array(chunk.subarray(from));
  }

  end(): number {
    if (this.rest.length > 0) {
      const whole = this.rest;
      this.rest = new Uint8Array(0);
      this.takeLine(whole, 0, whole.length);
    }
    if (this.rows === 0) {
      throw new InputError({
        where: { file: this.file },
        found: this.order === null ? 'an empty file' : 'a header and no command',
        expected: 'a command log: a header, then a row per command',
      });
    }
    return this.rows;
  }

  /** One line: bytes `from` up to, not including, `end`, without its newline. */
  private takeLine(bytes: Uint8Array, from: number, end: number): void {
    this.line++;
    let start = from;
    let stop = end;
    if (stop > start && bytes[stop - 1] === RETURN) stop--;
    if (this.line === 1 && BYTE_ORDER_MARK.every((byte, i) => bytes[start + i] === byte)) start += 3;
    if (start >= stop || bytes[start] === HASH) return;
    if (this.order === null) this.order = readHeader(text.decode(bytes.subarray(start, stop)), this.file, this.line);
    else this.takeRow(bytes, start, stop, this.order);
  }

  private takeRow(bytes: Uint8Array, start: number, stop: number, order: Int8Array): void {
    const f = this.fields;
    let at = start;
    for (let cell = 0; cell < order.length; cell++) {
      if (at > stop) this.wrongLength(bytes, start, stop, order.length);
      const field = order[cell];
      const begin = at;
      if (field === COMMAND) {
        while (at < stop && bytes[at] !== COMMA) at++;
        const command = commandNumber(bytes, begin, at);
        if (command < 0) this.unknownCommand(bytes, begin, at, start);
        f[field] = command;
      } else if (field < 0) {
        while (at < stop && bytes[at] !== COMMA) at++;
      } else {
        let value = 0;
        while (at < stop) {
          const digit = bytes[at] - ZERO;
          if (digit < 0 || digit > 9) break;
          value = 10 * value + digit;
          at++;
        }
        if (field === CK) {
          value *= 2;
          if (at > begin && at + 1 < stop && bytes[at] === POINT) {
            at++;
            // .5 or .0, then nothing but zeros
            if (bytes[at] === FIVE) value++;
            else if (bytes[at] !== ZERO) this.notANumber(bytes, begin, start, stop, field);
            at++;
            while (at < stop && bytes[at] === ZERO) at++;
          }
          if (value > 2 * LATEST_CK) this.notANumber(bytes, begin, start, stop, field);
        } else if (value > Number.MAX_SAFE_INTEGER) this.notANumber(bytes, begin, start, stop, field);
        if (at < stop && bytes[at] !== COMMA) this.notANumber(bytes, begin, start, stop, field);
        f[field] = at === begin ? this.whenEmpty[field] : value;
      }
      at++; // over the comma
    }
    if (at <= stop) this.wrongLength(bytes, start, stop, order.length);
    const command = f[COMMAND];
    for (const field of this.needed[command]) if (f[field] < 0) this.missing(field, COMMANDS[command]);
    for (const [field, count] of this.counts) if (f[field] >= count) this.outOfRange(field, f[field], count);
    this.rows++;
    this.sink(
      f[CK],
      f[STACK],
      f[CHANNEL],
      f[PC],
      f[SID],
      f[GROUP],
      f[BANK],
      f[ROW],
      f[COLUMN],
      command,
      f[REQUEST],
      this.line,
    );
  }

  // ---- what can be wrong with a row --------------------------------------------------------------------------------------------

  private fail(found: string, expected: string, path?: string, column?: number): never {
    throw new InputError({ where: { file: this.file, line: this.line, column, path }, found, expected });
  }

  private notANumber(bytes: Uint8Array, begin: number, start: number, stop: number, field: number): never {
    const comma = bytes.subarray(0, stop).indexOf(COMMA, begin);
    const cell = text.decode(bytes.subarray(begin, comma < 0 ? stop : comma));
    const expected =
      field === CK ? 'clocks from 0 to 2^51, whole or ending in .5' : 'a whole number from 0, or nothing where unused';
    this.fail(`'${shown(cell)}'`, expected, LOG_COLUMNS[field], begin - start + 1);
  }

  private unknownCommand(bytes: Uint8Array, begin: number, end: number, start: number): never {
    const word = text.decode(bytes.subarray(begin, end));
    const near = word.length > 20 ? undefined : nearest(word, COMMANDS);
    throw new InputError({
      where: { file: this.file, line: this.line, column: begin - start + 1, path: 'command' },
      found: `'${shown(word)}'`,
      expected: `one of ${COMMANDS.join(', ')}`,
      hint: near === undefined ? undefined : `did you mean ${near}?`,
    });
  }

  private wrongLength(bytes: Uint8Array, start: number, stop: number, cells: number): never {
    let found = 1;
    for (let i = start; i < stop; i++) if (bytes[i] === COMMA) found++;
    this.fail(`a row of ${found} ${found === 1 ? 'cell' : 'cells'}`, `${cells}, as in the header`);
  }

  private missing(field: number, command: string): never {
    this.fail('nothing', `a value: ${command} needs it`, LOG_COLUMNS[field]);
  }

  private outOfRange(field: number, value: number, count: number): never {
    const what = count === 1 ? '0: the package has one' : `0 to ${count - 1}: the package has ${count}`;
    this.fail(String(value), what, LOG_COLUMNS[field]);
  }

  private tooLong(): never {
    this.line++;
    this.fail(`a line of more than ${LONGEST_LINE} bytes`, 'a row of a command log');
  }
}

const NAMES: readonly Uint8Array[] = COMMANDS.map((name) => new TextEncoder().encode(name));

/** The number of the command whose name is bytes `from` up to `end`, or -1. */
function commandNumber(bytes: Uint8Array, from: number, end: number): number {
  for (let command = 0; command < NAMES.length; command++) {
    const name = NAMES[command];
    if (name.length !== end - from) continue;
    let i = 0;
    while (i < name.length && bytes[from + i] === name[i]) i++;
    if (i === name.length) return command;
  }
  return -1;
}

function joined(a: Uint8Array, b: Uint8Array): Uint8Array<ArrayBuffer> {
  const both = new Uint8Array(a.length + b.length);
  both.set(a);
  both.set(b, a.length);
  return both;
}
