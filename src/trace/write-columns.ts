/**
 * Access batches to the bytes of columnar files. The columns are those of CSV by their names; addresses and times are 64-bit
 * integers; -1 stands for no die, engine or tile.
 */
import { Readable } from 'node:stream';
import { type AccessBatch, READ } from './batch.js';

const GROUP_ROWS = 1 << 17; // rows of a Parquet row group and of an Arrow record batch: a megabyte a column of 64-bit integers

/** Columns of a stretch of rows, ready to be written. */
interface Gathered {
  rows: number;
  readonly op: Uint8Array;
  readonly address: BigInt64Array;
  readonly bytes: BigInt64Array;
  readonly timePs: BigInt64Array | null;
  readonly die: Int32Array | null;
  readonly engine: Int32Array | null;
  readonly kernel: Int32Array;
  readonly tile: Int32Array | null;
  readonly flops: Float64Array | null;
  readonly after: Int32Array | null;
}

type Batches = AsyncIterable<AccessBatch> | Iterable<AccessBatch>;

/** Joins batches to groups of GROUP_ROWS; the group is filled again after each pull. */
async function* gathered(batches: Batches): AsyncGenerator<Gathered> {
  let group: Gathered | null = null;
  for await (const batch of batches) {
    const ints = (column: unknown): Int32Array | null => (column === null ? null : new Int32Array(GROUP_ROWS));
    group ??= {
      rows: 0,
      op: new Uint8Array(GROUP_ROWS),
      address: new BigInt64Array(GROUP_ROWS),
      bytes: new BigInt64Array(GROUP_ROWS),
      timePs: batch.timePs === null ? null : new BigInt64Array(GROUP_ROWS),
      die: ints(batch.die),
      engine: ints(batch.engine),
      kernel: new Int32Array(GROUP_ROWS),
      tile: ints(batch.tile),
      flops: batch.flops === null ? null : new Float64Array(GROUP_ROWS),
      after: ints(batch.after),
    };
    for (let from = 0; from < batch.count; ) {
      const take = Math.min(batch.count - from, GROUP_ROWS - group.rows);
      copy(batch, from, take, group);
      group.rows += take;
      from += take;
      if (group.rows < GROUP_ROWS) continue;
      yield group;
      group.rows = 0;
    }
  }
  if (group !== null && group.rows > 0) yield group;
}

function copy(batch: AccessBatch, from: number, count: number, to: Gathered): void {
  const at = to.rows;
  const part = <T extends Int32Array | Uint8Array | Float64Array>(column: T): T =>
    column.subarray(from, from + count) as T;
  to.op.set(part(batch.op), at);
  to.kernel.set(part(batch.kernel), at);
  split(batch.address, from, count, to.address, at);
  split(batch.bytes, from, count, to.bytes, at);
  if (batch.timePs !== null && to.timePs !== null) split(batch.timePs, from, count, to.timePs, at);
  for (const name of ['die', 'engine', 'tile', 'after'] as const) {
    const column = batch[name];
    if (column !== null) to[name]?.set(part(column), at);
  }
  if (batch.flops !== null) to.flops?.set(part(batch.flops), at);
}

/** Whole numbers below 2^53 as 64-bit integers, by their halves: no BigInt is made. */
function split(numbers: Float64Array, from: number, count: number, to: BigInt64Array, at: number): void {
  const halves = new Uint32Array(to.buffer, to.byteOffset + 8 * at, 2 * count);
  for (let i = 0; i < count; i++) {
    const value = numbers[from + i];
    halves[2 * i] = value >>> 0;
    halves[2 * i + 1] = Math.floor(value / 4294967296);
  }
}

const OP_WORDS = ['R', 'W'];

/** The bytes of a Parquet file, in pieces. `kernelNames` null leaves the kernel out; the list may grow while batches are read. */
export async function* parquetBytes(
  batches: Batches,
  kernelNames: readonly string[] | null,
): AsyncGenerator<Uint8Array> {
  const { ByteWriter, ParquetWriter, schemaFromColumnData } = await import('hyparquet-writer');
  const out = new ByteWriter();
  let pieces: Uint8Array[] = [];
  const flush = (): void => {
    pieces.push(new Uint8Array(out.buffer, 0, out.index).slice());
    out.index = 0;
  };
  Object.assign(out, { flush, finish: flush });
  let writer: InstanceType<typeof ParquetWriter> | null = null;
  for await (const group of gathered(batches)) {
    const { rows } = group;
    const columnData = [
      {
        name: 'op',
        type: 'STRING' as const,
        data: Array.from(group.op.subarray(0, rows), (op) => OP_WORDS[op === READ ? 0 : 1]),
      },
      { name: 'address', type: 'INT64' as const, data: group.address.subarray(0, rows) },
      { name: 'bytes', type: 'INT64' as const, data: group.bytes.subarray(0, rows) },
      ...(group.timePs === null
        ? []
        : [{ name: 'time_ps', type: 'INT64' as const, data: group.timePs.subarray(0, rows) }]),
      ...ints(group, rows),
      ...(kernelNames === null
        ? []
        : [
            {
              name: 'kernel',
              type: 'STRING' as const,
              data: Array.from(group.kernel.subarray(0, rows), (k) => kernelNames[k]),
            },
          ]),
      ...(group.flops === null
        ? []
        : [{ name: 'flops', type: 'DOUBLE' as const, data: group.flops.subarray(0, rows) }]),
    ].map((column) => ({ ...column, nullable: false }));
    writer ??= new ParquetWriter({ writer: out, schema: schemaFromColumnData({ columnData }), createdBy: 'penstock' });
    await writer.write({ columnData, rowGroupSize: GROUP_ROWS });
    yield* pieces;
    pieces = [];
  }
  await writer?.finish();
  yield* pieces;
}

function ints(group: Gathered, rows: number) {
  return (['die', 'engine', 'tile', 'after'] as const).flatMap((name) => {
    const data = group[name];
    return data === null ? [] : [{ name, type: 'INT32' as const, data: data.subarray(0, rows) }];
  });
}

/** The bytes of an Arrow IPC file, in pieces; arguments as for Parquet. */
export async function* arrowBytes(batches: Batches, kernelNames: readonly string[] | null): AsyncGenerator<Uint8Array> {
  const arrow = await import('apache-arrow');
  const opType = new arrow.Dictionary(new arrow.Utf8(), new arrow.Int8(), 0);
  const opWords = arrow.vectorFromArray(OP_WORDS, new arrow.Utf8());
  async function* recordBatches() {
    for await (const group of gathered(batches)) {
      const { rows } = group;
      // the group is filled again while this batch is still on its way: it gets numbers of its own
      const own = <T extends { slice(from: number, to: number): T }>(column: T): T => column.slice(0, rows);
      const int64 = (column: BigInt64Array) =>
        arrow.makeData({ type: new arrow.Int64(), length: rows, data: own(column) });
      const int32 = (column: Int32Array) =>
        arrow.makeData({ type: new arrow.Int32(), length: rows, data: own(column) });
      const columns = new Map<string, import('apache-arrow').Data>();
      const ops = Int8Array.from(group.op.subarray(0, rows), (op) => (op === READ ? 0 : 1));
      columns.set('op', arrow.makeData({ type: opType, length: rows, data: ops, dictionary: opWords }));
      columns.set('address', int64(group.address));
      columns.set('bytes', int64(group.bytes));
      if (group.timePs !== null) columns.set('time_ps', int64(group.timePs));
      for (const name of ['die', 'engine', 'tile', 'after'] as const) {
        const column = group[name];
        if (column !== null) columns.set(name, int32(column));
      }
      if (kernelNames !== null) {
        const words = Array.from(group.kernel.subarray(0, rows), (k) => kernelNames[k]);
        columns.set('kernel', arrow.vectorFromArray(words, new arrow.Utf8()).data[0]);
      }
      if (group.flops !== null)
        columns.set('flops', arrow.makeData({ type: new arrow.Float64(), length: rows, data: own(group.flops) }));
      const fields = [...columns].map(([name, data]) => new arrow.Field(name, data.type, false));
      const struct = arrow.makeData({
        type: new arrow.Struct(fields),
        length: rows,
        nullCount: 0,
        children: [...columns.values()],
      });
      yield new arrow.RecordBatch(new arrow.Schema(fields), struct);
    }
  }
  const writer = arrow.RecordBatchFileWriter.throughNode();
  for await (const chunk of Readable.from(recordBatches()).pipe(writer as unknown as NodeJS.ReadWriteStream))
    yield chunk as unknown as Uint8Array;
}
