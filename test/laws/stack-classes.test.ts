import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { STACK_CLASSES, type StackClass } from '../../src/engine/index.js';
import { accessTrace, kernelTrace, type Outcome, placer, type Row, simulate, sum } from '../helpers/engine.js';
import { lonePackage } from '../helpers/packages.js';

/*
 * For each class of the bandwidth stack a case in which that class must take a number of clocks known beforehand, to the clock.
 * The device is HBM3 at 6.4 Gb/s: tRCDRD 26, tRP 26, tRRD_S 4, tCCD_S 2, tCCD_L 4, RL 26, WL 10, tRTW 2, tRFCab 560, tREFI 6240, a
 * burst 2 ck. Requests of one trace time reach the controller a clock or so apart, because each takes its flit on the link;
 * where that matters the arithmetic says so.
 */

/** Clocks of a class over all pseudo-channels, or of pseudo-channel p. */
function ck({ recording }: Outcome, name: StackClass, p?: number): number {
  const c = STACK_CLASSES.indexOf(name);
  const all = recording.dram.reads.length;
  return sum(
    Array.from({ length: all }, (_, i) =>
      p === undefined || p === i ? recording.bandwidthStack[i * STACK_CLASSES.length + c] : 0,
    ),
  );
}

/** Everything but the classes named is without a clock. */
function nothingBut(outcome: Outcome, ...names: StackClass[]): void {
  for (const name of STACK_CLASSES)
    if (!names.includes(name)) expect({ [name]: ck(outcome, name) }).toEqual({ [name]: 0 });
}

const open = (pkg: Package, rows: Row[]): Promise<Outcome> => simulate(pkg, accessTrace(rows), { replay: 'open' });
const IDLE: StackClass[] = ['starved_arrivals', 'starved_drain'];

describe('classes of the controller', () => {
  const pkg = lonePackage();
  const at = placer(pkg);
  const read = (place: Parameters<typeof at>[0], timePs = 0): Row => ({
    op: 'R',
    address: at(place),
    bytes: 32,
    timePs,
  });

  it('row cycle: a lone read of a closed bank waits tRCDRD', async () => {
    const run = await open(pkg, [read({})]);
    expect(ck(run, 'row_cycle')).toBe(26);
    expect(ck(run, 'read_data')).toBe(2);
    nothingBut(run, 'row_cycle', 'read_data', ...IDLE);
  });

  it('row cycle: one that finds another row open waits tRP + tRCDRD', async () => {
    const run = await open(pkg, [read({}), read({ row: 1 }, 1e6)]);
    expect(ck(run, 'row_cycle')).toBe(26 + 26 + 26);
    nothingBut(run, 'row_cycle', 'read_data', ...IDLE);
  });

  it('column gap: reads of one bank group are tCCD_L apart, which is two clocks more than a burst', async () => {
    const rows = [read({})];
    // into an open row, long after it was opened, in two banks of one group
    for (let i = 1; i <= 20; i++) rows.push(read({ column: i }, 1e6));
    const run = await open(pkg, rows);
    expect(ck(run, 'column_gap')).toBe(19 * (4 - 2));
    nothingBut(run, 'row_cycle', 'column_gap', 'read_data', ...IDLE);
  });

  it('activate window: the fifth ACT waits for tFAW, the others for tRRD_S', async () => {
    const narrow = lonePackage('memory.0.timings={ tFAW: 200 ck }');
    const places = [0, 1, 2, 3].map((bankGroup) => read({ bankGroup }));
    const run = await open(narrow, [...places, read({ bank: 1 })]);
    // ACTs at 0, 4, 8, 12 and 200, columns 26 later; gaps on the data bus: 4 - 2 three times, and 226 - 38 - 2
    expect(ck(run, 'activate_window')).toBe(3 * (4 - 2) + (226 - 38 - 2));
    expect(ck(run, 'row_cycle')).toBe(26);
    nothingBut(run, 'row_cycle', 'activate_window', 'read_data', ...IDLE);
  });

  it('turnaround: a write behind a read leaves tRTW on the data bus', async () => {
    const run = await open(pkg, [read({}), { op: 'W', address: at({ column: 1 }), bytes: 32, timePs: 0 }]);
    expect(ck(run, 'turnaround')).toBe(2);
    expect([ck(run, 'read_data'), ck(run, 'write_data')]).toEqual([2, 2]);
    nothingBut(run, 'row_cycle', 'turnaround', 'read_data', 'write_data', ...IDLE);
  });

  it('command bus: two pseudo-channels activate at once, and ACT holds the row bus for 1.5 ck', async () => {
    const pair = lonePackage(
      'memory.0.organisation={ channels: 1, pseudo_channels: 2 }',
      'address_map.interleave=[stack, channel, pseudo_channel]',
    );
    const place = placer(pair);
    const rows: Row[] = [0, 1].map((p) => ({ op: 'R', address: place({ p }), bytes: 32, timePs: 0 }));
    const run = await open(pair, rows);
    // 1.5 ck of waiting, and half a clock more until a column command may begin
    expect(ck(run, 'command_bus')).toBe(2);
    expect(ck(run, 'row_cycle')).toBe(2 * 26);
    nothingBut(run, 'row_cycle', 'command_bus', 'read_data', 'starved_imbalance', ...IDLE);
  });

  it('refresh: a read that comes in the middle of one waits for its end', async () => {
    const refreshed = lonePackage('memory.0.refresh={ mode: all-bank, postpone: 1, pull_in: 0 }');
    // the lone pseudo-channel's refresh is due at tREFI; nothing is open, so it goes then
    const early = await open(refreshed, [read({}, 6240 * 625)]);
    const late = await open(refreshed, [read({}, 6340 * 625)]);
    // the one that comes 100 ck later waits 100 ck less
    expect(ck(early, 'refresh') - ck(late, 'refresh')).toBe(100);
    // and as long as the refresh still takes: it came 8.25 ns and a little after its time, at the next clock edge of the die
    const arrived = Math.ceil((6240 * 625 + 250 + 3000 + 5000) / 625);
    expect(ck(early, 'refresh')).toBe(6240 + 560 - arrived);
    nothingBut(early, 'refresh', 'row_cycle', 'read_data', ...IDLE);
  });
});

describe('classes of what comes before', () => {
  const chase = (count: number): Row[] =>
    Array.from(
      { length: count },
      (_, i): Row => ({ op: 'R', address: 32 * (i % 8), bytes: 32, engine: 0, after: i > 0 ? 1 : 0 }),
    );

  it('window: a chase of row hits waits for each answer; 20 ck more of the way cost 20 ck more each', async () => {
    const runs: Outcome[] = [];
    for (const latency of ['3 ns', '9.25 ns'])
      runs.push(await simulate(lonePackage(`links.0.latency=${latency}`), accessTrace(chase(200))));
    expect(ck(runs[1], 'starved_window') - ck(runs[0], 'starved_window')).toBe(199 * 20);
    for (const run of runs) {
      expect(ck(run, 'row_cycle')).toBe(26);
      nothingBut(
        run,
        'starved_window',
        'row_cycle',
        'read_data',
        'starved_drain',
        'starved_arrivals',
        'starved_down_link',
      );
    }
  });

  it('arrivals: accesses 1000 ck apart leave the bus to itself in between', async () => {
    const pkg = lonePackage();
    const rows = Array.from(
      { length: 50 },
      (_, i): Row => ({ op: 'R', address: 32 * (i % 8), bytes: 32, timePs: i * 625_000 }),
    );
    const run = await open(pkg, rows);
    // from burst to burst 1000 ck, two of them data; before the first there is its way and RL
    const way = Math.ceil((250 + 3000 + 5000) / 625);
    expect(ck(run, 'starved_arrivals') + ck(run, 'row_cycle')).toBe(49 * 998 + way + 26);
    nothingBut(run, 'starved_arrivals', 'row_cycle', 'read_data', 'starved_drain');
  });

  it('compute: with one buffer each tile is loaded when the one before has been computed', async () => {
    const runs: Outcome[] = [];
    // 25 TFLOP/s an engine: 25 and 50 MFLOP a tile are 1000 and 2000 ns, 1600 and 3200 ck
    for (const flops of ['100 MFLOP', '200 MFLOP']) {
      const pkg = lonePackage('compute.0.engines=1', 'compute.0.buffering=1', 'compute.0.peak={ bf16: 25 TFLOP/s }');
      const text = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\nk,main,bf16,${flops},1 KiB,0,sequential,,256 B\n`;
      runs.push(await simulate(pkg, await kernelTrace(pkg, text)));
    }
    // four tiles, three waits between them
    expect(ck(runs[1], 'starved_compute') - ck(runs[0], 'starved_compute')).toBe(3 * 1600);
    expect(ck(runs[0], 'starved_compute')).toBeGreaterThanOrEqual(3 * 1600);
  });

  it('down link: writes that take 16 ck on the link and 2 on the data bus', async () => {
    // 64 lanes x 1.6 GT/s / 8 = 12.8 GB/s: a flit of 128 B with 16 B of overhead is 10 ns, 16 ck, and holds 96 B of data and their header
    const pkg = lonePackage(
      'links.0.lanes=64',
      'links.0.rate=1.6 GT/s',
      'links.0.flit=128 B',
      'links.0.flit_overhead=16 B',
      'links.0.request_header=80 B',
      'memory.0.controller={ drain_high: 1, drain_low: 0 }',
    );
    const rows = Array.from({ length: 101 }, (_, i): Row => ({ op: 'W', address: 32 * (i % 8), bytes: 32 }));
    const run = await simulate(pkg, accessTrace(rows));
    expect(ck(run, 'write_data')).toBe(2 * 101);
    expect(ck(run, 'starved_down_link')).toBeGreaterThanOrEqual(100 * 14 - 28);
    expect(ck(run, 'starved_down_link')).toBeLessThanOrEqual(100 * 14 + 28);
  });

  it('up link: with room for one answer the next read is sent when it has left', async () => {
    const runs: Outcome[] = [];
    for (const latency of ['3 ns', '9.25 ns'])
      runs.push(
        await simulate(
          lonePackage('links.0.landing=256 B', `links.0.latency=${latency}`),
          accessTrace(Array.from({ length: 100 }, (_, i): Row => ({ op: 'R', address: 256 * (i % 4), bytes: 256 }))),
        ),
      );
    expect(ck(runs[1], 'starved_up_link') - ck(runs[0], 'starved_up_link')).toBe(99 * 20);
  });

  it('queue credits: with a queue of one the next write is sent when the slot is free again', async () => {
    const runs: Outcome[] = [];
    for (const latency of ['3 ns', '9.25 ns'])
      runs.push(
        await simulate(
          lonePackage(
            'memory.0.controller={ write_queue: 1, drain_high: 1, drain_low: 0 }',
            `links.0.latency=${latency}`,
          ),
          accessTrace(Array.from({ length: 100 }, (_, i): Row => ({ op: 'W', address: 32 * (i % 8), bytes: 32 }))),
        ),
      );
    expect(ck(runs[1], 'starved_queue_credits') - ck(runs[0], 'starved_queue_credits')).toBe(99 * 20);
  });

  it('imbalance and drain: a pseudo-channel without work waits while the other gets some, then for the end', async () => {
    const pair = lonePackage(
      'memory.0.organisation={ channels: 1, pseudo_channels: 2 }',
      'address_map.interleave=[stack, channel, pseudo_channel]',
    );
    const place = placer(pair);
    const rows = Array.from(
      { length: 200 },
      (_, i): Row => ({
        op: 'R',
        address: place({ p: 0, column: i % 32 }),
        bytes: 32,
        engine: 0,
        after: i > 0 ? 1 : 0,
      }),
    );
    const run = await simulate(pair, accessTrace(rows));
    expect(ck(run, 'starved_imbalance', 1) + ck(run, 'starved_drain', 1)).toBe(run.recording.elapsedCk);
    // after the last request was sent there is its way, its row hit and its answer: no more than an access takes
    expect(ck(run, 'starved_drain', 1)).toBeLessThan(run.recording.elapsedCk / 150);
    expect(ck(run, 'starved_imbalance', 0)).toBe(0);
  });
});
