import { parquetWriteBuffer } from 'hyparquet-writer';
import { sweepColumns } from './sweep-csv.js';
import type { SweepTable } from './sweep-table.js';

/** The runs as a Parquet file: the columns of the runs table with their types. */
export function sweepParquet(table: SweepTable): Uint8Array {
  const columnData = sweepColumns(table).map(({ name, type, values }) => ({
    name,
    type,
    data: [...values],
    nullable: values.includes(null),
  }));
  return new Uint8Array(parquetWriteBuffer({ columnData }));
}
