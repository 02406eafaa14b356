/**
 * Reads the rows of an access trace into batches. Bytes go through the plain-row parser; the odd row alone goes through records and
 * cells; and from the first quote on, where a record may go over several lines, all the rest goes through fast-csv.
 */
import type { Hash } from 'node:crypto';
import { type AccessRows, BATCH_ROWS } from './access.js';
import type { AccessBatch, TraceFacts } from './batch.js';
import type { Header } from './header.js';
import { PlainRows } from './plain.js';
import { LONGEST_RECORD, Splitter } from './records.js';
import { type RowBlock, readRows } from './rows.js';
import { noRows, type Tolerance } from './tolerance.js';

const [NEWLINE, QUOTE] = [10, 34];

/** What the reading keeps count of; `facts` grow on the way, the hash is known at the end. */
export interface Reading {
  readonly file: string;
  readonly header: Header;
  readonly access: AccessRows;
  readonly tolerance: Tolerance;
  readonly facts: { -readonly [K in keyof TraceFacts]: TraceFacts[K] };
  readonly hash: Hash;
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
  let rest = first;
  let next = line; // number of the line at the start of `rest`
  let ended = false;
  for (;;) {
    const data = rest;
    const odd = firstOdd(data);
    let at = 0;
    for (;;) {
      if (batch.count === BATCH_ROWS) {
        handOut(reading);
        yield batch;
        batch.count = 0;
      }
      const end = plain.take(data, at, odd, next);
      if (end > 0) {
        at = end;
        next++;
        continue;
      }
      const newline = data.indexOf(NEWLINE, at);
      if (newline < 0 || newline > odd) break;
      takeOdd(data.subarray(at, newline + 1), next);
      at = newline + 1;
      next++;
    }
    rest = data.subarray(at);
    if (odd < data.length || rest.length > LONGEST_RECORD) {
      const blocks = readRows(joined(rest, source), file, delimiter, new Splitter(file, delimiter, next));
      yield* readBlocks(reading, blocks);
      return;
    }
    const more = ended ? { done: true as const, value: undefined } : await source.next();
    if (!more.done) rest = rest.length === 0 ? more.value : Buffer.concat([rest, more.value]);
    else if (rest.length > 0) {
      rest = Buffer.concat([rest, Buffer.from('\n')]);
      ended = true;
    } else break;
  }
  yield* finishReading(reading);

  function takeOdd(bytes: Buffer, number: number): void {
    for (const { text, lines, fault, fatal } of new Splitter(file, delimiter, number).push(bytes, false)) {
      if (fault !== null && fatal) throw fault;
      if (fault !== null) tolerance.skip(fault);
      if (lines.length === 0) continue;
      try {
        access.add(text.replace(/\r?\n$/, '').split(delimiter), number);
      } catch (error) {
        tolerance.skip(error);
      }
    }
    facts.skippedRows = tolerance.skipped;
  }
}

/** Batches from rows of cells. */
export async function* readBlocks(
  reading: Reading,
  blocks: AsyncIterable<RowBlock>,
): AsyncGenerator<AccessBatch, undefined> {
  const { access, tolerance } = reading;
  const { batch } = access;
  for await (const { rows, lines, fault, fatal } of blocks) {
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
  yield* finishReading(reading);
}

/** Ends the reading: the rows left, or the error that there were none. */
export function* finishReading(reading: Reading): Generator<AccessBatch> {
  const { file, access, tolerance, facts, hash } = reading;
  handOut(reading);
  facts.hash = hash.digest('hex');
  if (facts.rows === 0) throw noRows(file, tolerance.skipped);
  if (access.batch.count > 0) yield access.batch;
  access.batch.count = 0;
}

/** Counts the batch before it is handed out. */
export function handOut({ access, facts, tolerance }: Reading): void {
  facts.rows += access.batch.count;
  facts.skippedRows = tolerance.skipped;
}

/** Index of the first byte that a plain row cannot have: a quote or NUL; the length when there is none. */
function firstOdd(data: Buffer): number {
  const quote = data.indexOf(QUOTE);
  const zero = data.indexOf(0);
  const least = Math.min(quote < 0 ? data.length : quote, zero < 0 ? data.length : zero);
  return least;
}

/** The bytes taken already, then the others; closes the source when it is left early. */
export async function* joined(first: Buffer, others: AsyncIterator<Buffer>): AsyncGenerator<Buffer> {
  try {
    if (first.length > 0) yield first;
    for (;;) {
      const { done, value } = await others.next();
      if (done) return;
      yield value;
    }
  } finally {
    await others.return?.();
  }
}
