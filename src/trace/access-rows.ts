/**
 * Reads the rows of an access trace into batches. Bytes go through the plain-row parser; the odd row alone goes through records and
 * cells; and from a quote on, where a record may go over several lines, the rest of the chunk goes through fast-csv.
 */
import { type AccessRows, BATCH_ROWS } from './access.js';
import type { AccessBatch, TraceFacts } from './batch.js';
import type { FileHash } from './bytes.js';
import type { Header } from './header.js';
import { PlainRows } from './plain.js';
import { LONGEST_RECORD, Splitter } from './records.js';
import { CellReader, pieces, type RowBlock } from './rows.js';
import { noRows, type Tolerance } from './tolerance.js';

const [NEWLINE, QUOTE] = [10, 34];

/** What the reading keeps count of; `facts` grow on the way, the hash is known at the end. */
export interface Reading {
  readonly file: string;
  readonly header: Header;
  readonly access: AccessRows;
  readonly tolerance: Tolerance;
  readonly facts: { -readonly [K in keyof TraceFacts]: TraceFacts[K] };
  readonly hash: FileHash;
}

/** Batches from bytes that begin on line `line`, below the header. The batch is filled again after each pull. */
export async function* readPlain(
  reading: Reading,
  source: AsyncIterator<Buffer>,
  first: Buffer,
  line: number,
): AsyncGenerator<AccessBatch, undefined> {
  const { file, header, access, tolerance, facts } = reading;
  const { delimiter } = header.shape;
  const plain = new PlainRows(header, access);
  const { batch } = access;
  let next = line; // number of the line that is read next
  let tail: Buffer = Buffer.alloc(0); // what has been seen of it, or of a record that has quotes
  let chunk = first;
  for (;;) {
    if (tail.length === 0) yield* readChunk(chunk, false);
    else if (tail.includes(QUOTE) || tail.length > LONGEST_RECORD)
      yield* readChunk(Buffer.concat([tail, chunk]), false);
    else {
      // only the line that two chunks share is copied
      const end = chunk.indexOf(NEWLINE) + 1;
      yield* readChunk(Buffer.concat([tail, chunk.subarray(0, end || chunk.length)]), false);
      if (end > 0)
        yield* readChunk(tail.length === 0 ? chunk.subarray(end) : Buffer.concat([tail, chunk.subarray(end)]), false);
    }
    const { done, value } = await source.next();
    if (done) break;
    chunk = value;
  }
  if (tail.length > 0) yield* readChunk(Buffer.concat([tail, Buffer.from('\n')]), true);
  yield* finishReading(reading);

  /** Takes the whole lines of `data` and leaves the rest in `tail`. */
  async function* readChunk(data: Buffer, last: boolean): AsyncGenerator<AccessBatch> {
    const view = new DataView(data.buffer, data.byteOffset, data.length);
    const end = data.lastIndexOf(NEWLINE) + 1;
    for (let at = 0; at < end; ) {
      if (batch.count === BATCH_ROWS) {
        handOut(reading);
        yield batch;
        batch.count = 0;
      }
      at = plain.take(data, view, at, end, next);
      next += plain.taken;
      if (at === end || batch.count === BATCH_ROWS) continue;
      const oddEnd = data.indexOf(NEWLINE, at) + 1;
      const odd = data.subarray(at, oddEnd);
      if ((odd.includes(QUOTE) || odd.includes(0)) && !isComment(odd)) {
        yield* readRecords(data.subarray(at), last);
        return;
      }
      takeOdd(odd);
      at = oddEnd;
    }
    tail = Buffer.from(data.subarray(end)); // a copy: the chunk may be filled again
    if (tail.length > LONGEST_RECORD) yield* readRecords(tail, last); // which says what is wrong
  }

  /** Reads the records from the first with a quote to the end of the chunk through fast-csv. */
  async function* readRecords(data: Buffer, last: boolean): AsyncGenerator<AccessBatch> {
    const splitter = new Splitter(file, delimiter, next);
    const cells = new CellReader(file, delimiter);
    try {
      let given = 0;
      for (const piece of pieces(data)) {
        given += piece.length;
        for (const { text, lines, fault, fatal } of splitter.push(piece, last && given === data.length))
          yield* takeRows(reading, { rows: await cells.read(text, lines), lines, fault, fatal });
      }
    } finally {
      cells.close();
    }
    tail = Buffer.from(splitter.rest);
    next = splitter.line;
  }

  /** Takes a line of its own that has no quotes, but something else out of the ordinary. */
  function takeOdd(bytes: Buffer): void {
    for (const { text, lines, fault, fatal } of new Splitter(file, delimiter, next).push(bytes, false)) {
      if (fault !== null && fatal) throw fault;
      if (fault !== null) tolerance.skip(fault);
      if (lines.length === 0) continue;
      try {
        access.add(text.replace(/\r?\n$/, '').split(delimiter), next);
      } catch (error) {
        tolerance.skip(error);
      }
    }
    facts.skippedRows = tolerance.skipped;
    next++;
  }
}

/** Whether a line is a comment. */
function isComment(line: Buffer): boolean {
  return /^[ \t\r]*#/.test(line.toString('latin1'));
}

/** Batches from rows of cells. */
export async function* readBlocks(
  reading: Reading,
  blocks: AsyncIterable<RowBlock>,
): AsyncGenerator<AccessBatch, undefined> {
  for await (const block of blocks) yield* takeRows(reading, block);
  yield* finishReading(reading);
}

/** Adds the rows of a block; hands out the batch whenever it is full and another row comes. */
function* takeRows(reading: Reading, { rows, lines, fault, fatal }: RowBlock): Generator<AccessBatch> {
  const { access, tolerance } = reading;
  const { batch } = access;
  for (let i = 0; i < rows.length; i++) {
    if (batch.count === BATCH_ROWS) {
      handOut(reading);
      yield batch;
      batch.count = 0;
    }
    try {
      access.add(rows[i], lines[i]);
    } catch (error) {
      tolerance.skip(error);
    }
  }
  if (fault !== null && fatal) throw fault;
  if (fault !== null) tolerance.skip(fault);
}

/** Ends the reading: the rows left, or the error that there were none. */
export async function* finishReading(reading: Reading): AsyncGenerator<AccessBatch> {
  const { file, access, tolerance, facts, hash } = reading;
  handOut(reading);
  facts.hash = await hash.hex();
  if (facts.rows === 0) throw noRows(file, tolerance.skipped);
  if (access.batch.count > 0) yield access.batch;
  access.batch.count = 0;
}

/** Counts the batch before it is handed out. */
export function handOut({ access, facts, tolerance }: Reading): void {
  facts.rows += access.batch.count;
  facts.skippedRows = tolerance.skipped;
}

/** The bytes taken already, then the others; closes the source when it is left early. */
export async function* joined(first: Buffer, others: AsyncIterator<Buffer>): AsyncGenerator<Buffer> {
  try {
    if (first.length > 0) yield first;
    for (;;) {
      const { done, value } = await others.next();
      if (done) return;
      yield Buffer.from(value); // a copy: the chunk may be filled again
    }
  } finally {
    await others.return?.();
  }
}
