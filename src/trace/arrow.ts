/** Arrow IPC files: read record batch by record batch; columns of numbers are views of the bytes read. */
import { open } from 'node:fs/promises';
import type { Data, RecordBatch, Vector } from 'apache-arrow';
import { InputError } from '../errors.js';
import type { ColumnBlock } from './column-rows.js';
import type { BlockColumn } from './column-values.js';
import type { ColumnFile } from './parquet.js';

/** Opens an Arrow IPC file (the file format, not a stream). Throws InputError when it is none. */
export async function openArrow(file: string): Promise<ColumnFile> {
  // heavy, and rarely wanted
  const { RecordBatchReader, Type } = await import('apache-arrow');
  const bad = (error: unknown): InputError =>
    new InputError({
      where: { file },
      found: `a file that is no Arrow IPC, or a damaged one (${(error as Error).message})`,
      expected: 'an Arrow IPC file',
      hint: 'it may have been cut short on its way; copy or write it again',
    });
  const handle = await open(file);
  const reader = await RecordBatchReader.from(handle).catch((error: unknown) => {
    throw bad(error);
  });
  await reader.open().catch((error: unknown) => {
    throw bad(error);
  });
  if (reader.schema === undefined) throw bad(new Error('it has no schema'));
  return {
    names: reader.schema.fields.map((field) => field.name),
    rows: Number.NaN, // the file says how many record batches it has, but not of how many rows
    async *blocks(wanted) {
      try {
        for await (const batch of reader as AsyncIterable<RecordBatch>) {
          const columns = new Map<string, BlockColumn>();
          for (const name of wanted) {
            const vector = batch.getChild(name);
            if (vector !== null) columns.set(name, columnOf(vector, Type));
          }
          yield { rows: batch.numRows, columns } satisfies ColumnBlock;
        }
      } catch (error) {
        throw error instanceof InputError ? error : bad(error);
      } finally {
        await reader.cancel();
        await handle.close().catch(() => {});
      }
    },
  };
}

/** A column of a record batch: its numbers where they lie, words of a dictionary once, everything else value by value. */
function columnOf(vector: Vector, { Dictionary, Int, Float }: typeof import('apache-arrow').Type): BlockColumn {
  const [data] = vector.data as readonly Data[];
  if (data !== undefined && vector.data.length === 1 && data.nullCount === 0) {
    const values = data.values as ArrayLike<unknown> & { subarray(from: number, to: number): ArrayLike<unknown> };
    if (data.typeId === Dictionary)
      return {
        indices: values.subarray(0, data.length) as ArrayLike<number>,
        words: data.dictionary?.toArray() as unknown[],
      };
    const half = data.typeId === Float && values instanceof Uint16Array; // of half precision: bits, not numbers
    if ((data.typeId === Int || data.typeId === Float) && !half) return values.subarray(0, data.length);
  }
  return Array.from({ length: vector.length }, (_, i) => vector.get(i) as unknown);
}
