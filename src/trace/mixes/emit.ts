/**
 * The accesses of a mix, as engines that work side by side would send them: jobs are dealt to the engines in turn as each comes free,
 * and a row of each engine is written before the second of any. Every row names its die, engine, kernel and tile; the flops of a tile
 * stand in its first row.
 */
import { BATCH_ROWS } from '../access.js';
import { type AccessBatch, READ, WRITE } from '../batch.js';
import type { Job, Site, Tile, Work } from './mix.js';

/** One engine: its job, the tile it is at and how far it is in it. */
interface Lane {
  readonly die: number;
  readonly engine: number;
  tiles: Iterator<Tile> | null;
  tile: Tile | null;
  number: number; // of the tile
  section: number; // 0 loads from another die, 1 loads, 2 stores
  run: number; // index into the runs of the section
  done: number; // bytes of the run already written
  first: boolean; // no row of the tile has been written
}

/** Makes the accesses; the batch is used again after each pull. `requestBytes`: the longest access, at whose multiples runs are cut. */
export function* emit(work: Work, site: Site, requestBytes: number): Generator<AccessBatch> {
  const batch = {
    count: 0,
    op: new Uint8Array(BATCH_ROWS),
    address: new Float64Array(BATCH_ROWS),
    bytes: new Float64Array(BATCH_ROWS),
    timePs: null,
    die: new Int32Array(BATCH_ROWS),
    engine: new Int32Array(BATCH_ROWS),
    kernel: new Int32Array(BATCH_ROWS),
    tile: new Int32Array(BATCH_ROWS),
    flops: new Float64Array(BATCH_ROWS),
    after: null,
  };
  const next = jobsByDie(work.jobs(), site.dies);
  let tiles = 0;
  let lanes: Lane[] = [];
  // dies in turn for each engine number, so that the first jobs go to different dies
  for (let engine = 0; engine < site.engines; engine++)
    for (let die = 0; die < site.dies; die++)
      lanes.push({ die, engine, tiles: null, tile: null, number: 0, section: 0, run: 0, done: 0, first: true });

  /** Moves a lane to its next run; false when there is no work left for it. */
  const advance = (lane: Lane): boolean => {
    for (;;) {
      if (lane.tile !== null) {
        for (; lane.section < 3; lane.section++, lane.run = 0)
          if (lane.run < runsOf(lane.tile, lane.section).length) return true;
        lane.tile = null;
      }
      const step = lane.tiles?.next();
      if (step !== undefined && !step.done) {
        Object.assign(lane, { tile: step.value, number: tiles++, section: 0, run: 0, done: 0, first: true });
        continue;
      }
      const job = next(lane.die);
      if (job === null) return false;
      lane.tiles = job.tiles()[Symbol.iterator]();
    }
  };

  while (lanes.length > 0) {
    let idle = 0;
    for (const lane of lanes) {
      if (!advance(lane)) {
        idle++;
        lane.number = -1;
        continue;
      }
      const tile = lane.tile as Tile;
      const runs = runsOf(tile, lane.section);
      const owner = lane.section === 0 ? (tile.far?.die ?? lane.die) : lane.die;
      const address = site.base + owner * site.region + runs[lane.run] + lane.done;
      const left = runs[lane.run + 1] - lane.done;
      const length = Math.min(left, requestBytes - (address % requestBytes));
      const i = batch.count++;
      batch.op[i] = lane.section === 2 ? WRITE : READ;
      batch.address[i] = address;
      batch.bytes[i] = length;
      batch.die[i] = lane.die;
      batch.engine[i] = lane.engine;
      batch.kernel[i] = tile.kernel;
      batch.tile[i] = lane.number;
      batch.flops[i] = lane.first ? tile.flops : 0;
      lane.first = false;
      lane.done += length;
      if (length === left) {
        lane.run += 2;
        lane.done = 0;
      }
      if (batch.count === BATCH_ROWS) {
        yield batch;
        batch.count = 0;
      }
    }
    if (idle > 0) lanes = lanes.filter((lane) => lane.number >= 0);
  }
  if (batch.count > 0) yield batch;
}

function runsOf(tile: Tile, section: number): readonly number[] {
  if (section === 0) return tile.far?.loads ?? [];
  return section === 1 ? tile.loads : tile.stores;
}

/** Gives each die its next job: those that name it, and in turn those that name none. */
function jobsByDie(jobs: Iterable<Job>, dies: number): (die: number) => Job | null {
  const waiting: Job[][] = Array.from({ length: dies }, () => []);
  const source = jobs[Symbol.iterator]();
  let turn = 0;
  let ended = false;
  return (die) => {
    while (waiting[die].length === 0 && !ended) {
      const { done, value } = source.next();
      if (done) ended = true;
      else waiting[value.die ?? turn++ % dies].push(value);
    }
    return waiting[die].shift() ?? null;
  };
}
