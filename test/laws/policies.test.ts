import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { stream } from '../../src/random.js';
import { accessTrace, type LoggedCommand, placer, type Row, type Sample, simulate, sum } from '../helpers/engine.js';
import { lonePackage, smallPackage } from '../helpers/packages.js';

/*
 * Policies move figures the way the literature says. Margins are stated where the law is more than an order.
 */

type Replay = 'open' | 'closed';
const run = (pkg: Package, rows: readonly Row[], replay: Replay = 'closed') =>
  simulate(pkg, accessTrace(rows), { replay, log: true, keepSamples: true });

const latency = ({ controller_queue, bank_preparation, data_transfer }: Sample): number =>
  controller_queue + bank_preparation + data_transfer;
const mean = (values: readonly number[]): number => sum(values) / values.length;

describe('scheduling', () => {
  /** Three streams, each in rows of its own, that meet in the same banks, with some random reads and writes in between. */
  function mixed(seed: number): Row[] {
    const address = placer(lonePackage());
    const random = stream('mixed', seed);
    const rows: Row[] = [];
    for (let i = 0; i < 3000; i++) {
      const which = i % 4;
      const step = i >> 2;
      const place = {
        bankGroup: step & 3,
        bank: (step >> 2) & 3,
        row: 10 * which + (step >> 9),
        column: (step >> 4) & 31,
      };
      const anywhere = {
        bankGroup: Math.floor(random() * 4),
        bank: Math.floor(random() * 4),
        row: 100 + Math.floor(random() * 50),
      };
      rows.push({ op: random() < 0.2 ? 'W' : 'R', address: address(which === 3 ? anywhere : place), bytes: 32 });
    }
    return rows;
  }

  it.each([1, 2, 3])('FR-FCFS is faster than FCFS on streams that meet in banks (seed %i)', async (seed) => {
    const fcfs = await run(lonePackage('memory.0.controller.scheduler=fcfs'), mixed(seed));
    const ready = await run(lonePackage(), mixed(seed));
    expect(ready.recording.makespanPs).toBeLessThan(0.9 * fcfs.recording.makespanPs);
    const hits = (r: typeof ready) => sum(r.recording.dram.rowHits);
    expect(hits(ready)).toBeGreaterThan(hits(fcfs));
  });

  it('in order, a stream still goes at the pace of one bank group: tCCD_L against tCCD_S', async () => {
    const rows = Array.from({ length: 2000 }, (_, i): Row => ({ op: 'R', address: 256 * i, bytes: 256 }));
    const fcfs = await run(smallPackage('memory.0.controller.scheduler=fcfs'), rows);
    const ready = await run(smallPackage(), rows);
    expect(ready.recording.makespanPs).toBeLessThanOrEqual(fcfs.recording.makespanPs);
    expect(fcfs.recording.makespanPs).toBeLessThan((4 / 2) * ready.recording.makespanPs);
  });

  it('a higher cap on row hits gives more hits and a longer wait for the conflict', async () => {
    const spans: number[] = [];
    const waits: number[] = [];
    const address = placer(lonePackage());
    const rows: Row[] = [];
    for (let i = 0; i < 400; i++) {
      // one row keeps its bank busy, every tenth read wants another row of that bank
      const row = i % 10 === 5 ? 2 : 1;
      rows.push({ op: 'R', address: address({ row, column: i % 32 }), bytes: 32, timePs: i * 3000 });
    }
    for (const cap of [1, 4, 16, 64]) {
      const { recording, samples } = await run(lonePackage(`memory.0.controller.hit_cap=${cap}`), rows, 'open');
      spans.push(sum(recording.dram.activates));
      waits.push(Math.max(...samples.map(latency)));
    }
    for (let i = 1; i < spans.length; i++) expect(spans[i]).toBeLessThanOrEqual(spans[i - 1]);
    expect(spans[3]).toBeLessThan(spans[0]);
  });
});

describe('address folding', () => {
  it.each([16, 17, 18, 20])('helps a stride of 2^%i bytes, which meets in one bank without it', async (bits) => {
    const rows = Array.from(
      { length: 1500 },
      (_, i): Row => ({ op: 'R', address: (i * 2 ** bits) % 2 ** 29, bytes: 64 }),
    );
    const plain = await run(lonePackage(), rows);
    const folds =
      'address_map.xor={ bank_group.0: [row.0, row.4, row.8], bank_group.1: [row.1, row.5, row.9], bank.0: [row.2, row.6, row.10], bank.1: [row.3, row.7] }';
    const folded = await run(lonePackage(folds), rows);
    expect(folded.recording.makespanPs).toBeLessThan(0.6 * plain.recording.makespanPs);
  });

  it('does not cost a sequential stream anything worth mentioning', async () => {
    const rows = Array.from({ length: 4000 }, (_, i): Row => ({ op: 'R', address: 256 * i, bytes: 256 }));
    const plain = await run(smallPackage(), rows);
    const folded = await run(
      smallPackage('address_map.xor={ bank_group.0: [row.0], bank_group.1: [row.1], bank.0: [row.2] }'),
      rows,
    );
    expect(folded.recording.makespanPs).toBeLessThan(1.02 * plain.recording.makespanPs);
  });
});

describe('page policy', () => {
  const random = (seed: number, count: number, gapPs: number): Row[] => {
    const next = stream('page', seed);
    return Array.from({ length: count }, (_, i): Row => {
      return { op: 'R', address: Math.floor(next() * 2 ** 22) * 64, bytes: 32, timePs: i * gapPs };
    });
  };

  it.each([1, 2])(
    'closed is faster on uniform random reads, whose rows are never wanted again (seed %i)',
    async (seed) => {
      // apart: a conflict costs tRP more than a closed bank
      const apart = random(seed, 600, 100_000);
      const open = await run(lonePackage(), apart, 'open');
      const closed = await run(lonePackage('memory.0.controller.page=closed'), apart, 'open');
      expect(mean(closed.samples.map(latency))).toBeLessThan(mean(open.samples.map(latency)) - 8000);
      // crowded: precharges ride on column commands, so it is no slower either
      const crowd = random(seed, 4000, 0);
      const openCrowd = await run(lonePackage(), crowd);
      const closedCrowd = await run(lonePackage('memory.0.controller.page=closed'), crowd);
      expect(closedCrowd.recording.makespanPs).toBeLessThanOrEqual(openCrowd.recording.makespanPs);
    },
  );

  it('open is faster on runs in one row that come apart in time', async () => {
    const address = placer(lonePackage());
    const next = stream('runs', 1);
    const rows: Row[] = [];
    for (let run = 0; run < 100; run++) {
      const place = { bank: Math.floor(next() * 4), bankGroup: Math.floor(next() * 4), row: Math.floor(next() * 1000) };
      for (let column = 0; column < 4; column++)
        rows.push({ op: 'R', address: address({ ...place, column }), bytes: 32, timePs: rows.length * 100_000 });
    }
    const open = await run(lonePackage(), rows, 'open');
    const closed = await run(lonePackage('memory.0.controller.page=closed'), rows, 'open');
    expect(mean(open.samples.map(latency))).toBeLessThan(mean(closed.samples.map(latency)) - 4000);
    expect(sum(open.recording.dram.activates)).toBeLessThanOrEqual(100);
    expect(sum(closed.recording.dram.activates)).toBe(400);
    // a timeout shorter than the pauses is like closed, a longer one like open
    const shut = await run(lonePackage('memory.0.controller={ page: timeout, page_timeout: 20 ns }'), rows, 'open');
    const kept = await run(lonePackage('memory.0.controller={ page: timeout, page_timeout: 900 us }'), rows, 'open');
    expect(sum(shut.recording.dram.activates)).toBe(400);
    expect(kept.samples).toEqual(open.samples);
  });
});

describe('write drain', () => {
  const turnarounds = (log: readonly LoggedCommand[]): number => {
    const kinds = log.filter((c) => /^(RD|WR)/.test(c.command)).map((c) => c.command[0]);
    return kinds.filter((kind, i) => i > 0 && kind !== kinds[i - 1]).length;
  };

  it('watermarks further apart give fewer turnarounds and more bandwidth', async () => {
    const next = stream('drain', 1);
    const rows = Array.from({ length: 4000 }, (_, i): Row => {
      return { op: next() < 0.4 ? 'W' : 'R', address: 64 * Math.floor(next() * 2 ** 15) + (i & 1) * 32, bytes: 32 };
    });
    const turns: number[] = [];
    const spans: number[] = [];
    for (const low of [46, 40, 32, 16, 4]) {
      const { commands, recording } = await run(
        lonePackage(
          `memory.0.controller={ read_queue: 32, write_queue: 64, drain_high: 48, drain_low: ${low}, age_bound: 1 ms }`,
        ),
        rows,
      );
      turns.push(turnarounds(commands));
      spans.push(recording.makespanPs);
    }
    for (let i = 1; i < turns.length; i++) expect(turns[i]).toBeLessThan(turns[i - 1]);
    expect(turns[4]).toBeLessThan(turns[0] / 5);
    expect(spans[4]).toBeLessThan(0.9 * spans[0]);
  });
});

describe('refresh', () => {
  it('costs a saturated stream a little more than tRFC / tREFI, and postponing none of it in the long run', async () => {
    const rows = Array.from({ length: 30_000 }, (_, i): Row => ({ op: 'R', address: 256 * i, bytes: 256 }));
    const off = await run(lonePackage(), rows);
    for (const postpone of [1, 4]) {
      const on = await run(lonePackage(`memory.0.refresh={ mode: all-bank, postpone: ${postpone}, pull_in: 0 }`), rows);
      const lost = 1 - off.recording.makespanPs / on.recording.makespanPs;
      expect(lost).toBeGreaterThan(350 / 3900 - 0.01);
      expect(lost).toBeLessThan(350 / 3900 + 0.04);
    }
  });
});
