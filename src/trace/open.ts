/**
 * Opens a trace: the one place of this folder that touches files. Reads bytes, un-gzips them, hashes them as they come, and lets
 * the header row decide which kind of trace it is. Nothing is read faster than it is used, and memory does not grow with length.
 */
import { createHash, type Hash } from 'node:crypto';
import { createReadStream } from 'node:fs';
import { stat } from 'node:fs/promises';
import { InputError } from '../errors.js';
import { AccessRows, BATCH_ROWS } from './access.js';
import type { AccessBatch, AccessTrace, DieGeometry, Trace, TraceFacts } from './batch.js';
import { CHUNK, decode, hashed, unreadable } from './bytes.js';
import { type Header, readHeader } from './header.js';
import { readKernels } from './kernels.js';
import { type RowBlock, readRows } from './rows.js';
import { noRows, Tolerance } from './tolerance.js';

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
  /** What file '-' reads: standard input. */
  readonly input?: AsyncIterable<Buffer>;
}

/**
 * Opens an access trace or a kernel trace (`.csv`, `.csv.gz`, or '-' for `options.input`). A kernel trace is read to its end; of
 * an access trace the first batch is read, so that what is wrong near its top is said here, and `batches()`, which may be called
 * once, reads on. Throws InputError for whatever the user can mend and SystemError for what
 * cannot be read.
 */
export async function openTrace(file: string, options: TraceOptions = {}): Promise<Trace> {
  const hash = createHash('sha256');
  const source = await openBytes(file, { input: options.input, hash, expected: 'a trace file, .csv or .csv.gz' });
  const blocks = readRows(source, file);
  try {
    const tolerance = new Tolerance(options.skipBadRows ?? 0);
    const { header, rest } = await firstRow(blocks, file);
    const rows = withBlock(rest, blocks);
    if (header.kind === 'access') return await openAccess(file, header, rows, tolerance, options, hash);
    const { dieNames = [], geometry = [] } = options;
    return await readKernels(file, header, rows, tolerance, dieNames, geometry, () => hash.digest('hex'));
  } catch (error) {
    await blocks.return(undefined); // closes the file
    throw error;
  }
}

async function openAccess(
  file: string,
  header: Header,
  rows: AsyncIterable<RowBlock>,
  tolerance: Tolerance,
  options: TraceOptions,
  hash: Hash,
): Promise<AccessTrace> {
  const { dieNames = [], geometry = [], cyclePs = 0 } = options;
  const end = geometry.length > 0 ? Math.max(...geometry.map((die) => die.base + die.capacity)) : 2 ** 52;
  const access = new AccessRows(file, header, { dieNames, geometry, capacity: options.capacity ?? end, cyclePs });
  const facts = { rows: 0, skippedRows: 0, hash: '' };
  const reading = readBatches(file, access, rows, tolerance, facts, hash);
  const first = await reading.next();
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
        yield* reading;
      } finally {
        await reading.return(undefined);
      }
    },
    facts: () => ({ ...facts }),
  };
}

/** Fills and hands out the batch until the rows end; `facts` grow on the way, the hash is known at the end. */
async function* readBatches(
  file: string,
  access: AccessRows,
  blocks: AsyncIterable<RowBlock>,
  tolerance: Tolerance,
  facts: { -readonly [K in keyof TraceFacts]: TraceFacts[K] },
  hash: Hash,
): AsyncGenerator<AccessBatch, undefined> {
  const { batch } = access;
  for await (const { rows, lines, fault, fatal } of blocks) {
    for (let i = 0; i < rows.length; i++) {
      try {
        access.add(rows[i], lines[i]);
      } catch (error) {
        tolerance.skip(error);
      }
      if (batch.count < BATCH_ROWS) continue;
      facts.rows += batch.count;
      facts.skippedRows = tolerance.skipped;
      yield batch;
      batch.count = 0;
    }
    if (fault !== null && fatal) throw fault;
    if (fault !== null) tolerance.skip(fault);
  }
  facts.rows += batch.count;
  facts.skippedRows = tolerance.skipped;
  facts.hash = hash.digest('hex');
  if (facts.rows === 0) throw noRows(file, tolerance.skipped);
  if (batch.count > 0) yield batch;
  batch.count = 0;
}

/** Takes the header row and gives back the rest of its block. */
async function firstRow(blocks: AsyncGenerator<RowBlock>, file: string): Promise<{ header: Header; rest: RowBlock }> {
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
  const header = readHeader(block.rows[0], Math.abs(block.lines[0]), file);
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

export interface ByteSource {
  readonly input: AsyncIterable<Buffer> | undefined; // what file '-' reads
  readonly hash?: Hash; // fed with the bytes as they are stored
  readonly expected: string; // what kind of file would do, for errors
}

/** The bytes of a text file, un-gzipped when it is gzip. Throws InputError when there is none to read, or SystemError. */
export async function openBytes(
  file: string,
  { input, hash = createHash('sha256'), expected }: ByteSource,
): Promise<AsyncIterable<Buffer>> {
  if (file === '-') {
    if (input === undefined) {
      throw new InputError({
        where: { file },
        found: "'-', and no standard input to read",
        expected: 'a stream handed in with it',
        hint: 'name a file',
      });
    }
    return decode(hashed(input, file, hash), file, 'by content');
  }
  let found: string | null = null;
  try {
    if ((await stat(file)).isDirectory()) found = 'a directory';
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? '';
    if (!['ENOENT', 'ENOTDIR', 'ENAMETOOLONG', 'ELOOP', 'ERR_INVALID_ARG_VALUE'].includes(code))
      throw unreadable(file, error);
    found = 'no such file';
  }
  if (found !== null) {
    throw new InputError({
      where: { file },
      found,
      expected,
      hint: found === 'a directory' ? 'name a file in it' : 'check the path',
    });
  }
  const raw = hashed(createReadStream(file, { highWaterMark: CHUNK }), file, hash);
  return decode(raw, file, file.endsWith('.gz') ? 'gzip' : 'plain');
}
