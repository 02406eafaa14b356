import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { accessTrace, kernelTrace, type Row, simulate, sum } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';
import { everyClockIsAccountedFor } from './accounts.js';
import { anyDesign, anyWork, build, type Finished, finished, PLAIN, rowsOf } from './cases.js';

const done = (request: Finished): number => request.donePs;
const ready = (request: Finished): number => request.donePs - sum(request.stages);
const issued = (request: Finished): number => ready(request) + request.stages[0];
const rising = (a: number, b: number): number => a - b;

/** Runs rows, each with a kernel of its own, and returns what each row's request (one a row) did, by row. */
async function byRow(
  pkg: Parameters<typeof simulate>[0],
  rows: readonly Row[],
  replay: 'open' | 'closed' | 'paced',
): Promise<Finished[][]> {
  const { all, collector } = finished();
  const named = rows.map((row, i) => ({ ...row, kernel: i }));
  await simulate(
    pkg,
    accessTrace(
      named,
      rows.map((_, i) => `row ${i}`),
    ),
    { replay, collectors: [collector] },
  );
  const requests: Finished[][] = rows.map(() => []);
  for (const request of all) requests[request.kernel].push(request);
  return requests;
}

describe('times', () => {
  it('open loop keeps recorded times: every row is ready then, and issues at a clock edge after', async () => {
    await fc.assert(
      fc.asyncProperty(anyDesign, anyWork, async (design, work) => {
        const pkg = build(design);
        const rows = rowsOf(pkg, { ...work, tiles: false, after: false, pattern: 'uniform', size: 64 });
        const requests = await byRow(pkg, rows, 'open');
        rows.forEach((row, i) => {
          expect(requests[i]).toHaveLength(1);
          expect(ready(requests[i][0])).toBe(row.timePs);
          expect(issued(requests[i][0])).toBeGreaterThanOrEqual(row.timePs as number);
        });
      }),
      { seed: 31, numRuns: 25 },
    );
  });

  it('closed loop ignores them', async () => {
    await fc.assert(
      fc.asyncProperty(anyDesign, anyWork, async (design, work) => {
        const pkg = build(design);
        const rows = rowsOf(pkg, work);
        const go = async (factor: number) => {
          const { all, collector } = finished();
          const times = rows.map((row) => ({ ...row, timePs: (row.timePs as number) * factor }));
          const { recording } = await simulate(pkg, accessTrace(times, ['even', 'odd']), { collectors: [collector] });
          return { recording, all };
        };
        expect(await go(1000)).toEqual(await go(0));
      }),
      { seed: 32, numRuns: 25 },
    );
  });

  it('paced keeps the gaps of an engine as think time: never sooner, and exactly when nothing stalls', async () => {
    const pkg = smallPackage('compute.0.window=2');
    const clock = 625;
    // engine 0 has a long gap after each burst of four, engine 1 an even beat
    const rows: Row[] = [];
    for (let i = 0; i < 200; i++) {
      rows.push({ op: 'R', address: i * 256, bytes: 32, engine: 0, timePs: clock * (400 * (i >> 2) + (i & 3)) });
      rows.push({ op: 'R', address: 2 ** 24 + i * 256, bytes: 32, engine: 1, timePs: clock * (100 * i + 7) });
    }
    rows.sort((a, b) => (a.timePs as number) - (b.timePs as number));
    const requests = await byRow(pkg, rows, 'paced');
    let stalled = 0;
    for (const engine of [0, 1]) {
      const mine = rows.map((row, i) => ({ row, request: requests[i][0] })).filter(({ row }) => row.engine === engine);
      expect(issued(mine[0].request)).toBe(mine[0].row.timePs);
      for (let i = 1; i < mine.length; i++) {
        const gap = (mine[i].row.timePs as number) - (mine[i - 1].row.timePs as number);
        const kept = issued(mine[i].request) - issued(mine[i - 1].request);
        expect(kept).toBeGreaterThanOrEqual(gap);
        if (mine[i].request.stages[0] === 0) expect(kept).toBe(gap);
        else stalled++;
      }
    }
    expect(stalled).toBeGreaterThan(10); // a window of two stalls the bursts of four
    // a stall pushes later rows: engine 0 ends later than recorded, engine 1, never stalled, does not
    const lastOf = (engine: number): number => rows.map((row) => row.engine).lastIndexOf(engine);
    expect(issued(requests[lastOf(0)][0])).toBeGreaterThan(rows[lastOf(0)].timePs as number);
    expect(issued(requests[lastOf(1)][0])).toBe(rows[lastOf(1)].timePs);
  });
});

describe('dependencies', () => {
  it('a row never issues before the row it depends on has returned, in any replay mode', async () => {
    await fc.assert(
      fc.asyncProperty(
        anyDesign,
        anyWork,
        fc.constantFrom('open', 'closed', 'paced'),
        fc.array(fc.integer({ min: 0, max: 6 }), { minLength: 150, maxLength: 150 }),
        async (design, work, replay, back) => {
          const pkg = build({ ...design, eastStacks: 0 });
          const rows = rowsOf(pkg, { ...work, tiles: false, rows: 150 }).map((row, i) => {
            return { ...row, engine: i % 3, after: back[i] };
          });
          const requests = await byRow(pkg, rows, replay);
          rows.forEach((row, i) => {
            const target = i - 3 * row.after; // rows of an engine are three apart
            if (row.after === 0 || target < 0) return;
            const returned = Math.max(...requests[target].map(done));
            for (const request of requests[i]) expect(issued(request)).toBeGreaterThanOrEqual(returned);
          });
        },
      ),
      { seed: 33, numRuns: 40 },
    );
  });

  it('a chase is a sum of latencies: a row is issued at the edge its predecessor returns', async () => {
    const pkg = smallPackage('compute.0.engines=1');
    const rows = Array.from(
      { length: 50 },
      (_, i): Row => ({ op: 'R', address: (i * 7919 * 64) % 2 ** 24, bytes: 64, after: 1 }),
    );
    const requests = (await byRow(pkg, rows, 'closed')).map(([request]) => request);
    for (let i = 1; i < rows.length; i++) expect(issued(requests[i])).toBe(done(requests[i - 1]));
  });
});

describe('tiles', () => {
  /** Tiles of one engine: `loads` reads, then `stores` writes, `flops` once loaded. */
  const tiles = (count: number, loads: number, stores: number, flops: number): Row[] =>
    Array.from({ length: count }, (_, tile) => [
      ...Array.from({ length: loads }, (_, i): Row => {
        return { op: 'R', address: (tile * loads + i) * 256, bytes: 256, engine: 0, tile, flops: i === 0 ? flops : 0 };
      }),
      ...Array.from({ length: stores }, (_, i): Row => {
        return { op: 'W', address: 2 ** 26 + (tile * stores + i) * 256, bytes: 256, engine: 0, tile, flops: 0 };
      }),
    ]).flat();

  const FLOPS = 5_000_000;

  it.each([1, 2, 3])(
    'with %i buffers, stores come after compute and no more tiles are in flight',
    async (buffering) => {
      const pkg = smallPackage(`compute.0.buffering=${buffering}`);
      const rows = tiles(12, 8, 4, FLOPS);
      const requests = await byRow(pkg, rows, 'closed');
      // rows carry no number format: the highest peak of the die, an engine's share of it
      const computePs = Math.ceil(FLOPS / (200e12 / 4 / 1e12));
      let computed = 0; // when the tile before was computed
      const ends: number[] = [];
      for (let tile = 0; tile < 12; tile++) {
        const mine = rows.map((row, i) => ({ row, request: requests[i][0] })).filter(({ row }) => row.tile === tile);
        const loads = mine.filter(({ row }) => row.op === 'R').map(({ request }) => request);
        const stores = mine.filter(({ row }) => row.op === 'W').map(({ request }) => request);
        const loaded = Math.max(...loads.map(done));
        // computing starts when the loads are back and the engine is free
        const end = Math.max(loaded, computed) + computePs;
        const first = Math.min(...stores.map(issued));
        expect(first).toBeGreaterThanOrEqual(end);
        expect(first).toBeLessThan(end + 2 * 625); // at an edge right after
        // a tile's loads wait until the tile `buffering` before it has been computed
        if (tile >= buffering) expect(Math.min(...loads.map(issued))).toBeGreaterThanOrEqual(ends[tile - buffering]);
        computed = end + ((625 - (end % 625)) % 625); // the engine sees it at its clock edge
        ends.push(end);
      }
    },
  );

  it('kernels: at most `buffering` tiles in flight, stores after compute, compute as long as the flops take', async () => {
    for (const buffering of [1, 2, 4]) {
      // one engine, so that tiles are those of one context in order
      const pkg = smallPackage('compute.0.engines=1', `compute.0.buffering=${buffering}`);
      const text =
        'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\nk,main,bf16,400 MFLOP,32 KiB,16 KiB,sequential,sequential,2 KiB\n';
      const { all, collector } = finished();
      const { recording } = await simulate(pkg, await kernelTrace(pkg, text), { collectors: [collector] });
      const tilePs = Math.ceil(400e6 / 16 / 100);
      expect(recording.kernels[0].computePs).toBeGreaterThanOrEqual(16 * tilePs);
      expect(recording.kernels[0].computePs).toBeLessThan(16 * (tilePs + 625));
      const loads = all
        .filter((r) => r.op !== 1)
        .map(issued)
        .sort(rising);
      const returns = all
        .filter((r) => r.op !== 1)
        .map(done)
        .sort(rising);
      const stores = all
        .filter((r) => r.op === 1)
        .map(issued)
        .sort(rising);
      expect([loads.length, stores.length]).toEqual([128, 64]); // of 256 B: 8 loads and 4 stores a tile
      for (let tile = 0; tile < 16; tile++) {
        // the first store of tile n comes after n + 1 tiles have been loaded and computed
        expect(stores[4 * tile]).toBeGreaterThanOrEqual(returns[8 * tile + 7] + tilePs);
        expect(stores[4 * tile]).toBeGreaterThanOrEqual((tile + 1) * tilePs);
        // loads of tile n + buffering come after tile n was computed, which is when its stores may start
        if (tile + buffering < 16)
          expect(loads[8 * (tile + buffering)]).toBeGreaterThanOrEqual(returns[8 * tile + 7] + tilePs);
      }
    }
  });

  it('each die has its own number of buffers', async () => {
    const pkg = build(
      { ...PLAIN, refresh: 'mode: off', eastStacks: 1 },
      'compute.0.engines=1',
      'compute.1.engines=1',
      'compute.0.buffering=1',
      'compute.1.buffering=4',
    );
    const text =
      'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\nk,main,bf16,24 MFLOP,32 KiB,0,sequential,,2 KiB\n';
    const { all, collector } = finished();
    await simulate(pkg, await kernelTrace(pkg, text), { collectors: [collector] });
    const pcs = pkg.memory[0].organisation.channels * pkg.memory[0].organisation.pseudo_channels;
    // 24 MFLOP over 2 dies of 8 tiles each: 1.5 MFLOP a tile at 3 FLOP a ps is 500 ns, long after a tile's loads are back
    const tilePs = 500_000;
    const inFirstTile = (east: boolean): number =>
      all.filter((r) => r.p >= pcs === east && issued(r) < tilePs / 2).length;
    expect([inFirstTile(false), inFirstTile(true)]).toEqual([8, 4 * 8]); // of 256 B, 8 loads a tile
  });

  it('more buffers are never slower, and two overlap loading with computing', async () => {
    const spans: number[] = [];
    for (const buffering of [1, 2, 4]) {
      const pkg = smallPackage(`compute.0.buffering=${buffering}`);
      const { recording } = await simulate(pkg, accessTrace(tiles(30, 32, 0, FLOPS)));
      spans.push(recording.makespanPs);
    }
    expect(spans[1]).toBeLessThan(spans[0]);
    expect(spans[2]).toBeLessThanOrEqual(spans[1]);
  });

  it('a store may depend on an earlier store of its tile', async () => {
    const rows: Row[] = [0, 1].map((i) => ({
      op: 'W',
      address: 256 * i,
      bytes: 32,
      engine: 0,
      tile: 0,
      flops: 0,
      after: i,
    }));
    const requests = await byRow(smallPackage(), rows, 'closed');
    expect(issued(requests[1][0])).toBeGreaterThanOrEqual(done(requests[0][0]));
  });

  it('chains of stores over many tiles go one after the other, whatever else is loaded meanwhile', async () => {
    const rows: Row[] = [];
    for (let tile = 0; tile < 60; tile++) {
      for (let i = 0; i < 100; i++) {
        const op = i % 10 === 9 ? 'W' : 'R';
        // a store waits for the store before it, ten rows back
        const after = op === 'W' && rows.length > 10 ? 10 : 0;
        rows.push({ op, address: 32 * rows.length, bytes: 32, engine: 0, tile, flops: 1, after });
      }
    }
    const requests = await byRow(smallPackage(), rows, 'closed');
    for (let row = 19; row < rows.length; row += 10)
      expect(issued(requests[row][0])).toBeGreaterThanOrEqual(done(requests[row - 10][0]));
  });

  it('a load that waits for a store of its own tile can never go, and is refused by its row', async () => {
    const row = (op: 'R' | 'W', after: number, tile: number): Row => ({
      op,
      address: 0,
      bytes: 32,
      engine: 0,
      after,
      tile,
    });
    const inOneTile = byRow(smallPackage(), [row('R', 0, 0), row('W', 0, 0), row('R', 1, 0)], 'closed');
    await expect(inOneTile).rejects.toThrow(
      /^memory\.csv: row 3: found a load that depends on a store of its own tile/,
    );
    // in the next tile it may
    const requests = await byRow(smallPackage(), [row('R', 0, 0), row('W', 0, 0), row('R', 1, 1)], 'closed');
    expect(issued(requests[2][0])).toBeGreaterThanOrEqual(done(requests[1][0]));
  });

  it('a tile that stores and never ends is refused by the row that no longer fits', async () => {
    const rows = Array.from(
      { length: 5000 },
      (_, i): Row => ({ op: i ? 'R' : 'W', address: 32 * i, bytes: 32, engine: 0, tile: 0 }),
    );
    await expect(byRow(smallPackage(), rows, 'closed')).rejects.toThrow(
      'row 4097: found a tile of more than 4,096 rows that stores',
    );
  });
});

describe('a run cut short', () => {
  it('is a prefix of the whole run: commands, samples, and checks that hold', async () => {
    await fc.assert(
      fc.asyncProperty(
        anyDesign,
        anyWork,
        fc.constantFrom('open', 'closed', 'paced'),
        fc.double({ min: 0.02, max: 0.98, noNaN: true }),
        async (design, work, replay, share) => {
          const pkg = build(design);
          const rows = rowsOf(pkg, work);
          const go = async (untilPs: number) => {
            const { all, collector } = finished();
            const { recording, commands } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
              replay,
              untilPs,
              log: true,
              collectors: [collector],
            });
            return { recording, commands, all };
          };
          const whole = await go(Number.POSITIVE_INFINITY);
          expect(whole.recording.partial).toBe(false);
          const untilPs = Math.floor(share * whole.recording.makespanPs);
          const cut = await go(untilPs);
          expect(cut.recording.partial).toBe(true);
          expect(cut.recording.makespanPs).toBe(untilPs);
          everyClockIsAccountedFor(pkg, cut.recording);

          // every command before the cut, and none of another kind: by pseudo-channel, in order of time
          const ck = pkg.memory[0].clockPs;
          const total = cut.recording.dram.reads.length;
          for (let p = 0; p < total; p++) {
            const of = (log: typeof whole.commands) => log.filter((c) => c.p === p && c.ck * ck < untilPs);
            expect(of(cut.commands)).toEqual(of(whole.commands));
            // and after it at most what was under way: none that starts at the cut or later
            expect(cut.commands.filter((c) => c.p === p && c.ck * ck >= untilPs)).toEqual([]);
            const columns = cut.commands.filter((c) => c.p === p && c.command.startsWith('RD')).length;
            expect(cut.recording.dram.reads[p]).toBe(columns);
          }
          // answers before the cut are those of the whole run
          const early = (all: readonly Finished[]) => all.filter((r) => r.donePs < untilPs);
          expect(early(cut.all)).toEqual(early(whole.all));
          expect(cut.all.every((r) => r.donePs < untilPs)).toBe(true);
        },
      ),
      { seed: 34, numRuns: 40 },
    );
  });

  it('a limit after the end changes nothing', async () => {
    const pkg = build({ ...PLAIN, refresh: 'mode: per-bank, postpone: 2' });
    const rows = rowsOf(pkg, {
      pattern: 'zipf',
      rows: 400,
      writes: 0.3,
      size: 0,
      gapPs: 2000,
      after: false,
      tiles: true,
      seed: 5,
    });
    const whole = await simulate(pkg, accessTrace(rows, ['even', 'odd']), { log: true });
    const limited = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
      log: true,
      untilPs: whole.recording.makespanPs + 1_000_000,
    });
    expect(limited).toEqual(whole);
  });
});
