import type { Package } from '../config/package.js';
import { InputError } from '../errors.js';
import { type KernelTrace, type PlacedKernel, READ, type TileWalk, WRITE } from '../trace/batch.js';
import { type KernelRecord, STACK_CLASSES } from './recording.js';
import type { Timers } from './timers.js';
import { kernelRecord, type Runnable, type Work } from './work.js';

const CHUNK = 64; // accesses fetched from a walker at a time
const UNISSUED = 1 << 24; // added to a tile's outstanding loads while some are not issued yet
const FOR_COMPUTE = STACK_CLASSES.indexOf('starved_compute');
const FOR_WINDOW = STACK_CLASSES.indexOf('starved_window');
const FOR_BARRIER = STACK_CLASSES.indexOf('starved_drain');

/**
 * Kernels as tiles on engines. A context is one stream on one engine; its tiles are loaded in order, at most `buffering` of them
 * at once, computed one after the other when their loads are back and the engine is free, and stored after that. Kernels of a
 * stream follow each other with a barrier; streams share the engines.
 */
export class KernelWork implements Work {
  address = 0;
  bytes = 0;
  op = READ;
  kernel = 0;
  readyPs = 0;
  waitedPs = 0;
  waitedFor = FOR_WINDOW;
  lastEventPs = 0;
  readonly kernels: KernelRecord[];
  readonly computePs: Float64Array;

  private readonly streams: number;
  private readonly queue: number[][]; // per stream: kernel indices still to run, first one running
  private readonly launch: number[]; // per stream: launches of the running kernel done
  private readonly busyContexts: Int32Array; // per stream: contexts not finished with the running launch
  private readonly engineDie: Int32Array;
  private readonly firstEngine: Int32Array; // per die
  private readonly buffering: Int32Array; // per engine
  private readonly slots: number; // tile slots of a context
  private readonly tiles: Int32Array; // per context: tiles of this launch
  private readonly loading: Int32Array; // per context: tile whose loads are being issued
  private readonly computing: Int32Array; // per context: tile to compute next
  private readonly storing: Int32Array; // per context: tile whose stores are being issued
  private readonly walking: Uint8Array; // per side: whether its walker is inside a tile
  private readonly outstanding: Int32Array; // per side: accesses' parts issued and not answered
  private readonly partLeft: Int32Array; // per side: bytes left of the access at the head
  private readonly tileLoads: Int32Array; // per tile slot: loads outstanding
  private readonly chunkAddress: Float64Array; // CHUNK per side
  private readonly chunkBytes: Int32Array;
  private readonly chunkAt: Int32Array; // per side
  private readonly chunkEnd: Int32Array;
  private readonly walks: TileWalk[]; // per side
  private readonly sideReady: Float64Array; // per side: since when its head could be issued
  private readonly sideSince: Float64Array; // per side: when it began to wait for that
  private readonly sideFor: Uint8Array;
  private readonly engineComputes: Int32Array; // per engine: the context computing, -1 when free
  private readonly computeFrom: Float64Array; // per engine
  private readonly turn: Int32Array; // per engine: stream to serve next
  private readonly flopsPerPs: Map<string, Float64Array>; // per format: FLOP per ps of one engine, by die
  private context = 0; // of the last peek
  private side = 0;

  constructor(
    private readonly pkg: Package,
    private readonly trace: KernelTrace,
    private readonly placed: readonly PlacedKernel[],
    makeWalk: () => TileWalk,
    private readonly timers: Timers,
    private readonly runnable: Runnable,
  ) {
    const { dies } = pkg;
    const engines = dies.reduce((sum, die) => sum + die.engines, 0);
    this.streams = trace.streams.length;
    const contexts = engines * this.streams;
    this.slots = Math.max(...dies.map((die) => die.buffering));
    this.kernels = trace.kernels.map((kernel) => kernelRecord(kernel.name));
    this.computePs = new Float64Array(engines);
    this.engineDie = new Int32Array(engines);
    this.firstEngine = new Int32Array(dies.length);
    this.buffering = new Int32Array(engines);
    let engine = 0;
    dies.forEach((die, d) => {
      this.firstEngine[d] = engine;
      for (let i = 0; i < die.engines; i++) {
        this.engineDie[engine] = d;
        this.buffering[engine++] = die.buffering;
      }
    });
    this.tiles = new Int32Array(contexts);
    this.loading = new Int32Array(contexts);
    this.computing = new Int32Array(contexts);
    this.storing = new Int32Array(contexts);
    this.walking = new Uint8Array(contexts * 2);
    this.outstanding = new Int32Array(contexts * 2);
    this.partLeft = new Int32Array(contexts * 2);
    this.tileLoads = new Int32Array(contexts * this.slots);
    this.chunkAddress = new Float64Array(contexts * 2 * CHUNK);
    this.chunkBytes = new Int32Array(contexts * 2 * CHUNK);
    this.chunkAt = new Int32Array(contexts * 2);
    this.chunkEnd = new Int32Array(contexts * 2);
    this.walks = Array.from({ length: contexts * 2 }, makeWalk);
    this.sideReady = new Float64Array(contexts * 2);
    this.sideSince = new Float64Array(contexts * 2);
    this.sideFor = new Uint8Array(contexts * 2);
    this.engineComputes = new Int32Array(engines).fill(-1);
    this.computeFrom = new Float64Array(engines);
    this.turn = new Int32Array(engines);
    this.flopsPerPs = formats(pkg, trace);
    this.queue = trace.streams.map((_, s) =>
      trace.kernels.flatMap((kernel, index) => (kernel.stream === s ? [index] : [])),
    );
    this.launch = trace.streams.map(() => 0);
    this.busyContexts = new Int32Array(this.streams);
    for (let s = 0; s < this.streams; s++) this.startLaunch(s, 0);
  }

  peek(engine: number, now: number): boolean {
    for (let i = 0; i < this.streams; i++) {
      const stream = (this.turn[engine] + i) % this.streams;
      const context = engine * this.streams + stream;
      if (this.tiles[context] === 0) continue;
      // stores first: they free the tile's buffer
      if (this.findStore(context, now) || this.findLoad(context, engine, now)) {
        this.turn[engine] = stream + 1;
        this.offer(context, stream);
        return true;
      }
    }
    return false;
  }

  take(bytes: number, now: number): number {
    const { context, side } = this;
    const at = context * 2 + side;
    const record = this.kernels[this.kernel];
    if (record.startPs < 0) record.startPs = now;
    this.outstanding[at]++;
    this.sideReady[at] = now;
    this.sideSince[at] = now;
    this.partLeft[at] -= bytes;
    if (this.partLeft[at] === 0) this.chunkAt[at]++;
    if (side === WRITE) return -1 - context;
    const slot = context * this.slots + (this.loading[context] % this.slots);
    this.tileLoads[slot]++;
    return slot;
  }

  returned(tag: number, op: number, now: number): void {
    const context = op === WRITE ? -1 - tag : Math.floor(tag / this.slots);
    const engine = Math.floor(context / this.streams);
    this.outstanding[context * 2 + op]--;
    if (op === READ) {
      if (this.walks[context * 2].chained && this.outstanding[context * 2] === 0)
        this.hold(context * 2, now, FOR_WINDOW);
      if (--this.tileLoads[tag] === 0) this.compute(engine, now);
    }
    this.finishContext(context, now);
    this.runnable.wake(engine);
  }

  alarm(context: number, now: number): void {
    const engine = Math.floor(context / this.streams);
    const spent = now - this.computeFrom[engine];
    this.computePs[engine] += spent;
    const record = this.kernels[this.queue[context % this.streams][0]];
    record.computePs += spent;
    this.engineComputes[engine] = -1;
    this.lastEventPs = now;
    this.tileComputed(context, now, FOR_COMPUTE);
    this.turn[engine] = (context % this.streams) + 1;
    this.compute(engine, now);
    this.runnable.wake(engine);
  }

  finished(): boolean {
    return this.queue.every((kernels) => kernels.length === 0);
  }

  enough(): boolean {
    return true;
  }

  async refill(): Promise<void> {}

  /** Fills in the fields a peek promises. */
  private offer(context: number, stream: number): void {
    const at = context * 2 + this.side;
    const head = at * CHUNK + this.chunkAt[at];
    if (this.partLeft[at] === 0) this.partLeft[at] = this.chunkBytes[head];
    this.address = this.chunkAddress[head] + this.chunkBytes[head] - this.partLeft[at];
    this.bytes = this.partLeft[at];
    this.op = this.side;
    this.context = context;
    this.kernel = this.queue[stream][0];
    this.readyPs = this.sideReady[at];
    this.waitedPs = this.sideReady[at] - this.sideSince[at];
    this.waitedFor = this.sideFor[at];
  }

  private findStore(context: number, now: number): boolean {
    const at = context * 2 + WRITE;
    if (this.storing[context] === this.computing[context]) return false;
    while (this.storing[context] < this.computing[context]) {
      if (this.fetch(context, WRITE, this.storing[context])) {
        this.side = WRITE;
        return true;
      }
      this.storing[context]++;
      this.walking[at] = 0;
      this.compute(Math.floor(context / this.streams), now); // it may have waited for this tile's stores
    }
    this.finishContext(context, now);
    return false;
  }

  private findLoad(context: number, engine: number, now: number): boolean {
    const at = context * 2;
    while (
      this.loading[context] < this.tiles[context] &&
      this.loading[context] < this.computing[context] + this.buffering[engine]
    ) {
      const tile = this.loading[context];
      const slot = context * this.slots + (tile % this.slots);
      if (this.walking[at] === 0) this.tileLoads[slot] = UNISSUED;
      if (this.fetch(context, READ, tile)) {
        if (this.walks[at].chained && this.outstanding[at] > 0 && this.partLeft[at] === 0) return false;
        this.side = READ;
        return true;
      }
      this.walking[at] = 0;
      this.loading[context]++;
      this.tileLoads[slot] -= UNISSUED;
      if (this.tileLoads[slot] === 0) {
        this.compute(engine, now);
        if (this.tiles[context] === 0) return false; // that was the last tile of the launch
        if (this.findStore(context, now)) return true;
      }
    }
    return false;
  }

  /** Makes sure the side's chunk holds an access of the tile; false when the tile's side is done. */
  private fetch(context: number, side: number, tile: number): boolean {
    const at = context * 2 + side;
    const engine = Math.floor(context / this.streams);
    const die = this.engineDie[engine];
    if (this.walking[at] === 0) {
      const index = this.queue[context % this.streams][0];
      const dieTile = engine - this.firstEngine[die] + tile * this.pkg.dies[die].engines;
      this.walks[at].begin(this.placed[index], index, die, side, dieTile);
      this.walking[at] = 1;
      this.chunkAt[at] = 0;
      this.chunkEnd[at] = 0;
    }
    if (this.chunkAt[at] < this.chunkEnd[at]) return true;
    this.chunkAt[at] = 0;
    this.chunkEnd[at] = this.walks[at].fill(this.chunkAddress, this.chunkBytes, at * CHUNK, CHUNK);
    if (this.chunkEnd[at] === 0) return false;
    // walkers write from at * CHUNK on; chunkAt counts from there
    return true;
  }

  /** Starts computing what can be computed on an engine. */
  private compute(engine: number, now: number): void {
    for (let i = 0; i < this.streams && this.engineComputes[engine] < 0; i++) {
      const stream = (this.turn[engine] + i) % this.streams;
      const context = engine * this.streams + stream;
      while (this.computable(context, engine)) {
        const index = this.queue[stream][0];
        const { kernel } = this.placed[index];
        const die = this.engineDie[engine];
        const flops = this.tileFlops(index, die);
        const record = this.kernels[index];
        if (record.startPs < 0) record.startPs = now;
        const rate = flops === 0 ? 1 : (this.flopsPerPs.get(kernel.format) as Float64Array)[die];
        const ps = Math.ceil(flops / rate);
        if (ps > 0) {
          this.engineComputes[engine] = context;
          this.computeFrom[engine] = now;
          this.timers.set(die, now + ps, context);
          break;
        }
        this.tileComputed(context, now, FOR_WINDOW);
        if (this.tiles[context] === 0) break;
      }
    }
  }

  /** Work of one tile of a kernel on a die. */
  private tileFlops(index: number, die: number): number {
    const { kernel, shares } = this.placed[index];
    return kernel.flops === 0 ? 0 : shares[die].flops / shares[die].tiles;
  }

  private computable(context: number, engine: number): boolean {
    const tile = this.computing[context];
    return (
      tile < this.tiles[context] &&
      tile < this.loading[context] &&
      this.tileLoads[context * this.slots + (tile % this.slots)] === 0 &&
      tile - this.storing[context] < this.buffering[engine]
    );
  }

  private tileComputed(context: number, now: number, why: number): void {
    const engine = Math.floor(context / this.streams);
    const index = this.queue[context % this.streams][0];
    this.kernels[index].flops += this.tileFlops(index, this.engineDie[engine]);
    const gateWasShut = this.loading[context] >= this.computing[context] + this.buffering[engine];
    if (gateWasShut) this.hold(context * 2, now, why);
    if (this.storing[context] === this.computing[context]) this.hold(context * 2 + 1, now, why);
    this.computing[context]++;
    // a tile without stores is stored at once
    if (this.placed[index].kernel.writeBytes === 0) {
      this.storing[context] = this.computing[context];
    }
    this.finishContext(context, now);
    this.runnable.wake(engine);
  }

  /** A side that was held back may go on at `now`. */
  private hold(at: number, now: number, why: number): void {
    this.sideReady[at] = now;
    this.sideFor[at] = why;
  }

  private finishContext(context: number, now: number): void {
    const tiles = this.tiles[context];
    if (tiles === 0 || this.computing[context] < tiles) return;
    if (this.storing[context] < tiles) {
      // the last tile's stores may turn out to be none
      this.runnable.wake(Math.floor(context / this.streams));
      return;
    }
    if (this.outstanding[context * 2] + this.outstanding[context * 2 + 1] > 0) return;
    this.tiles[context] = 0;
    const stream = context % this.streams;
    if (--this.busyContexts[stream] === 0) this.endLaunch(stream, now);
  }

  private endLaunch(stream: number, now: number): void {
    const index = this.queue[stream][0];
    const record = this.kernels[index];
    record.endPs = now;
    record.launches++;
    this.lastEventPs = Math.max(this.lastEventPs, now);
    if (++this.launch[stream] === this.trace.kernels[index].repeat) {
      this.queue[stream].shift();
      this.launch[stream] = 0;
    }
    this.startLaunch(stream, now);
  }

  /** Deals the tiles of the stream's next kernel to its contexts; a kernel without tiles is over at once. */
  private startLaunch(stream: number, now: number): void {
    while (this.queue[stream].length > 0) {
      const { shares } = this.placed[this.queue[stream][0]];
      let busy = 0;
      for (let engine = 0; engine < this.engineDie.length; engine++) {
        const die = this.engineDie[engine];
        const local = engine - this.firstEngine[die];
        const count = Math.ceil((shares[die].tiles - local) / this.pkg.dies[die].engines);
        const context = engine * this.streams + stream;
        this.tiles[context] = Math.max(0, count);
        if (count <= 0) continue;
        busy++;
        this.loading[context] = 0;
        this.computing[context] = 0;
        this.storing[context] = 0;
        for (const at of [context * 2, context * 2 + 1]) {
          this.walking[at] = 0;
          this.hold(at, now, FOR_BARRIER);
        }
        this.runnable.wake(engine);
      }
      this.busyContexts[stream] = busy;
      if (busy > 0) return;
      const record = this.kernels[this.queue[stream][0]];
      if (record.startPs < 0) record.startPs = now;
      record.endPs = now;
      record.launches += this.trace.kernels[this.queue[stream][0]].repeat;
      this.queue[stream].shift();
    }
  }
}

/** FLOP per ps of one engine of each die, for every number format the trace computes in. */
function formats(pkg: Package, trace: KernelTrace): Map<string, Float64Array> {
  const rates = new Map<string, Float64Array>();
  for (const { flops, format, die, line } of trace.kernels) {
    if (flops === 0) continue;
    const users = die >= 0 ? [pkg.dies[die]] : pkg.dies;
    for (const user of users) {
      if (user.peakFlops[format] === undefined) {
        throw new InputError({
          where: { file: trace.file, line, path: 'format' },
          found: `number format '${format}'`,
          expected: `a format that compute die '${user.name}' gives a peak for: ${Object.keys(user.peakFlops).join(', ')}`,
        });
      }
    }
    rates.set(
      format,
      Float64Array.from(pkg.dies, (d) => (d.peakFlops[format] ?? 0) / d.engines / 1e12),
    );
  }
  return rates;
}
