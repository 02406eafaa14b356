import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { accessTrace, type LoggedCommand, placer, type Row, simulate } from '../helpers/engine.js';
import { lonePackage } from '../helpers/packages.js';

/*
 * Every timing rule by hand: two or three requests each, the expected clock written as a sum. Timings are set in clocks here, so
 * that the sums can be read without a table: all different, and easy to tell apart.
 */
const TIMINGS = {
  tRC: 80,
  tRAS: 50,
  tRP: 30,
  tRCDRD: 25,
  tRCDWR: 20,
  tRRD_S: 5,
  tRRD_L: 8,
  tFAW: 40,
  tRTP: 9,
  tWR: 27,
  tWTR_S: 6,
  tWTR_L: 13,
  tCCD_S: 2,
  tCCD_L: 4,
  tCCD_R: 3,
  tPPD: 2,
  tRTW: 2,
  tRFCab: 500,
  tRFCpb: 200,
  tREFI: 6000,
  tRREFD: 12,
  RL: 26,
  WL: 10,
};
const BURST = 2;
const CK = 625; // ps

function device(overrides: Partial<typeof TIMINGS> = {}, ...more: string[]): Package {
  const timings = { ...TIMINGS, ...overrides };
  const text = Object.entries(timings)
    .map(([name, ck]) => `${name}: ${ck} ck`)
    .join(', ');
  return lonePackage(`memory.0.timings={ ${text} }`, ...more);
}

type Place = Parameters<ReturnType<typeof placer>>[0];
interface Step extends Place {
  readonly op?: 'R' | 'W';
  readonly at?: number; // clock of arrival relative to the first
  readonly bytes?: number;
}

/** Runs the steps in open loop and returns the DRAM commands. */
async function commands(pkg: Package, steps: readonly Step[]): Promise<LoggedCommand[]> {
  const address = placer(pkg);
  const rows = steps.map(
    ({ op = 'R', at = 0, bytes = 32, ...place }): Row => ({ op, address: address(place), bytes, timePs: at * CK }),
  );
  const { commands: log } = await simulate(pkg, accessTrace(rows), { replay: 'open', log: true });
  return log;
}

/** Commands of one kind. */
const of = (log: readonly LoggedCommand[], ...names: string[]): LoggedCommand[] =>
  log.filter((c) => names.includes(c.command));
/** Clocks from one command to the next. */
const gap = (a: LoggedCommand, b: LoggedCommand): number => b.ck - a.ck;

describe('row commands', () => {
  it('ACT to RD is tRCDRD, ACT to WR is tRCDWR', async () => {
    const [act, rd] = await commands(device(), [{ row: 1 }]);
    expect(gap(act, rd)).toBe(25);
    const [act2, wr] = await commands(device(), [{ op: 'W', row: 1 }]);
    expect(gap(act2, wr)).toBe(20);
  });

  it('ACT to ACT is tRRD_S to another bank group, tRRD_L to the same', async () => {
    const [a, b] = of(await commands(device(), [{ bankGroup: 0 }, { bankGroup: 1 }]), 'ACT');
    expect(gap(a, b)).toBe(5);
    const [c, d] = of(await commands(device(), [{ bank: 0 }, { bank: 1 }]), 'ACT');
    expect(gap(c, d)).toBe(8);
  });

  it('tRRD_S reaches across stack IDs where the device says so, and not where it does not', async () => {
    const steps = [{ sid: 0 }, { sid: 1 }];
    const [a, b] = of(await commands(device(), steps), 'ACT');
    expect(gap(a, b)).toBe(5);
    const [c, d] = of(await commands(device({}, 'memory.0.activate_window_scope=sid'), steps), 'ACT');
    expect(gap(c, d)).toBe(1.5); // only the row bus: an ACT holds it 1.5 ck
  });

  it('the fifth ACT waits for tFAW after the first', async () => {
    const steps = [0, 1, 2, 3].map((bankGroup) => ({ bankGroup }));
    const acts = of(await commands(device(), [...steps, { bankGroup: 0, bank: 1 }, { bankGroup: 1, bank: 1 }]), 'ACT');
    expect(gap(acts[0], acts[3])).toBe(5 + 5 + 5);
    expect(gap(acts[0], acts[4])).toBe(40);
    expect(gap(acts[1], acts[5])).toBe(40); // and the sixth after the second: 5 after the fifth
  });

  it('a conflict is tRAS to PRE, tRP to ACT', async () => {
    const [act, , pre, again] = await commands(device({ tRC: 80 }), [{ row: 1 }, { row: 2 }]);
    expect([act, pre, again].map((c) => c.command)).toEqual(['ACT', 'PRE', 'ACT']);
    expect(gap(act, pre)).toBe(50); // tRAS, later than tRCDRD + tRTP = 25 + 9
    expect(gap(pre, again)).toBe(30);
  });

  it('tRC holds where it is longer than tRAS + tRP', async () => {
    const acts = of(await commands(device({ tRC: 95 }), [{ row: 1 }, { row: 2 }]), 'ACT');
    expect(gap(acts[0], acts[1])).toBe(95);
  });

  it('RD to PRE is tRTP', async () => {
    // the row is open long since; a read at clock 200 and a conflict with it
    const log = await commands(device(), [{ row: 1 }, { row: 1, at: 200 }, { row: 2, at: 200 }]);
    const rd = of(log, 'RD')[1];
    expect(gap(rd, of(log, 'PRE')[0])).toBe(9);
  });

  it('WR to PRE is WL + burst + tWR', async () => {
    const log = await commands(device(), [
      { op: 'W', row: 1 },
      { op: 'W', row: 2, at: 10 },
    ]);
    expect(gap(of(log, 'WR')[0], of(log, 'PRE')[0])).toBe(10 + BURST + 27);
  });

  it('PRE to PRE is tPPD', async () => {
    const open = [{ row: 1 }, { row: 1, bankGroup: 1 }];
    const log = await commands(device(), [...open, { row: 2, at: 300 }, { row: 2, bankGroup: 1, at: 300 }]);
    const [a, b] = of(log, 'PRE');
    expect(gap(a, b)).toBe(2);
  });
});

describe('column commands', () => {
  const opened = [{ row: 1 }, { row: 1, bankGroup: 1 }, { row: 1, sid: 1 }];

  it('RD to RD is tCCD_L in a bank group, tCCD_S across, tCCD_R across stack IDs', async () => {
    const same = of(await commands(device(), [{ row: 1, bytes: 64 }]), 'RD');
    expect(gap(same[0], same[1])).toBe(4);
    const across = of(
      await commands(device(), [...opened, { row: 1, at: 400 }, { row: 1, bankGroup: 1, at: 400 }]),
      'RD',
    ).slice(3);
    expect(gap(across[0], across[1])).toBe(2);
    const ranks = of(
      await commands(device(), [...opened, { row: 1, at: 400 }, { row: 1, sid: 1, at: 400 }]),
      'RD',
    ).slice(3);
    expect(gap(ranks[0], ranks[1])).toBe(3);
  });

  it('WR to WR likewise', async () => {
    const same = of(await commands(device(), [{ op: 'W', row: 1, bytes: 64 }]), 'WR');
    expect(gap(same[0], same[1])).toBe(4);
    const log = await commands(device(), [
      ...opened,
      { op: 'W', row: 1, at: 400 },
      { op: 'W', row: 1, bankGroup: 1, at: 400 },
    ]);
    const [a, b] = of(log, 'WR');
    expect(gap(a, b)).toBe(2);
  });

  it('RD to WR is RL + burst - WL + turnaround', async () => {
    const log = await commands(device(), [...opened, { row: 1, at: 400 }, { op: 'W', row: 1, bankGroup: 1, at: 400 }]);
    expect(gap(of(log, 'RD')[3], of(log, 'WR')[0])).toBe(26 + BURST - 10 + 2);
  });

  it('WR to RD is WL + burst + tWTR_L in the bank group, tWTR_S across', async () => {
    const long = await commands(device(), [...opened, { op: 'W', row: 1, at: 400 }, { row: 1, column: 5, at: 402 }]);
    expect(gap(of(long, 'WR')[0], of(long, 'RD')[3])).toBe(10 + BURST + 13);
    const short = await commands(device(), [
      ...opened,
      { op: 'W', row: 1, at: 400 },
      { row: 1, bankGroup: 1, at: 402 },
    ]);
    expect(gap(of(short, 'WR')[0], of(short, 'RD')[3])).toBe(10 + BURST + 6);
  });
});

describe('auto-precharge', () => {
  const closed = 'memory.0.controller.page=closed';

  it('RDA starts its own precharge when tRAS has passed too', async () => {
    const [act, rda, again] = await commands(device({}, closed), [{ row: 1 }, { row: 2, at: 5 }]);
    expect(rda.command).toBe('RDA');
    expect(gap(act, again)).toBe(50 + 30); // tRAS + tRP, later than tRCDRD + tRTP + tRP = 25 + 9 + 30
  });

  it('WRA waits for write recovery before its own precharge', async () => {
    const [act, wra, again] = await commands(device({}, closed), [
      { op: 'W', row: 1 },
      { op: 'W', row: 2, at: 5 },
    ]);
    expect(wra.command).toBe('WRA');
    expect(gap(act, again)).toBe(20 + (10 + BURST + 27) + 30); // tRCDWR, then write recovery, then tRP
  });

  it('is left out while another queued request hits the row', async () => {
    const log = await commands(device({}, closed), [{ row: 1 }, { row: 1, column: 3 }]);
    expect(of(log, 'RD', 'RDA').map((c) => c.command)).toEqual(['RD', 'RDA']);
  });
});

describe('command buses', () => {
  const pair = (...more: string[]): Package =>
    device(
      {},
      'memory.0.organisation={ channels: 1, pseudo_channels: 2 }',
      'address_map.interleave=[pseudo_channel, channel, stack]',
      ...more,
    );

  it('an ACT holds the row bus of both pseudo-channels for 1.5 ck', async () => {
    const [a, b] = of(await commands(pair(), [{ p: 0 }, { p: 1 }]), 'ACT');
    expect([a.p, b.p].sort()).toEqual([0, 1]);
    expect(gap(a, b)).toBe(1.5);
  });

  it('a column command holds the column bus for one clock and starts on a whole one', async () => {
    const log = await commands(pair(), [{ p: 0 }, { p: 1 }]);
    const [a, b] = of(log, 'RD');
    expect(gap(a, b)).toBe(2); // ACTs 1.5 ck apart: 25 after the second is a half clock, so one half more
    const later = of(
      await commands(pair(), [{ p: 0 }, { p: 1 }, { p: 0, column: 1, at: 200 }, { p: 1, column: 1, at: 200 }]),
      'RD',
    );
    expect(gap(later[2], later[3])).toBe(1);
  });
});

describe('refresh', () => {
  const allBank = 'memory.0.refresh={ mode: all-bank, postpone: 1, pull_in: 0 }';

  it('REFab comes tRP after PREA, and ACT tRFCab after REFab', async () => {
    // a row is opened just before the first refresh falls due (one pseudo-channel: at tREFI)
    const log = await commands(device({}, allBank), [
      { row: 1, at: 5850 },
      { row: 1, at: 6100 },
      { row: 1, at: 6600 },
    ]);
    const [prea] = of(log, 'PREA');
    const [ref] = of(log, 'REFab');
    const next = of(log, 'ACT').find((c) => c.ck > ref.ck) as LoggedCommand;
    expect(gap(prea, ref)).toBe(30);
    expect(gap(ref, next)).toBe(500);
  });

  it('ACT to REFab is tRC at least, with the row closed in between', async () => {
    const log = await commands(device({ tRC: 95 }, allBank), [
      { row: 1, at: 5650 },
      { row: 1, at: 6600 },
    ]);
    const [ref] = of(log, 'REFab');
    const act = of(log, 'ACT')
      .filter((c) => c.ck < ref.ck)
      .pop() as LoggedCommand;
    expect(gap(act, ref)).toBeGreaterThanOrEqual(95);
  });

  it('REFpb keeps its bank for tRFCpb and others for tRREFD', async () => {
    // 16 banks a stack ID: a refresh each 6000/16 = 375 ck and stack ID; requests for every bank wait all the time
    const steps: Step[] = [];
    for (let i = 0; i < 400; i++)
      steps.push({ row: i & 63, bank: i & 3, bankGroup: (i >> 2) & 3, sid: (i >> 4) & 1, at: 10 * i });
    const log = await commands(device({}, 'memory.0.refresh={ mode: per-bank, postpone: 1 }'), steps);
    const refreshes = of(log, 'REFpb');
    expect(refreshes.length).toBeGreaterThan(10);
    let same = Number.POSITIVE_INFINITY;
    let other = Number.POSITIVE_INFINITY;
    for (const ref of refreshes) {
      for (const act of of(log, 'ACT')) {
        if (act.ck <= ref.ck) continue;
        const itself = act.sid === ref.sid && act.bankGroup === ref.bankGroup && act.bank === ref.bank;
        if (itself) same = Math.min(same, gap(ref, act));
        else other = Math.min(other, gap(ref, act));
      }
    }
    expect(same).toBeGreaterThanOrEqual(200);
    expect(other).toBe(12); // a bank that waited goes as soon as tRREFD allows
  });
});

describe('order of accesses to one address', () => {
  it('a read of what the write queue holds is served from it, without DRAM', async () => {
    const pkg = device();
    const address = placer(pkg);
    const rows: Row[] = [
      { op: 'R', address: address({ row: 9, bank: 3 }), bytes: 32, timePs: 0 }, // keeps the write from being drained at once
      { op: 'W', address: address({ row: 1 }), bytes: 64, timePs: 0 },
      { op: 'R', address: address({ row: 1, column: 1 }), bytes: 32, timePs: 3 * CK },
    ];
    const { recording, commands: log } = await simulate(pkg, accessTrace(rows), { replay: 'open', log: true });
    expect(recording.dram.forwarded[0]).toBe(1);
    expect(of(log, 'RD')).toHaveLength(1);
    expect(of(log, 'WR')).toHaveLength(2);
  });

  it('a read that only partly overlaps a queued write waits for it', async () => {
    const log = await commands(device(), [
      { row: 9, bank: 3 },
      { op: 'W', row: 1, bytes: 32 },
      { row: 1, bytes: 64, at: 3 },
    ]);
    const wr = of(log, 'WR')[0];
    const reads = of(log, 'RD').filter((c) => c.row === 1);
    expect(reads).toHaveLength(2);
    for (const rd of reads) expect(rd.ck).toBeGreaterThan(wr.ck);
  });

  it('a write does not pass an older read of its address', async () => {
    const busy: Step[] = Array.from({ length: 40 }, (_, i) => ({ op: 'W', row: 7, bank: 1, column: i % 32, at: 0 }));
    const log = await commands(device(), [{ row: 1 }, { op: 'W', row: 1, at: 1 }, ...busy]);
    expect(of(log, 'WR').find((c) => c.row === 1)?.ck).toBeGreaterThan(of(log, 'RD')[0].ck);
  });
});

describe('scheduling', () => {
  it('row hits go before an older conflict, up to the cap since ACT', async () => {
    const steps: Step[] = [
      { row: 1 },
      { row: 2, at: 1 },
      ...Array.from({ length: 20 }, (_, i) => ({ row: 1, column: i + 1, at: 2 })),
    ];
    for (const cap of [4, 10]) {
      const log = await commands(device({}, `memory.0.controller.hit_cap=${cap}`), steps);
      const pre = of(log, 'PRE')[0];
      expect(of(log, 'RD').filter((c) => c.ck < pre.ck)).toHaveLength(cap);
    }
  });

  it('an entry past the age bound goes before younger hits', async () => {
    // hits for row 1 keep coming, every 4 ck; the conflict of clock 1 is past its bound of 250 ck (156.25 ns) soon after clock 250
    const steps: Step[] = [
      { row: 1 },
      { row: 2, at: 1 },
      ...Array.from({ length: 200 }, (_, i) => ({ row: 1, column: i % 32, at: 2 + 4 * i })),
    ];
    const aged = 'memory.0.controller={ hit_cap: 1000000, age_bound: 156.25 ns }';
    const log = await commands(device({}, aged), steps);
    const first = log[0].ck;
    const conflict = of(log, 'PRE')[0].ck - first;
    expect(conflict).toBeGreaterThan(250);
    expect(conflict).toBeLessThan(250 + 20); // at most a column command and tRTP later
  });

  it('FCFS serves columns in order', async () => {
    const steps: Step[] = [{ row: 1 }, { row: 2 }, { row: 1, column: 5 }, { row: 1, bankGroup: 2 }];
    const log = await commands(device({}, 'memory.0.controller.scheduler=fcfs'), steps);
    const order = of(log, 'RD').map((c) => c.request);
    expect(order).toEqual([...order].sort((a, b) => a - b));
  });

  it('a row is closed by the timeout after its last hit', async () => {
    const log = await commands(device({}, 'memory.0.controller={ page: timeout, page_timeout: 62.5 ns }'), [
      { row: 1 },
      { row: 2, at: 400 },
    ]);
    const [rd] = of(log, 'RD');
    const [pre] = of(log, 'PRE');
    expect(gap(rd, pre)).toBe(100); // 62.5 ns
  });

  it('writes wait for the high watermark while reads keep coming, and are drained to the low one', async () => {
    const pkg = device({}, 'memory.0.controller={ write_queue: 16, drain_high: 8, drain_low: 2 }');
    const reads: Step[] = Array.from({ length: 300 }, (_, i) => ({ row: 1, column: i % 32, at: 2 * i }));
    const writes: Step[] = Array.from({ length: 8 }, (_, i) => ({ op: 'W', row: 3, bankGroup: 1, column: i, at: 100 }));
    const log = await commands(pkg, [...reads.slice(0, 50), ...writes, ...reads.slice(50)]);
    const all = of(log, 'RD', 'WR')
      .map((c) => c.command)
      .join(' ');
    // one run of 8 - 2 = 6 writes; the last two only when the reads are over
    expect(all).toMatch(/^(RD )+(WR ){6}(RD )+(WR ?){2}$/);
  });
});
