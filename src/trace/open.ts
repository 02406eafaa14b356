/**
 * Opens a trace: lets its name, its first bytes and its header row decide what it is and who reads it. Memory does not grow with the
 * length of a trace: it is read a few buffers ahead of its user, and no further.
 */
import { InputError } from '../errors.js';
import { AccessRows } from './access.js';
import { joined, type Reading, readBlocks, readPlain } from './access-rows.js';
import { openArrow } from './arrow.js';
import type { AccessBatch, AccessTrace, DieGeometry, Trace } from './batch.js';
import type { FileHash } from './bytes.js';
import { readColumns } from './column-rows.js';
import { type ColumnHash, hashOf, mustBeFile, openHashed } from './files.js';
import { type Header, readHeader } from './header.js';
import { readKernels } from './kernels.js';
import { type ColumnFile, openParquet } from './parquet.js';
import { LONGEST_RECORD } from './records.js';
import { type RowBlock, readRows } from './rows.js';
import { OWN_SHAPE, type Shape } from './shape.js';
import { Tolerance } from './tolerance.js';

export interface TraceOptions {
  /** Bad rows that are skipped and counted before one stops the reading; 0 when left out. */
  readonly skipBadRows?: number;
  /** Names of the compute dies, in the order of the package, for the `die` column. */
  readonly dieNames?: readonly string[];
  /** End of the address space, bytes; the end of `geometry` when left out. */
  readonly capacity?: number;
  /** One entry a compute die; when left out, dies, engines and addresses are checked for form only. */
  readonly geometry?: readonly DieGeometry[];
  /** Period of the clock that column `cycle` counts, ps. */
  readonly cyclePs?: number;
  /** Columns, words and delimiter of a captured trace; our own when left out. */
  readonly shape?: Shape;
  /** What file '-' reads: standard input. */
  readonly input?: AsyncIterable<Buffer>;
}

/**
 * Opens an access trace or a kernel trace (`.csv`, `.csv.gz`, `.csv.zst`, or '-' for `options.input`; an access trace also `.parquet`
 * or `.arrow`). A kernel trace is read to its end; of
 * an access trace the first batch is read, so that what is wrong near its top is said here, and `batches()`, which may be called
 * once, reads on. Throws InputError for whatever the user can mend and SystemError for what
 * cannot be read.
 */
export async function openTrace(file: string, options: TraceOptions = {}): Promise<Trace> {
  const expected = 'a trace file, .csv, .csv.gz, .csv.zst, .parquet or .arrow';
  const openColumns = /\.(parquet|arrow|feather)$/i.exec(file)?.[1].toLowerCase();
  if (openColumns !== undefined) {
    const before = await mustBeFile(file, expected);
    const columns = openColumns === 'parquet' ? await openParquet(file) : await openArrow(file);
    return openColumnFile(file, columns, options, hashOf(file, before));
  }
  const { bytes, hash, fraction } = await openHashed(file, { input: options.input, expected, reuse: true });
  const source = bytes[Symbol.asyncIterator]();
  const shape = options.shape ?? OWN_SHAPE;
  const tolerance = new Tolerance(options.skipBadRows ?? 0);
  try {
    const head = await readHead(source);
    if (head.end > 0) {
      const row = head.data
        .toString('utf8', head.start, head.end)
        .replace(/\r?\n$/, '')
        .split(shape.delimiter);
      const header = readHeader(row, head.line, file, shape);
      if (header.kind === 'access') {
        const reading = startReading(file, header, tolerance, options, hash);
        return await accessTrace(
          reading,
          readPlain(reading, source, head.data.subarray(head.end), head.line + 1),
          fraction,
        );
      }
    }
    // a kernel trace, or one that begins with something odd
    const blocks = readRows(joined(head.data, source), file, shape.delimiter);
    const { header, rest } = await firstRow(blocks, file, shape);
    const rows = withBlock(rest, blocks);
    if (header.kind === 'access') {
      const reading = startReading(file, header, tolerance, options, hash);
      return await accessTrace(reading, readBlocks(reading, rows), fraction);
    }
    const { dieNames = [], geometry = [] } = options;
    return await readKernels(file, header, rows, tolerance, dieNames, geometry, hash);
  } catch (error) {
    await source.return?.(); // closes the file
    throw error;
  }
}

/** A trace whose file holds columns. */
async function openColumnFile(
  file: string,
  columns: ColumnFile,
  options: TraceOptions,
  hash: ColumnHash,
): Promise<Trace> {
  try {
    const header = readHeader(columns.names, 1, file, options.shape ?? OWN_SHAPE);
    if (header.kind === 'kernel') {
      throw new InputError({
        where: { file },
        found: 'a kernel trace in columns',
        expected: 'an access trace; kernel traces are CSV',
        hint: 'write it as .csv',
      });
    }
    const reading = startReading(file, header, new Tolerance(options.skipBadRows ?? 0), options, hash);
    const wanted = [...new Set([...header.at.values()].filter((at) => at < header.names.length))].map(
      (at) => header.names[at],
    );
    return await accessTrace(
      reading,
      closing(readColumns(reading, columns.blocks(wanted)), hash),
      () => reading.facts.rows / columns.rows,
    );
  } catch (error) {
    await hash.close();
    throw error;
  }
}

async function* closing(
  batches: AsyncGenerator<AccessBatch, undefined>,
  hash: ColumnHash,
): AsyncGenerator<AccessBatch, undefined> {
  try {
    yield* batches;
  } finally {
    await hash.close();
  }
}

function startReading(
  file: string,
  header: Header,
  tolerance: Tolerance,
  options: TraceOptions,
  hash: FileHash,
): Reading {
  const { dieNames = [], geometry = [], cyclePs = 0 } = options;
  const end = geometry.length > 0 ? Math.max(...geometry.map((die) => die.base + die.capacity)) : 2 ** 52;
  const access = new AccessRows(file, header, { dieNames, geometry, capacity: options.capacity ?? end, cyclePs });
  return { file, header, access, tolerance, facts: { rows: 0, skippedRows: 0, hash: '' }, hash };
}

/** Reads the first batch, so that what is wrong near the top of a trace is said when it is opened. */
async function accessTrace(
  { file, access, facts }: Reading,
  batches: AsyncGenerator<AccessBatch, undefined>,
  fraction: () => number,
): Promise<AccessTrace> {
  const first = await batches.next();
  let begun = false;
  return {
    kind: 'access',
    file,
    kernelNames: access.kernelNames,
    hasTime: access.batch.timePs !== null,
    async *batches() {
      if (begun) throw new Error(`${file} is being read already; open it again to read it twice`);
      begun = true;
      try {
        if (!first.done) yield first.value;
        yield* batches;
      } finally {
        await batches.return(undefined);
      }
    },
    facts: () => ({ ...facts }),
    fraction,
  };
}

/** What a trace begins with: its header is bytes `start` up to `end` of `data`; `end` 0 when quotes or NUL make it more than a line. */
interface Head {
  readonly data: Buffer;
  readonly start: number;
  readonly end: number;
  readonly line: number;
}

/** Reads until the first line that is neither blank nor a comment has come whole. */
async function readHead(source: AsyncIterator<Buffer>): Promise<Head> {
  let data: Buffer = Buffer.alloc(0);
  let start = 0;
  let line = 1;
  for (;;) {
    const { done, value } = await source.next();
    if (!done) data = Buffer.concat([data, value]); // a copy: the chunk may be filled again
    if (start === 0 && data[0] === 0xef && data[1] === 0xbb && data[2] === 0xbf) start = 3; // UTF-8 byte order mark
    for (;;) {
      const newline = data.indexOf(10, start);
      if (newline < 0) break;
      const text = data.toString('latin1', start, newline);
      if (/["\0]|\r./.test(text)) return { data, start, end: 0, line };
      if (!/^\s*(#|$)/.test(text)) return { data, start, end: newline + 1, line };
      start = newline + 1;
      line++;
    }
    // without an end, or with one too far away, it is the other reader's to say what is wrong
    if (done || data.length - start > LONGEST_RECORD || data.indexOf(0, start) >= 0)
      return { data, start, end: 0, line };
  }
}

/** Takes the header row and gives back the rest of its block. */
async function firstRow(
  blocks: AsyncGenerator<RowBlock>,
  file: string,
  shape: Shape,
): Promise<{ header: Header; rest: RowBlock }> {
  const { value: block, done } = await blocks.next();
  if (done) {
    throw new InputError({
      where: { file },
      found: 'an empty file',
      expected: 'a trace: a header row and rows under it',
      hint: 'check how the trace was written',
    });
  }
  // without a good header no row can be understood, so its faults cannot be skipped
  if (block.rows.length === 0) throw block.fault;
  const header = readHeader(block.rows[0], Math.abs(block.lines[0]), file, shape);
  return { header, rest: { ...block, rows: block.rows.slice(1), lines: block.lines.slice(1) } };
}

async function* withBlock(first: RowBlock, others: AsyncGenerator<RowBlock>): AsyncGenerator<RowBlock> {
  try {
    yield first;
    yield* others;
  } finally {
    await others.return(undefined);
  }
}
