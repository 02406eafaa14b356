/**
 * Cuts a stream of bytes into CSV records and notes the line each begins on, so that messages can name it however many comments,
 * blank lines and quoted newlines came before, and so that a line without end is refused before a parser collects it.
 * Reading the cells of a record is fast-csv's work (rows.ts).
 */
import { InputError } from '../errors.js';

/** Longest record, bytes. A trace row has a few dozen; what is longer is no trace, or has a quote that never closes. */
export const LONGEST_RECORD = 65536;

/** Whole records, and what ended the block if it was not just the end of a chunk of bytes. */
export interface RecordBlock {
  readonly text: string; // the records, each with its line end
  readonly lines: readonly number[]; // line each record begins on, from 1; negative when the record has quotes
  /** What is wrong with the record after these, if something is. */
  readonly fault: InputError | null;
  /** True when nothing after the fault can be read; false when it was one bad row. */
  readonly fatal: boolean;
}

const NEWLINE = 10;
const RETURN = 13;
const QUOTE = 34;
const HASH = 35;

/** Splits a byte stream. Failures of the source itself come out as the errors they are. */
export async function* splitRecords(
  source: AsyncIterable<Buffer>,
  file: string,
  splitter: Splitter = new Splitter(file),
): AsyncGenerator<RecordBlock> {
  for await (const chunk of source) {
    yield* splitter.push(chunk, false);
    if (splitter.stopped) return;
  }
  yield* splitter.push(Buffer.from('\n'), true);
}

/** Finds the records of a stream of bytes. */
export class Splitter {
  stopped = false;
  private pending: Buffer = Buffer.alloc(0); // start of a record that has not ended yet
  private started: boolean; // the first three bytes, which may be a byte order mark, have been seen

  /** `line`: number of the first line it will see; of the first of the file a byte order mark is passed over. */
  constructor(
    private readonly file: string,
    private readonly delimiter = ',',
    public line = 1, // number of the line at the start of `rest`
  ) {
    this.started = line > 1;
  }

  /** Start of a record that has not ended yet. */
  get rest(): Buffer {
    return this.pending;
  }

  *push(chunk: Buffer, last: boolean): Generator<RecordBlock> {
    const data = this.pending.length > 0 ? Buffer.concat([this.pending, chunk]) : chunk;
    const zero = data.indexOf(0);
    let at = 0;
    if (!this.started) {
      if (data.length < 3 && !last) {
        this.pending = data;
        return;
      }
      at = skipByteOrderMark(data);
      this.started = true;
    }
    let text = '';
    let kept = at; // start of the stretch of good records not yet in `text`
    let lines: number[] = [];
    let quote = data.indexOf(QUOTE);

    while (at < data.length) {
      const newline = data.indexOf(NEWLINE, at);
      if (zero >= at && (newline < 0 || zero < newline)) {
        yield this.stop(text + data.toString('utf8', kept, at), lines, this.nulByte(zero - at));
        return;
      }
      if ((newline < 0 ? data.length : newline) - at > LONGEST_RECORD) {
        yield this.stop(text + data.toString('utf8', kept, at), lines, this.tooLong('line'));
        return;
      }
      if (newline < 0) break;
      const first = firstInk(data, at, newline);
      if (first < 0 || data[first] === HASH) {
        // blank lines and comments are left out of the text
        text += data.toString('utf8', kept, at);
        at = newline + 1;
        kept = at;
        this.line++;
        continue;
      }
      let end = newline + 1;
      let newlines = 1;
      let fault: InputError | null = null;
      if (quote >= 0 && quote < at) quote = data.indexOf(QUOTE, at);
      const quoted = quote >= 0 && quote < newline;
      if (quoted) {
        const scan = scanQuoted(data, at, this.delimiter.charCodeAt(0));
        if (scan.end < 0 && !last) {
          if (data.length - at <= LONGEST_RECORD) break;
          yield this.stop(text + data.toString('utf8', kept, at), lines, this.tooLong('quoted cell'));
          return;
        }
        if (scan.end >= 0 && scan.end - at > LONGEST_RECORD) {
          yield this.stop(text + data.toString('utf8', kept, at), lines, this.tooLong('quoted cell'));
          return;
        }
        end = scan.end < 0 ? data.length : scan.end;
        newlines = scan.end < 0 ? count(data, NEWLINE, at) : scan.newlines;
        if (scan.end < 0 || scan.badAt >= 0) fault = this.badQuote(scan.badAt < 0 ? -1 : scan.badAt - at);
      } else {
        const bare = data.indexOf(RETURN, at);
        if (bare >= 0 && bare < newline - 1) fault = this.bareReturn(bare - at);
      }
      if (fault === null) {
        lines.push(quoted ? -this.line : this.line);
      } else {
        yield { text: text + data.toString('utf8', kept, at), lines, fault, fatal: false };
        text = '';
        lines = [];
        kept = end;
      }
      this.line += newlines;
      at = end;
    }
    text += data.toString('utf8', kept, at);
    this.pending = data.subarray(at);
    if (lines.length > 0) yield { text, lines, fault: null, fatal: false };
  }

  private stop(text: string, lines: readonly number[], fault: InputError): RecordBlock {
    this.stopped = true;
    return { text, lines, fault, fatal: true };
  }

  private nulByte(offset: number): InputError {
    return new InputError({
      where: { file: this.file, line: this.line, column: offset + 1 },
      found: 'a NUL byte',
      expected: 'a text file in UTF-8: comma-separated values',
      hint: 'the file is binary, damaged or in UTF-16; write it as UTF-8 CSV',
    });
  }

  private tooLong(what: string): InputError {
    return new InputError({
      where: { file: this.file, line: this.line },
      found: `a ${what} of more than ${LONGEST_RECORD} bytes`,
      expected: 'rows of a trace, a few dozen bytes each',
      hint: what === 'line' ? 'check that lines end in LF or CRLF' : 'check that every quote is closed',
    });
  }

  private badQuote(offset: number): InputError {
    return new InputError({
      where:
        offset < 0 ? { file: this.file, line: this.line } : { file: this.file, line: this.line, column: offset + 1 },
      found: offset < 0 ? 'a quoted cell that never ends' : 'text after the closing quote of a cell',
      expected: 'a quoted cell to end in a quote and then a comma or the end of the line',
      hint: 'double a quote that belongs to the text: ""',
    });
  }

  private bareReturn(offset: number): InputError {
    return new InputError({
      where: { file: this.file, line: this.line, column: offset + 1 },
      found: 'a carriage return in the middle of a line',
      expected: 'lines that end in LF or CRLF',
      hint: 'convert the line ends of the file',
    });
  }
}

function skipByteOrderMark(data: Buffer): number {
  return data.length >= 3 && data[0] === 0xef && data[1] === 0xbb && data[2] === 0xbf ? 3 : 0;
}

/** Position of the first byte of a line that is no blank, -1 for none. */
function firstInk(data: Buffer, from: number, end: number): number {
  for (let i = from; i < end; i++) {
    const byte = data[i];
    if (byte !== 32 && byte !== 9 && byte !== RETURN) return i;
  }
  return -1;
}

function count(data: Buffer, byte: number, from: number): number {
  let n = 0;
  for (let i = data.indexOf(byte, from); i >= 0; i = data.indexOf(byte, i + 1)) n++;
  return n;
}

/**
 * Follows the quotes of a record: where it ends (-1: not in this data), how many line ends it holds, and where text follows a
 * closing quote (-1: nowhere). A quote opens a cell only as the first thing in it; elsewhere it is an ordinary character.
 */
function scanQuoted(data: Buffer, from: number, delimiter: number): { end: number; newlines: number; badAt: number } {
  let state: 'start' | 'plain' | 'quoted' | 'closed' = 'start';
  let newlines = 0;
  let badAt = -1;
  for (let i = from; i < data.length; i++) {
    const byte = data[i];
    if (byte === NEWLINE) {
      newlines++;
      if (state !== 'quoted') return { end: i + 1, newlines, badAt };
    } else if (state === 'quoted') {
      if (byte !== QUOTE) continue;
      if (data[i + 1] === QUOTE) i++;
      else state = 'closed';
    } else if (byte === delimiter) {
      state = 'start';
    } else if (byte === QUOTE && state === 'start') {
      state = 'quoted';
    } else if (byte !== 32 && byte !== 9 && byte !== RETURN) {
      if (state === 'closed' && badAt < 0) badAt = i;
      if (state === 'start') state = 'plain';
    }
  }
  return { end: -1, newlines, badAt };
}
