/** Access-trace rows to batches of columns: checks every cell, fills one batch again and again, counts what it skips. */
import { InputError } from '../errors.js';
import { type AccessBatch, type DieGeometry, READ, WRITE } from './batch.js';
import { Cells } from './cells.js';
import type { Header } from './header.js';

/** Rows of a batch. */
export const BATCH_ROWS = 4096;
/** Longest access, bytes. */
export const LONGEST_ACCESS = 2 ** 31;
/** How many rows back a dependency may reach. */
export const FARTHEST_AFTER = 1024;
/** Names of kernels are held for the whole run, so there is an end to them. */
export const MOST_KERNELS = 65536;

/** Words of the op column when the trace has our own. */
export const OPS: ReadonlyMap<string, number> = new Map([
  ['r', READ],
  ['read', READ],
  ['w', WRITE],
  ['write', WRITE],
]);
export const LATEST_PS = 2 ** 53 - 1;

/** Picoseconds of one unit, by column. */
const TIME_SCALES = { time_ps: 1, time_ns: 1e3, time_us: 1e6, time_ms: 1e9, time_s: 1e12 };

/** What the cells are checked against; empty and infinite where the package is not known. */
export interface AccessLimits {
  readonly dieNames: readonly string[];
  readonly geometry: readonly DieGeometry[];
  readonly capacity: number; // bytes; an access must end at or before it
  readonly cyclePs: number; // period of the clock that column `cycle` counts, ps; 0: not known
}

/** Parses rows into one batch. `add` takes a row or throws InputError and leaves the batch as it was. */
export class AccessRows {
  readonly batch: AccessBatch;
  readonly kernelNames: string[] = [];

  private readonly cells: Cells;
  private readonly kernelIndex = new Map<string, number>();
  readonly at; // position of each column, -1 where the trace has none
  readonly timeScale: number; // ps of one unit of the time column
  readonly ops: ReadonlyMap<string, number>;
  lastTime = 0; // ps, of the row before
  private lastTimeLine = 0;

  constructor(
    file: string,
    header: Header,
    private readonly limits: AccessLimits,
  ) {
    this.cells = new Cells(file, header);
    const position = (name: string) => this.cells.position(name);
    this.ops = header.shape.ops ?? OPS;
    const scales: Readonly<Record<string, number>> = { ...TIME_SCALES, cycle: limits.cyclePs };
    const timeName = Object.keys(scales).find((name) => position(name) >= 0) ?? '';
    if (timeName === 'cycle' && !(limits.cyclePs > 0)) {
      throw new InputError({
        where: { file, line: header.line, path: 'cycle' },
        found: "a column 'cycle', and no clock it counts",
        expected: 'the period of that clock',
        hint: 'give the clock with --clock, or convert the column to time_ps, time_ns or time_us',
      });
    }
    this.timeScale = scales[timeName] ?? 1;
    this.at = {
      op: position('op'),
      address: position('address'),
      bytes: position('bytes'),
      time: timeName === '' ? -1 : position(timeName),
      die: position('die'),
      engine: position('engine'),
      kernel: position('kernel'),
      tile: position('tile'),
      flops: position('flops'),
      after: position('after'),
    };
    const ints = (there: number) => (there < 0 ? null : new Int32Array(BATCH_ROWS));
    const doubles = (there: number) => (there < 0 ? null : new Float64Array(BATCH_ROWS));
    this.batch = {
      count: 0,
      op: new Uint8Array(BATCH_ROWS),
      address: new Float64Array(BATCH_ROWS),
      bytes: new Float64Array(BATCH_ROWS),
      timePs: doubles(this.at.time),
      die: ints(this.at.die),
      engine: ints(this.at.engine),
      kernel: new Int32Array(BATCH_ROWS),
      tile: ints(this.at.tile),
      flops: doubles(this.at.flops),
      after: ints(this.at.after),
    };
  }

  add(row: readonly string[], line: number): void {
    const { cells, at, limits } = this;
    cells.enter(row, line);
    const op = this.ops.get(cells.text(at.op).toLowerCase());
    if (op === undefined) {
      const words = this.ops === OPS ? 'R, W, read or write' : [...this.ops.keys()].join(', ');
      throw cells.fault(at.op, words, 'one access a row');
    }
    const address = cells.address(at.address);
    const bytes = cells.whole(at.bytes, 1, LONGEST_ACCESS, 'the bytes of one access');
    const owner = this.owner(address, bytes);
    const timePs = at.time < 0 ? 0 : this.time();
    // optional cells may be empty: a column that is there says nothing about every row
    const die = this.empty(at.die) ? -1 : cells.die(at.die, limits.dieNames, this.dieCount());
    const engine = this.empty(at.engine) ? -1 : this.engine(die >= 0 ? die : owner);
    const tile = this.empty(at.tile) ? -1 : cells.whole(at.tile, 0, 2 ** 31 - 1, 'a tile number');
    const flops = this.empty(at.flops) ? 0 : cells.decimal(at.flops, 'floating-point operations');
    const after = this.empty(at.after) ? 0 : cells.whole(at.after, 0, FARTHEST_AFTER, 'rows back on this engine');
    const kernel = this.kernel();

    this.put(op, address, bytes, timePs, die, engine, kernel, tile, flops, after, Math.abs(line));
  }

  /** Adds a row that has been checked. */
  put(
    op: number,
    address: number,
    bytes: number,
    timePs: number,
    die: number,
    engine: number,
    kernel: number,
    tile: number,
    flops: number,
    after: number,
    line: number,
  ): void {
    const { batch } = this;
    const i = batch.count++;
    batch.op[i] = op;
    batch.address[i] = address;
    batch.bytes[i] = bytes;
    batch.kernel[i] = kernel;
    if (batch.timePs !== null) {
      batch.timePs[i] = timePs;
      this.setLastTime(timePs, line);
    }
    if (batch.die !== null) batch.die[i] = die;
    if (batch.engine !== null) batch.engine[i] = engine;
    if (batch.tile !== null) batch.tile[i] = tile;
    if (batch.flops !== null) batch.flops[i] = flops;
    if (batch.after !== null) batch.after[i] = after;
  }

  /** Notes the time of the row last added, ps, and its line, for the next one must not be earlier. */
  setLastTime(timePs: number, line: number): void {
    this.lastTime = timePs;
    this.lastTimeLine = line;
  }

  private empty(position: number): boolean {
    return position < 0 || this.cells.text(position) === '';
  }

  dieCount(): number {
    const { geometry, dieNames } = this.limits;
    return geometry.length || dieNames.length || 1024;
  }

  /** The die whose memory an access falls in; -1 when that is not known, -2 when it is beyond memory or in two dies'. */
  ownerOf(address: number, end: number): number {
    const { capacity, geometry } = this.limits;
    if (end > capacity) return -2;
    for (let die = 0; die < geometry.length; die++) {
      const { base, capacity: size } = geometry[die];
      if (address >= base && address < base + size) return end <= base + size ? die : -2;
    }
    return -1;
  }

  /** First address of the memory whose owner `ownerOf` gave. */
  firstOf(owner: number): number {
    return owner >= 0 ? this.limits.geometry[owner].base : 0;
  }

  /** End of it, never beyond memory. */
  endOf(owner: number): number {
    const { capacity, geometry } = this.limits;
    if (owner >= 0) return Math.min(capacity, geometry[owner].base + geometry[owner].capacity);
    return geometry.length === 0 ? capacity : -1; // between memories: looked up each time
  }

  private owner(address: number, bytes: number): number {
    const { capacity, geometry } = this.limits;
    const end = address + bytes;
    const owner = this.ownerOf(address, end);
    if (owner !== -2) return owner;
    if (end > capacity) {
      throw this.cells.fault(
        this.at.address,
        `an access that ends at or below the capacity of the package, ${capacity} bytes`,
        'use a package with more memory, or map the addresses of the trace into it',
        `'${this.cells.text(this.at.address)}', ${end - capacity} bytes beyond the end of memory`,
      );
    }
    const within = geometry.find(({ base, capacity: size }) => address >= base && address < base + size);
    throw this.cells.fault(
      this.at.address,
      'an access inside the memory of one die',
      `split it at address ${(within?.base ?? 0) + (within?.capacity ?? 0)}, where the memory of the next die begins`,
    );
  }

  /** Engines of a die, as far as they are known. */
  enginesOf(die: number): number {
    return this.limits.geometry[die]?.engines ?? 2 ** 20;
  }

  private engine(die: number): number {
    return this.cells.whole(this.at.engine, 0, this.enginesOf(die) - 1, 'an engine of the die');
  }

  private time(): number {
    const { cells, at } = this;
    const timePs = Math.round(cells.decimal(at.time, 'a time') * this.timeScale);
    if (timePs > LATEST_PS)
      throw cells.fault(at.time, 'a time below 9000 s', 'times count from the start of the trace');
    if (timePs < this.lastTime) {
      throw cells.fault(
        at.time,
        `a time no earlier than that of line ${this.lastTimeLine}, ${this.lastTime} ps`,
        'sort the trace by time',
        `'${cells.text(at.time)}': time goes backwards by ${this.lastTime - timePs} ps`,
      );
    }
    return timePs;
  }

  /** Number of the row's kernel; rows of a trace without that column, or with an empty cell, are of one nameless kernel. */
  private kernel(): number {
    const kernel = this.kernelOf(this.cells.text(this.at.kernel));
    if (kernel >= 0) return kernel;
    throw this.cells.fault(
      this.at.kernel,
      `at most ${MOST_KERNELS} different kernels in a trace`,
      "number launches in column 'tile', not in the kernel's name",
    );
  }

  /** Number of a kernel by its cell; -1 when there are too many. */
  kernelOf(cell: string): number {
    const name = cell || (this.at.kernel < 0 ? 'trace' : '(unnamed)');
    const known = this.kernelIndex.get(name);
    if (known !== undefined) return known;
    if (this.kernelNames.length === MOST_KERNELS) return -1;
    this.kernelIndex.set(name, this.kernelNames.length);
    return this.kernelNames.push(name) - 1;
  }
}
