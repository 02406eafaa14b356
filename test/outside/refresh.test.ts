import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { accessTrace, type LoggedCommand, type Row, simulate } from '../helpers/engine.js';
import { lone, only } from '../helpers/outside.js';

/*
 * Refresh as the standard has it. JESD238 (HBM3), from memory: tREFI 3.9 us, tRFCab 260, 350 and 450 ns for 4, 8 and 16 Gb a
 * channel, so that tRFC / tREFI is 6.67, 8.97 and 11.54 %; above 85 C refreshes come twice as often (the mode registers of
 * JESD79-5 and JESD238, through a cross-standard digest); at most nine tREFI between two (JESD238 section 6.3.2.5 note 2).
 */
const TREFI = 3900; // ns
const DENSITIES = [
  { gigabit: 4, tRFC: 260, loss: 6.67 },
  { gigabit: 8, tRFC: 350, loss: 8.97 },
  { gigabit: 16, tRFC: 450, loss: 11.54 },
];
// closing and opening again around a refresh, ns: tRTP, tRP, tRCD, less the tCCD_S that would have passed anyway (the preset's)
const REOPENING = 5 + 16 + 16 - 1.25;

const CK = 0.625; // ns

/** A sequential read stream, more than the pseudo-channel can take. */
async function stream(pkg: Package, bytes: number): Promise<LoggedCommand[]> {
  function* rows(): Generator<Row> {
    for (let at = 0; at < bytes; at += 4096) yield { op: 'R', address: at, bytes: 4096 };
  }
  const { commands } = await simulate(pkg, accessTrace(rows()), { log: true });
  return commands;
}

/** Percent of the data bus that reads leave unused, between two commands at the same point of a refresh interval. */
function unused(log: readonly LoggedCommand[], from: number, to: number): number {
  const reads = only(log, 'RD', 'RDA').filter((c) => c.ck >= from && c.ck < to).length;
  return 100 * (1 - (2 * reads) / (to - from));
}

const allBank = (tRFC: number, ...more: string[]): Package =>
  lone('hbm3-6.4', `memory.0.timings={ tRFCab: ${tRFC} ns }`, 'memory.0.refresh={ mode: all-bank }', ...more);

/*
 * Tolerance, chosen beforehand: 0.3 points of the bus at tREFI, twice that when hot: a refresh finds the stream at any point of
 * a row, which moves its cost by a few bursts, and 10 ck in 6240 is 0.16 points.
 */
const TOLERANCE = 0.3;

describe.each(DENSITIES)('all-bank refresh of $gigabit Gb a channel', ({ tRFC, loss }) => {
  it.each([
    { at: '60 C', times: 1 },
    { at: '95 C', times: 2 },
  ])('at $at takes a little more than tRFC / tREFI of a saturating stream', async ({ at, times }) => {
    expect(Math.abs((100 * tRFC) / TREFI - loss)).toBeLessThan(0.01); // the table's own arithmetic
    const without = await stream(lone('hbm3-6.4'), 2 ** 20);
    const reads = only(without, 'RD');
    const floor = unused(without, reads[0].ck, reads[reads.length - 1].ck);
    expect(floor).toBeLessThan(0.5); // nothing but refresh is in the way

    const log = await stream(allBank(tRFC, `memory.0.refresh.temperature=${at}`), 6 * 2 ** 20);
    const last = only(log, 'RD')[only(log, 'RD').length - 1].ck;
    // steady state only: the first ones are done ahead before the stream arrives, those owed come in a row after it
    const refreshes = only(log, 'REFab').filter((c) => c.ck > 0.25 * last && c.ck < last);
    expect(refreshes.length).toBeGreaterThan(25 * times);
    const got = unused(log, refreshes[0].ck, refreshes[refreshes.length - 1].ck) - floor;
    expect(got).toBeGreaterThan(times * loss);
    expect(Math.abs(got - (times * 100 * (tRFC + REOPENING)) / TREFI)).toBeLessThanOrEqual(times * TOLERANCE);
  });
});

describe('how often', () => {
  it.each([
    { load: 'a saturating stream', rows: 2048, gap: 0 },
    { load: 'a read now and then', rows: 500, gap: 1_000_000 }, // ps; half a millisecond of mostly nothing
  ])('all-bank: time / tREFI within what may be owed or done ahead, never nine tREFI apart: $load', async (load) => {
    const pkg = allBank(350);
    const { postpone, pullIn } = pkg.memory[0].refresh;
    const rows = Array.from(
      { length: load.rows },
      (_, i): Row => ({ op: 'R', address: 4096 * i, bytes: 4096, timePs: load.gap * i }),
    );
    const { commands, recording } = await simulate(pkg, accessTrace(rows), {
      replay: load.gap > 0 ? 'open' : 'closed',
      log: true,
    });
    const refreshes = only(commands, 'REFab');
    const intervals = recording.makespanPs / 1000 / TREFI; // a whole number of clocks, so nothing is rounded
    expect(refreshes.length).toBe(recording.dram.refreshesAll[0]);
    expect(refreshes.length).toBeGreaterThan(20);
    expect(refreshes.length).toBeGreaterThanOrEqual(Math.floor(intervals) - postpone);
    expect(refreshes.length).toBeLessThanOrEqual(Math.ceil(intervals) + pullIn);
    const times = [0, ...refreshes.map((c) => c.ck)];
    for (let i = 1; i < times.length; i++) expect((times[i] - times[i - 1]) * CK).toBeLessThanOrEqual(9 * TREFI);
  });

  it('a stream makes the controller use what the standard lets it postpone', async () => {
    const log = await stream(allBank(350), 2 ** 20);
    expect(only(log, 'REFab')[0].ck * CK).toBeGreaterThan(7 * TREFI);
  });

  it('per-bank: every bank its share, in sets, none waits longer than nine tREFI', async () => {
    const pkg = lone('hbm3-6.4', 'memory.0.refresh={ mode: per-bank }');
    const rows = Array.from({ length: 3000 }, (_, i): Row => ({ op: 'R', address: 4096 * i, bytes: 4096 }));
    const { commands, recording } = await simulate(pkg, accessTrace(rows), { log: true });
    const refreshes = only(commands, 'REFpb');
    const end = recording.makespanPs / 1000;
    expect(refreshes.length).toBe(recording.dram.refreshesBank[0]);
    const banks = new Map<string, number[]>();
    for (const { sid, bankGroup, bank, ck } of refreshes) {
      const name = `${sid}.${bankGroup}.${bank}`;
      banks.set(name, [...(banks.get(name) ?? [0]), ck * CK]);
    }
    expect(banks.size).toBe(32); // two stack IDs of sixteen banks
    const shares = [...banks.values()].map((times) => times.length - 1);
    for (const times of banks.values()) {
      times.push(end);
      for (let i = 1; i < times.length; i++) expect(times[i] - times[i - 1]).toBeLessThanOrEqual(9 * TREFI);
    }
    expect(Math.max(...shares)).toBeGreaterThan(15);
    // each set of 16 of a stack ID is finished before the next begins
    for (let sid = 0; sid < 2; sid++) {
      const ofSid = refreshes.filter((c) => c.sid === sid);
      for (let at = 0; at + 16 <= ofSid.length; at += 16) {
        expect(new Set(ofSid.slice(at, at + 16).map((c) => c.bankGroup * 4 + c.bank)).size).toBe(16);
      }
    }
    // one a bank and tREFI in the long run, 8 of which may be owed
    for (const share of shares) {
      expect(share).toBeLessThanOrEqual(Math.ceil(end / TREFI) + 1);
      expect(share).toBeGreaterThanOrEqual(Math.floor(end / TREFI) - 9);
    }
  });
});
