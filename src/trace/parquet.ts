/** Parquet files: read row group by row group, column by column, so that memory holds one group of the columns that are wanted. */
import { InputError } from '../errors.js';
import type { BlockColumn, ColumnBlock } from './column-rows.js';

/** A file of columns, opened: its column names, and its rows in blocks. */
export interface ColumnFile {
  readonly names: readonly string[];
  blocks(wanted: readonly string[]): AsyncIterable<ColumnBlock>;
}

/** Opens a Parquet file. Throws InputError when it is none. */
export async function openParquet(file: string): Promise<ColumnFile> {
  // heavy, and rarely wanted
  const { asyncBufferFromFile, parquetMetadataAsync, parquetScan, parquetSchema } = await import('hyparquet');
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
    async *blocks(wanted) {
      const scan = await parquetScan({ file: buffer, metadata, columns: [...wanted], compressors });
      for (const { rowStart, rowEnd } of scan.ranges) {
        const columns = new Map<string, BlockColumn>();
        for (const column of wanted) {
          const data = await scan.readColumn({ column, rowStart, rowEnd }).catch((error: unknown) => {
            throw bad(error);
          });
          columns.set(column, data as BlockColumn);
        }
        yield { rows: rowEnd - rowStart, columns };
      }
    },
  };
}
