/**
 * Rows of an access trace that come as columns (Arrow, Parquet). Numbers go straight into the batch; a row with anything out of the
 * ordinary becomes cells of text and goes the way of a CSV row, which accepts or refuses it with the same rules and words. Where a
 * CSV row has its line, such a row has its number, counted from 1.
 */
import { BATCH_ROWS, FARTHEST_AFTER, LATEST_PS, LONGEST_ACCESS } from './access.js';
import { finishReading, handOut, type Reading } from './access-rows.js';
import type { AccessBatch } from './batch.js';

/** A column of a block: typed numbers, 64-bit integers, or whatever else its file holds; or indices into a short list of words. */
export type BlockColumn =
  | ArrayLike<unknown>
  | { readonly indices: ArrayLike<number>; readonly words: readonly unknown[] };

/** A stretch of rows, by the names of the file's columns. */
export interface ColumnBlock {
  readonly rows: number;
  readonly columns: ReadonlyMap<string, BlockColumn>;
}

export async function* readColumns(
  reading: Reading,
  blocks: AsyncIterable<ColumnBlock>,
): AsyncGenerator<AccessBatch, undefined> {
  const { access, header, tolerance, facts } = reading;
  const { at } = access;
  const { batch } = access;
  const nameAt = (position: number): string | undefined => header.names[position];
  let number = 0; // rows before this block
  for await (const { rows, columns } of blocks) {
    const column = (position: number): BlockColumn | undefined => columns.get(nameAt(position) ?? '');
    const numeric = (position: number): Float64Array | null => (position < 0 ? null : numbers(column(position), rows));
    const ops = codes(column(at.op), rows, (word) => access.ops.get(word.toLowerCase()) ?? -1);
    const kernels = at.kernel < 0 ? null : column(at.kernel);
    const [address, bytes, time] = [numeric(at.address), numeric(at.bytes), numeric(at.time)];
    const [die, engine, tile, flops, after] = [at.die, at.engine, at.tile, at.flops, at.after].map(numeric);
    const plain = header.values.length === 0 && address !== null && bytes !== null;
    for (let i = 0; i < rows; i++) {
      if (batch.count === BATCH_ROWS) {
        handOut(reading);
        yield batch;
        batch.count = 0;
      }
      if (plain && ops[i] >= 0) {
        const [a, b] = [address[i], bytes[i]];
        const timePs = time === null ? 0 : Math.round(time[i] * access.timeScale);
        const owner = access.ownerOf(a, a + b);
        const d = orElse(die, i, -1);
        const e = orElse(engine, i, -1);
        const t = orElse(tile, i, -1);
        const back = orElse(after, i, 0);
        const work = orElse(flops, i, 0);
        // written so that NaN fails
        const good =
          a >= 0 &&
          a < 2 ** 52 &&
          b >= 1 &&
          b <= LONGEST_ACCESS &&
          Math.floor(a) === a &&
          Math.floor(b) === b &&
          owner !== -2 &&
          timePs >= access.lastTime &&
          timePs <= LATEST_PS &&
          d >= -1 &&
          d < access.dieCount() &&
          Math.floor(d) === d &&
          e >= -1 &&
          Math.floor(e) === e &&
          e < access.enginesOf(d >= 0 ? d : owner) &&
          t >= -1 &&
          t <= 0x7fffffff &&
          Math.floor(t) === t &&
          back >= 0 &&
          back <= FARTHEST_AFTER &&
          Math.floor(back) === back &&
          work >= 0 &&
          work < Number.POSITIVE_INFINITY;
        const kernel = good ? access.kernelOf(kernels === null ? '' : text(kernels, i).trim()) : -1;
        if (good && kernel >= 0) {
          access.put(ops[i], a, b, timePs, d, e, kernel, t, work, back, number + i + 1);
          continue;
        }
      }
      try {
        // negative: there is no column of a line to point at
        access.add(
          header.names.map((name) => text(columns.get(name), i)),
          -(number + i + 1),
        );
      } catch (error) {
        tolerance.skip(error);
      }
    }
    number += rows;
    facts.skippedRows = tolerance.skipped;
  }
  yield* finishReading(reading);
}

const orElse = (column: Float64Array | null, i: number, none: number): number => {
  if (column === null) return none;
  const value = column[i];
  return value === Number.NEGATIVE_INFINITY ? none : value; // see numbers(): an empty cell
};

/** A column as doubles: NaN where there is no number, -Infinity where there is nothing. Null when it is words, to be read as text. */
function numbers(column: BlockColumn | undefined, rows: number): Float64Array | null {
  const out = new Float64Array(rows);
  if (column === undefined) return out.fill(Number.NEGATIVE_INFINITY);
  if ('indices' in column) {
    const values = numbers(column.words as ArrayLike<unknown>, column.words.length);
    if (values === null) return null;
    for (let i = 0; i < rows; i++) out[i] = values[column.indices[i]];
    return out;
  }
  if (column instanceof BigInt64Array || column instanceof BigUint64Array) {
    // 64-bit integers by their halves: no BigInt is made
    const halves = new Int32Array(column.buffer, column.byteOffset, 2 * rows);
    for (let i = 0; i < rows; i++) out[i] = halves[2 * i + 1] * 4294967296 + (halves[2 * i] >>> 0);
    return out;
  }
  if (ArrayBuffer.isView(column)) {
    out.set((column as unknown as Float64Array).subarray(0, rows));
    return out;
  }
  for (let i = 0; i < rows; i++) {
    const value = column[i];
    if (typeof value === 'number' || typeof value === 'bigint') out[i] = Number(value);
    else if (value === null || value === undefined) out[i] = Number.NEGATIVE_INFINITY;
    else return null;
  }
  return out;
}

/** Operations by row, -1 where the word is none. */
function codes(column: BlockColumn | undefined, rows: number, codeOf: (word: string) => number): Int8Array {
  const out = new Int8Array(rows).fill(-1);
  if (column === undefined) return out;
  if ('indices' in column) {
    const byWord = Int8Array.from(column.words, (word) => codeOf(String(word)));
    for (let i = 0; i < rows; i++) out[i] = byWord[column.indices[i]];
    return out;
  }
  const seen = new Map<unknown, number>();
  for (let i = 0; i < rows; i++) {
    const word = column[i];
    let code = seen.get(word);
    if (code === undefined) {
      code = codeOf(String(word).trim());
      if (seen.size < 64) seen.set(word, code);
    }
    out[i] = code;
  }
  return out;
}

/** A cell as text; '' where there is nothing. */
function text(column: BlockColumn | undefined, i: number): string {
  if (column === undefined) return '';
  const value = 'indices' in column ? column.words[column.indices[i]] : column[i];
  if (value === null || value === undefined) return '';
  return value instanceof Uint8Array ? Buffer.from(value).toString('utf8') : String(value);
}
