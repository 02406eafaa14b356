import type { Package } from '../config/package.js';
import { InputError } from '../errors.js';
import type { AddressMap } from '../model/address-map.js';
import { type AccessBatch, type AccessTrace, READ, WRITE } from '../trace/batch.js';
import { type KernelRecord, type RunOptions, STACK_CLASSES } from './recording.js';
import { RowStore } from './row-store.js';
import type { Timers } from './timers.js';
import { kernelRecord, type Runnable, type Work } from './work.js';

const AHEAD = 64; // rows an engine holds before the trace waits for it
const HISTORY = 4096; // rows back that `after` can see, and rows an engine may have outstanding
const STORES = HISTORY; // stores an engine keeps back for tiles not computed yet
const UNISSUED = 1 << 24; // added to what is outstanding while some is not issued yet
const FOR_ARRIVALS = STACK_CLASSES.indexOf('starved_arrivals');
const FOR_WINDOW = STACK_CLASSES.indexOf('starved_window');
const FOR_COMPUTE = STACK_CLASSES.indexOf('starved_compute');

/**
 * The rows of an access trace on engines. Rows are dealt in trace order to the engines' short queues; a row whose engine's queue
 * is full holds up the rows after it, so memory does not grow. Rows without flops and tiles issue in order. Where the trace has
 * them, an engine's rows form tiles, handled as those of kernels: loads first, then compute, then stores.
 */
export class TraceWork implements Work {
  address = 0;
  bytes = 0;
  op = READ;
  kernel = 0;
  readyPs = 0;
  waitedPs = 0;
  waitedFor = FOR_ARRIVALS;
  lastEventPs = 0;
  readonly kernels: KernelRecord[] = [];
  readonly computePs: Float64Array;

  private readonly iterator: AsyncIterator<AccessBatch>;
  private ended = false;
  private allDealt = false; // the trace has ended, and every row is with its engine
  private readonly store: RowStore; // rows read and not yet dealt
  private readonly rows: RowStore[]; // per engine: dealt and not yet issued
  private readonly stores: RowStore[]; // per engine: stores that wait for their tile
  private readonly firstEngine: number[]; // per die
  private readonly engineDie: Int32Array;
  private readonly dealt: Int32Array; // per die: engine that gets the next row without one
  private readonly rowCount: Float64Array; // per engine: rows begun
  private readonly rowLeft: Int32Array; // per engine, HISTORY: parts of a row not answered yet
  private readonly rowTile: Int32Array; // per engine, HISTORY: tile slot of the row
  private readonly partLeft: Float64Array; // per side
  private readonly sideReady: Float64Array; // per side
  private readonly sideSince: Float64Array;
  private readonly sideFor: Uint8Array;
  private readonly lastTime: Float64Array; // per engine: recorded time of the row issued last
  private readonly lastIssue: Float64Array; // per engine
  private readonly outstanding: Int32Array; // per engine
  private readonly depends: Uint8Array; // per side: the next row waits for an earlier one
  private readonly storeTile: Float64Array; // per engine, HISTORY: the tile a kept store waits for, by its slot
  private readonly keptDepends: Int32Array; // per engine: kept stores that wait for an earlier row
  private readonly keptFrom: Float64Array; // per engine: the earliest row they wait for
  private rowsRead = 0;
  private readonly alarmSet: Uint8Array; // per engine: an arrival alarm is under way
  private remembers = false; // rows depend on earlier rows or form tiles, so their return is tracked
  // tiles, per engine; tile slots are taken in turn
  private tiled = false;
  private readonly reserve: number; // rows one clock edge can deal at most
  private readonly slots: number;
  private readonly depth: Int32Array; // per engine: tiles that may be loading or waiting at once
  private readonly tileOpen: Uint8Array; // per engine: a tile is being loaded
  private readonly tileNumber: Float64Array; // per engine: the trace's number of that tile
  private readonly loading: Float64Array; // per engine: tile being loaded, counted from 0
  private readonly computing: Float64Array;
  private readonly tileLoads: Int32Array; // per engine and slot
  private readonly tileFlops: Float64Array;
  private readonly tileKernel: Int32Array;
  private readonly engineComputes: Uint8Array; // 1 while computing
  private readonly computeFrom: Float64Array;
  private readonly flopsPerPs: Float64Array; // per die, of one engine
  private engine = 0; // of the last peek
  private fromStores = false;

  constructor(
    pkg: Package,
    private readonly trace: AccessTrace,
    private readonly map: AddressMap,
    private readonly replay: RunOptions['replay'],
    private readonly timers: Timers,
    private readonly runnable: Runnable,
  ) {
    const { dies } = pkg;
    const engines = dies.reduce((sum, die) => sum + die.engines, 0);
    this.iterator = trace.batches()[Symbol.asyncIterator]();
    this.firstEngine = [];
    this.engineDie = new Int32Array(engines);
    this.depth = new Int32Array(engines);
    const widest = Math.max(...dies.map((die) => Math.max(die.buffering, die.window)));
    this.slots = 2 ** Math.ceil(Math.log2(widest + 1));
    let engine = 0;
    dies.forEach((die, d) => {
      this.firstEngine.push(engine);
      for (let i = 0; i < die.engines; i++) this.engineDie[engine++] = d;
    });
    this.reserve = engines * (AHEAD + Math.max(...dies.map((die) => die.issuePerClock)));
    this.store = new RowStore(this.reserve + 2 * 65536);
    this.rows = Array.from({ length: engines }, () => new RowStore(AHEAD));
    this.stores = Array.from({ length: engines }, () => new RowStore(STORES));
    this.dealt = new Int32Array(dies.length);
    this.rowCount = new Float64Array(engines);
    this.rowLeft = new Int32Array(engines * HISTORY);
    this.rowTile = new Int32Array(engines * HISTORY);
    this.partLeft = new Float64Array(engines * 2);
    this.sideReady = new Float64Array(engines * 2);
    this.sideSince = new Float64Array(engines * 2);
    this.sideFor = new Uint8Array(engines * 2).fill(FOR_ARRIVALS);
    this.lastTime = new Float64Array(engines).fill(-1);
    this.lastIssue = new Float64Array(engines);
    this.outstanding = new Int32Array(engines);
    this.depends = new Uint8Array(engines * 2);
    this.storeTile = new Float64Array(engines * HISTORY);
    this.keptDepends = new Int32Array(engines);
    this.keptFrom = new Float64Array(engines).fill(Number.POSITIVE_INFINITY);
    this.alarmSet = new Uint8Array(engines);
    this.tileOpen = new Uint8Array(engines);
    this.tileNumber = new Float64Array(engines);
    this.loading = new Float64Array(engines);
    this.computing = new Float64Array(engines);
    this.tileLoads = new Int32Array(engines * this.slots);
    this.tileFlops = new Float64Array(engines * this.slots);
    this.tileKernel = new Int32Array(engines * this.slots);
    this.engineComputes = new Uint8Array(engines);
    this.computeFrom = new Float64Array(engines);
    this.computePs = new Float64Array(engines);
    // rows carry no number format: their flops run at the die's highest peak
    this.flopsPerPs = Float64Array.from(
      dies,
      (die) => Math.max(0, ...Object.values(die.peakFlops)) / die.engines / 1e12,
    );
    for (let e = 0; e < engines; e++) this.depth[e] = dies[this.engineDie[e]].buffering;
  }

  enough(): boolean {
    return this.ended || this.store.count > this.reserve;
  }

  async refill(): Promise<void> {
    while (!this.enough()) {
      const { done, value: batch } = await this.iterator.next();
      if (done) {
        this.ended = true;
        for (let e = 0; e < this.rows.length; e++) this.runnable.wake(e);
        break;
      }
      this.accept(batch);
    }
    this.deal();
  }

  finished(): boolean {
    if (!this.ended || this.store.count > 0) return false;
    for (let e = 0; e < this.rows.length; e++) {
      if (this.rows[e].count + this.stores[e].count + this.outstanding[e] + this.engineComputes[e] > 0) return false;
      if (this.tileOpen[e] === 1 || this.computing[e] < this.loading[e]) return false;
    }
    return true;
  }

  peek(engine: number, now: number): boolean {
    this.engine = engine;
    if (this.tiled && this.findStore(engine, now)) return true;
    const rows = this.rows[engine];
    for (;;) {
      if (rows.count === 0) {
        if (this.ended && this.store.count === 0 && this.tileOpen[engine] === 1) this.closeTile(engine, now);
        return false;
      }
      const at = rows.first;
      if (this.partLeft[engine * 2] === 0) {
        // the open tile has its last row once another's is next, however long that one has to wait
        if (this.tiled && this.tileOpen[engine] === 1 && !this.inOpenTile(engine, at)) this.closeTile(engine, now);
        if (
          !this.arrived(engine, now) ||
          (this.remembers && !this.depended(engine, at, now)) ||
          (this.tiled && !this.inTile(engine, at))
        )
          return false;
        if (this.tiled && rows.op[at] === WRITE) {
          this.keepStore(engine, at, now);
          continue;
        }
      }
      this.offer(engine, rows, at, engine * 2);
      this.fromStores = false;
      return true;
    }
  }

  take(bytes: number, now: number): number {
    const { engine, fromStores } = this;
    const side = engine * 2 + (fromStores ? 1 : 0);
    const from = fromStores ? this.stores[engine] : this.rows[engine];
    const at = from.first;
    if (this.kernels[this.kernel].startPs < 0) this.kernels[this.kernel].startPs = now;
    const slot = !this.remembers ? 0 : fromStores ? from.tag[at] : this.beginRow(engine, at, now);
    const tag = engine * HISTORY + slot;
    const first = from.bytes[at] === this.partLeft[side];
    if (first && !fromStores) {
      this.lastTime[engine] = from.time[at];
      this.lastIssue[engine] = now;
    }
    this.outstanding[engine]++;
    if (this.remembers) this.rowLeft[tag]++;
    if (this.tiled && !fromStores) this.tileLoads[engine * this.slots + this.rowTile[tag]]++;
    this.sideReady[side] = now;
    this.sideSince[side] = now;
    this.partLeft[side] -= bytes;
    if (this.partLeft[side] === 0) {
      if (this.remembers) this.rowLeft[tag] -= UNISSUED;
      from.drop();
      if (!fromStores) {
        this.rowCount[engine]++;
        this.deal();
      } else this.runnable.wake(engine);
    }
    return tag;
  }

  returned(tag: number, op: number, now: number): void {
    const engine = Math.floor(tag / HISTORY);
    this.outstanding[engine]--;
    if (this.remembers) this.rowLeft[tag]--;
    if (this.tiled && op === READ) {
      const slot = engine * this.slots + this.rowTile[tag];
      if (--this.tileLoads[slot] === 0) this.compute(engine, now);
    }
    this.runnable.wake(engine);
  }

  alarm(context: number, now: number): void {
    // even contexts are arrivals, odd ones ends of compute
    const engine = context >> 1;
    if (context & 1) {
      const spent = now - this.computeFrom[engine];
      const slot = engine * this.slots + (this.computing[engine] % this.slots);
      const record = this.kernels[this.tileKernel[slot]];
      record.flops += this.tileFlops[slot];
      this.computePs[engine] += spent;
      record.computePs += spent;
      record.endPs = Math.max(record.endPs, now);
      this.lastEventPs = now;
      this.engineComputes[engine] = 0;
      this.tileComputed(engine, now, FOR_COMPUTE);
      this.compute(engine, now);
    } else this.alarmSet[engine] = 0;
    this.runnable.wake(engine);
  }

  private accept(batch: AccessBatch): void {
    if (this.rowCount.every((n) => n === 0) && this.store.count === 0) {
      this.tiled = batch.flops !== null || batch.tile !== null;
      this.remembers = this.tiled || batch.after !== null;
      // without tile numbers a row is a tile, and only the window limits how many load at once
      if (batch.tile === null) this.depth.fill(this.slots - 1);
    }
    for (let i = 0; i < batch.count; i++) {
      const at = this.store.add(batch.op[i], batch.address[i], batch.bytes[i], batch.kernel[i]);
      this.store.time[at] = batch.timePs === null ? 0 : batch.timePs[i];
      this.store.die[at] = batch.die === null || batch.die[i] < 0 ? this.map.domainOf(batch.address[i]) : batch.die[i];
      this.store.engine[at] = batch.engine === null ? -1 : batch.engine[i];
      this.store.tile[at] = batch.tile === null ? -1 : batch.tile[i];
      this.store.flops[at] = batch.flops === null ? 0 : batch.flops[i];
      this.store.after[at] = batch.after === null ? 0 : batch.after[i];
      this.store.row[at] = ++this.rowsRead;
    }
    while (this.kernels.length < this.trace.kernelNames.length) {
      this.kernels.push(kernelRecord(this.trace.kernelNames[this.kernels.length]));
    }
  }

  /** Moves rows to their engines until a row finds no room. A row without an engine goes to the next of its die that has room. */
  private deal(): void {
    const { store } = this;
    while (store.count > 0) {
      const at = store.first;
      const die = store.die[at];
      const first = this.firstEngine[die];
      const count = (die + 1 < this.firstEngine.length ? this.firstEngine[die + 1] : this.rows.length) - first;
      let engine = first + store.engine[at];
      if (store.engine[at] < 0) {
        let tries = count;
        let local = this.dealt[die];
        while (this.rows[first + local].count === AHEAD && --tries > 0) local = local + 1 === count ? 0 : local + 1;
        engine = first + local;
        this.dealt[die] = local;
      }
      if (this.rows[engine].count === AHEAD) return;
      if (store.engine[at] < 0) this.dealt[die] = (this.dealt[die] + 1) % count;
      if (this.rows[engine].count === 0) this.runnable.wake(engine);
      this.rows[engine].copyFrom(store, at);
      store.drop();
    }
    if (!this.ended || this.allDealt) return;
    // the last row of each engine is known from here on, and with it the end of its last tile
    this.allDealt = true;
    for (let e = 0; e < this.rows.length; e++) if (this.tileOpen[e] === 1) this.runnable.wake(e);
  }

  /** Whether the head row's time has come under the replay mode; sets an alarm when not. */
  private arrived(engine: number, now: number): boolean {
    if (this.replay === 'closed') return true;
    const rows = this.rows[engine];
    const time = rows.time[rows.first];
    const due =
      this.replay === 'open'
        ? time
        : this.lastTime[engine] < 0
          ? time
          : this.lastIssue[engine] + Math.max(0, time - this.lastTime[engine]);
    if (due > this.sideReady[engine * 2]) this.hold(engine * 2, due, FOR_ARRIVALS);
    else if (this.replay === 'open') this.sideReady[engine * 2] = due;
    if (due <= now) return true;
    if (this.alarmSet[engine] === 0) {
      this.alarmSet[engine] = 1;
      this.timers.set(this.engineDie[engine], due, engine * 2);
    }
    return false;
  }

  /** Whether the history has room for the head row and the row it depends on has returned; a store asks that when it is sent. */
  private depended(engine: number, at: number, now: number): boolean {
    const rows = this.rows[engine];
    const row = this.rowCount[engine];
    const before = engine * HISTORY + (row % HISTORY);
    if (this.rowLeft[before] !== 0) {
      if (this.awaitsOpenTile(engine, before)) this.refuse(rows.row[at], 'a tile of more than 4,096 rows that stores');
      return false;
    }
    if (row - this.keptFrom[engine] >= HISTORY) return false; // the slot of a row that a store still asks for
    const back = rows.after[at];
    if (back === 0 || back > row || (this.tiled && rows.op[at] === WRITE)) return true;
    const other = engine * HISTORY + ((row - back) % HISTORY);
    if (this.rowLeft[other] !== 0 && this.inOpenTile(engine, at) && this.awaitsOpenTile(engine, other))
      this.refuse(
        rows.row[at],
        'a load that depends on a store of its own tile, which is sent when the tile has computed',
      );
    return this.returnedFor(engine * 2, other, now);
  }

  /** Whether the row in history slot `tag` has returned; notes how long a `side` that asked before had to wait. */
  private returnedFor(side: number, tag: number, now: number): boolean {
    const returned = this.rowLeft[tag] === 0;
    if (returned && this.depends[side] === 1) this.hold(side, now, FOR_WINDOW);
    this.depends[side] = returned ? 0 : 1;
    return returned;
  }

  private inOpenTile(engine: number, at: number): boolean {
    const tile = this.rows[engine].tile[at];
    return this.tileOpen[engine] === 1 && tile >= 0 && tile === this.tileNumber[engine];
  }

  /** Whether the row in history slot `tag` is a store kept for the tile that is being loaded. */
  private awaitsOpenTile(engine: number, tag: number): boolean {
    if (!this.tiled || this.tileOpen[engine] === 0) return false;
    return this.rowLeft[tag] === UNISSUED && this.storeTile[tag] === this.loading[engine];
  }

  private refuse(row: number, found: string): never {
    throw new InputError({
      where: { file: this.trace.file, path: `row ${row}` },
      found,
      expected: 'rows that can be played in order, tile by tile: loads, compute, stores',
      hint: 'rows are counted from 1, without header and comments; give the row another tile number',
    });
  }

  /** Opens the head row's tile if need be; false when it must wait for a free buffer. */
  private inTile(engine: number, at: number): boolean {
    const rows = this.rows[engine];
    if (this.tileOpen[engine] === 0) {
      if (this.loading[engine] - this.computing[engine] >= this.depth[engine]) return false;
      this.tileOpen[engine] = 1;
      this.tileNumber[engine] = rows.tile[at];
      const slot = engine * this.slots + (this.loading[engine] % this.slots);
      this.tileLoads[slot] = UNISSUED;
      this.tileFlops[slot] = 0;
    }
    return true;
  }

  private closeTile(engine: number, now: number): void {
    const slot = engine * this.slots + (this.loading[engine] % this.slots);
    this.tileOpen[engine] = 0;
    this.loading[engine]++;
    this.tileLoads[slot] -= UNISSUED;
    if (this.tileLoads[slot] === 0) this.compute(engine, now);
  }

  /** Counts the head row in on its first part; returns its slot in the history. */
  private beginRow(engine: number, at: number, now: number): number {
    const rows = this.rows[engine];
    const slot = this.rowCount[engine] % HISTORY;
    const tag = engine * HISTORY + slot;
    if (this.rowLeft[tag] < UNISSUED) {
      this.rowLeft[tag] = UNISSUED;
      if (this.tiled) {
        const tile = this.loading[engine] % this.slots;
        this.rowTile[tag] = tile;
        this.tileFlops[engine * this.slots + tile] += rows.flops[at];
        this.tileKernel[engine * this.slots + tile] = rows.kernel[at];
        const record = this.kernels[rows.kernel[at]];
        if (record.startPs < 0) record.startPs = now;
      }
    }
    return slot;
  }

  private keepStore(engine: number, at: number, now: number): void {
    const rows = this.rows[engine];
    const slot = this.beginRow(engine, at, now);
    const stores = this.stores[engine];
    const kept = stores.copyFrom(rows, at);
    const row = this.rowCount[engine];
    stores.tag[kept] = slot;
    stores.time[kept] = this.loading[engine]; // from here on: the tile it belongs to
    this.storeTile[engine * HISTORY + slot] = this.loading[engine];
    // from here on: history slot + 1 of the row it waits for
    const back = stores.after[kept] > row ? 0 : stores.after[kept];
    const other = (row - back) % HISTORY;
    stores.after[kept] = back === 0 || this.rowLeft[engine * HISTORY + other] === 0 ? 0 : other + 1;
    if (stores.after[kept] !== 0) {
      this.keptDepends[engine]++;
      this.keptFrom[engine] = Math.min(this.keptFrom[engine], row - back);
    }
    this.lastTime[engine] = rows.time[at];
    this.lastIssue[engine] = now;
    rows.drop();
    this.rowCount[engine]++;
    this.deal();
  }

  private findStore(engine: number, now: number): boolean {
    const stores = this.stores[engine];
    const at = stores.first;
    if (stores.count === 0 || stores.time[at] >= this.computing[engine]) return false;
    if (stores.after[at] !== 0) {
      if (!this.returnedFor(engine * 2 + 1, engine * HISTORY + stores.after[at] - 1, now)) return false;
      stores.after[at] = 0;
      if (--this.keptDepends[engine] === 0) this.keptFrom[engine] = Number.POSITIVE_INFINITY;
    }
    this.offer(engine, stores, at, engine * 2 + 1);
    this.fromStores = true;
    return true;
  }

  private offer(engine: number, from: RowStore, at: number, side: number): void {
    if (this.partLeft[side] === 0) this.partLeft[side] = from.bytes[at];
    this.engine = engine;
    this.address = from.address[at] + from.bytes[at] - this.partLeft[side];
    this.bytes = this.partLeft[side];
    this.op = from.op[at];
    this.kernel = from.kernel[at];
    this.readyPs = this.sideReady[side];
    this.waitedPs = Math.max(0, this.sideReady[side] - this.sideSince[side]);
    this.waitedFor = this.sideFor[side];
  }

  private compute(engine: number, now: number): void {
    while (this.engineComputes[engine] === 0 && this.computing[engine] < this.loading[engine]) {
      const slot = engine * this.slots + (this.computing[engine] % this.slots);
      if (this.tileLoads[slot] !== 0) return;
      const flops = this.tileFlops[slot];
      const ps = flops === 0 ? 0 : Math.ceil(flops / this.flopsPerPs[this.engineDie[engine]]);
      if (ps > 0) {
        this.engineComputes[engine] = 1;
        this.computeFrom[engine] = now;
        this.timers.set(this.engineDie[engine], now + ps, engine * 2 + 1);
        return;
      }
      this.tileComputed(engine, now, FOR_WINDOW);
    }
  }

  private tileComputed(engine: number, now: number, why: number): void {
    if (this.loading[engine] - this.computing[engine] >= this.depth[engine]) this.hold(engine * 2, now, why);
    this.hold(engine * 2 + 1, now, why);
    this.computing[engine]++;
    this.runnable.wake(engine);
  }

  private hold(side: number, now: number, why: number): void {
    if (now > this.sideReady[side]) {
      this.sideReady[side] = now;
      this.sideFor[side] = why;
    }
  }
}
