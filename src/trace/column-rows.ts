/**
 * Rows of an access trace that come as columns (Arrow, Parquet). Numbers go straight into the batch, stretch by stretch; a row with
 * anything out of the ordinary becomes cells of text and goes the way of a CSV row, which accepts or refuses it with the same rules
 * and words. Where a CSV row has its line, such a row has its number, counted from 1.
 */
import { type AccessRows, BATCH_ROWS, FARTHEST_AFTER, LATEST_PS, LONGEST_ACCESS } from './access.js';
import { finishReading, handOut, type Reading } from './access-rows.js';
import type { AccessBatch } from './batch.js';
import { type BlockColumn, numbersOf, operationsOf, textOf } from './column-values.js';

/** A stretch of rows, by the names of the file's columns. */
export interface ColumnBlock {
  readonly rows: number;
  readonly columns: ReadonlyMap<string, BlockColumn>;
}

const AFTER_A_FAULT = 64; // rows converted at once behind a row that went the slow way; doubled while all goes well

export async function* readColumns(
  reading: Reading,
  blocks: AsyncIterable<ColumnBlock>,
): AsyncGenerator<AccessBatch, undefined> {
  const { access, header, tolerance, facts } = reading;
  const { batch } = access;
  const stretch = new Stretch(access, header.names);
  let number = 0; // rows before this block
  for await (const { rows, columns } of blocks) {
    let most = BATCH_ROWS;
    for (let row = 0; row < rows; ) {
      if (batch.count === BATCH_ROWS) {
        handOut(reading);
        yield batch;
        batch.count = 0;
      }
      const wanted = Math.min(rows - row, BATCH_ROWS - batch.count, most);
      const taken = header.values.length > 0 ? 0 : stretch.take(columns, row, wanted, number + row + 1);
      row += taken;
      most = Math.min(BATCH_ROWS, 2 * most);
      if (taken === wanted) continue;
      most = AFTER_A_FAULT;
      try {
        // negative: there is no column of a line to point at
        access.add(
          header.names.map((name) => textOf(columns.get(name), row)),
          -(number + row + 1),
        );
      } catch (error) {
        tolerance.skip(error);
      }
      row++;
    }
    number += rows;
    facts.skippedRows = tolerance.skipped;
  }
  yield* finishReading(reading);
}

/** Moves a stretch of rows from columns to the batch, as far as each of them is ordinary. */
class Stretch {
  private readonly time = new Float64Array(BATCH_ROWS); // in units of its column
  private readonly rare: Float64Array[]; // die, engine, tile, flops, after
  private readonly operations = new Int8Array(BATCH_ROWS);

  constructor(
    private readonly access: AccessRows,
    private readonly names: readonly string[],
  ) {
    this.rare = Array.from({ length: 5 }, () => new Float64Array(BATCH_ROWS));
  }

  /** Takes up to `wanted` rows from `row` on; returns how many, the next of which must go the slow way. `number`: of the first. */
  take(columns: ReadonlyMap<string, BlockColumn>, row: number, wanted: number, number: number): number {
    const { access, time, rare, operations } = this;
    const { batch, at, timeScale } = access;
    const { op, address, bytes, timePs, kernel } = batch;
    const start = batch.count;
    const of = (position: number): BlockColumn | undefined => columns.get(this.names[position] ?? '');
    // address and bytes are converted where they will stay
    if (!numbersOf(of(at.address), row, wanted, address, start)) return 0;
    if (!numbersOf(of(at.bytes), row, wanted, bytes, start)) return 0;
    if (at.time >= 0 && !numbersOf(of(at.time), row, wanted, time, 0)) return 0;
    const positions = [at.die, at.engine, at.tile, at.flops, at.after];
    const plain = positions.every((position) => position < 0);
    for (const [k, position] of positions.entries())
      if (position >= 0 && !numbersOf(of(position), row, wanted, rare[k], 0)) return 0;
    operationsOf(of(at.op), row, wanted, access.ops, operations);
    const names = at.kernel < 0 ? null : of(at.kernel);

    let last = access.lastTime;
    let first = 0; // range of addresses of one owner, as far as it was looked up
    let end = -1;
    let owner = -1;
    let lastName: unknown = null;
    let lastKernel = names === null ? access.kernelOf('') : -1;
    let i = 0;
    for (; i < wanted; i++) {
      const a = address[start + i];
      const b = bytes[start + i];
      // written so that NaN fails
      if (!(operations[i] >= 0 && a >= 0 && b >= 1 && b <= LONGEST_ACCESS)) break;
      if (Math.floor(a) !== a || Math.floor(b) !== b) break;
      if (a < first || a + b > end) {
        owner = access.ownerOf(a, a + b);
        if (owner === -2) break;
        first = access.firstOf(owner);
        end = access.endOf(owner);
      }
      const ps = at.time < 0 ? 0 : Math.round(time[i] * timeScale);
      if (!(ps >= last && ps <= LATEST_PS)) break;
      if (!plain && !this.takeRare(i, start + i, owner)) break;
      if (names !== null) {
        const name = textOf(names, row + i);
        if (name !== lastName) {
          lastKernel = access.kernelOf(name.trim());
          lastName = name;
        }
        if (lastKernel < 0) break;
      }
      op[start + i] = operations[i];
      kernel[start + i] = lastKernel;
      if (timePs !== null) timePs[start + i] = ps;
      last = ps;
    }
    batch.count = start + i;
    if (i > 0 && timePs !== null) access.setLastTime(last, number + i - 1);
    return i;
  }

  /** Puts the columns few traces have; false when one of them is out of the ordinary. */
  private takeRare(i: number, to: number, owner: number): boolean {
    const { access } = this;
    const { at, batch } = access;
    const [die, engine, tile, flops, after] = this.rare;
    const d = at.die < 0 ? -1 : orElse(die[i], -1);
    const e = at.engine < 0 ? -1 : orElse(engine[i], -1);
    const t = at.tile < 0 ? -1 : orElse(tile[i], -1);
    const f = at.flops < 0 ? 0 : orElse(flops[i], 0);
    const back = at.after < 0 ? 0 : orElse(after[i], 0);
    if (!(d >= -1 && d < access.dieCount() && Math.floor(d) === d)) return false;
    if (!(e >= -1 && e < access.enginesOf(d >= 0 ? d : owner) && Math.floor(e) === e)) return false;
    if (!(t >= -1 && t <= 0x7fffffff && Math.floor(t) === t)) return false;
    if (!(f >= 0 && f < Number.POSITIVE_INFINITY)) return false;
    if (!(back >= 0 && back <= FARTHEST_AFTER && Math.floor(back) === back)) return false;
    if (batch.die !== null) batch.die[to] = d;
    if (batch.engine !== null) batch.engine[to] = e;
    if (batch.tile !== null) batch.tile[to] = t;
    if (batch.flops !== null) batch.flops[to] = f;
    if (batch.after !== null) batch.after[to] = back;
    return true;
  }
}

/** A number, or `none` where the column has nothing. */
function orElse(value: number, none: number): number {
  return value === Number.NEGATIVE_INFINITY ? none : value;
}
