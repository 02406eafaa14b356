/** Parquet files: read row group by row group, column by column, so that memory holds one group of the columns that are wanted. */
import { InputError } from '../errors.js';
import type { ColumnBlock } from './column-rows.js';
import type { BlockColumn } from './column-values.js';

/** A file of columns, opened: its column names, and its rows in blocks. */
export interface ColumnFile {
  readonly names: readonly string[];
  readonly rows: number; // NaN where they are not known beforehand
  blocks(wanted: readonly string[]): AsyncIterable<ColumnBlock>;
}

/** Opens a Parquet file. Throws InputError when it is none. */
export async function openParquet(file: string): Promise<ColumnFile> {
  // heavy, and rarely wanted
  const { asyncBufferFromFile, parquetMetadataAsync, parquetRead, parquetSchema } = await import('hyparquet');
  const { compressors } = await import('hyparquet-compressors');
  const bad = (error: unknown): InputError =>
    new InputError({
      where: { file },
      found: `a file that is no Parquet, or a damaged one (${(error as Error).message})`,
      expected: 'a Parquet file',
      hint: 'it may have been cut short on its way; copy or write it again',
    });
  const buffer = await asyncBufferFromFile(file);
  const metadata = await parquetMetadataAsync(buffer).catch((error: unknown) => {
    throw bad(error);
  });
  const names = parquetSchema(metadata).children.map((child) => child.element.name);
  return {
    names,
    rows: Number(metadata.num_rows),
    async *blocks(wanted) {
      let rowStart = 0;
      for (const group of metadata.row_groups) {
        const rows = Number(group.num_rows);
        const pages = new Map<string, Values[]>(wanted.map((name) => [name, []]));
        // page by page, for the library would join them to an array of boxed numbers
        await parquetRead({
          file: buffer,
          metadata,
          compressors,
          columns: [...wanted],
          rowStart,
          rowEnd: rowStart + rows,
          onPage: ({ pathInSchema, columnData }) => pages.get(pathInSchema[0])?.push(columnData),
        }).catch((error: unknown) => {
          throw bad(error);
        });
        const columns = new Map<string, BlockColumn>();
        for (const [name, parts] of pages) {
          const column = joined(parts);
          if (column.length !== rows) throw bad(new Error(`column ${name} has ${column.length} rows of ${rows}`));
          columns.set(name, column);
        }
        yield { rows, columns };
        rowStart += rows;
      }
    },
  };
}

type Values = ArrayLike<unknown>;

/** Pages one after the other: typed numbers stay so, as long as all pages have one type. */
function joined(pages: readonly Values[]): Values {
  if (pages.length === 1) return pages[0];
  const [first] = pages;
  const numbers = [BigInt64Array, BigUint64Array, Int32Array, Uint32Array, Float64Array, Float32Array].find(
    (type) => first instanceof type && pages.every((page) => page instanceof type),
  );
  if (numbers === undefined) return pages.flatMap((page) => Array.from(page));
  const out = new numbers(pages.reduce((sum, page) => sum + page.length, 0)) as Float64Array;
  let at = 0;
  for (const page of pages) {
    out.set(page as Float64Array, at);
    at += page.length;
  }
  return out;
}
