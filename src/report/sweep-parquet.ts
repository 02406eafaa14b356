import { sweepColumns } from './sweep-csv.js';
import type { SweepTable } from './sweep-table.js';

/** The runs as a Parquet file: the columns of the runs table with their types. */
export async function sweepParquet(table: SweepTable): Promise<Uint8Array> {
  const { parquetWriteBuffer } = await import('hyparquet-writer'); // only who writes one waits for it to load
  const columnData = sweepColumns(table).map(({ name, type, values }) => ({
    name,
    type,
    data: [...values],
    nullable: values.includes(null),
  }));
  return new Uint8Array(parquetWriteBuffer({ columnData }));
}
