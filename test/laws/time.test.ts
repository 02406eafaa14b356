import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { TIMING_NAMES, type TimingName } from '../../src/config/package.js';
import { accessTrace, kernelTrace, type LoggedCommand, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';
import { everyClockIsAccountedFor } from './accounts.js';
import { anyDesign, anyWork, build, type Design, finished, PLAIN, REFRESHES, rowsOf } from './cases.js';

/** Where the engine moves the origin of its 32-bit times: at each multiple of this many half clocks. */
const REBASE_HALF = 2 ** 29;

describe('shifting the times of an open-loop trace', () => {
  /** Without refresh, and with clocks that divide the shift, nothing else tells one moment from another. */
  async function shifted(design: Design, rows: readonly Row[], shiftPs: number) {
    const pkg = build({ ...design, refresh: 'mode: off' });
    const { all, collector } = finished();
    const later = rows.map((row) => ({ ...row, timePs: (row.timePs as number) + shiftPs }));
    const { recording, commands } = await simulate(pkg, accessTrace(later, ['even', 'odd']), {
      replay: 'open',
      log: true,
      collectors: [collector],
    });
    const ck = shiftPs / pkg.memory[0].clockPs;
    const { organisation: o } = pkg.memory[0];
    const channels: LoggedCommand[][] = Array.from({ length: o.stacks * o.channels }, () => []); // each in its own order
    for (const c of commands) channels[Math.floor(c.p / o.pseudo_channels)].push({ ...c, ck: c.ck - ck });
    return {
      channels,
      all: all.map((r) => ({ ...r, donePs: r.donePs - shiftPs })),
      makespanPs: recording.makespanPs - shiftPs,
      dram: recording.dram,
    };
  }

  it('shifts every command and answer by as much, across the re-basing of times too', async () => {
    const shifts = [625 * 16_000, 625 * 2 ** 28 - 625 * 300, 500_000_000_000, 4_000_000_000_000].map(
      (ps) => Math.round(ps / 10_000) * 10_000,
    );
    await fc.assert(
      fc.asyncProperty(anyDesign, anyWork, async (design, work) => {
        // edges of all clocks must fall on the shift: 1.6 GHz has 625 ps
        const even: Design = { ...design, device: 'hbm3-6.4', clocks: ['1.6 GHz', '1.6 GHz'] };
        const rows = rowsOf(build(even), { ...work, tiles: false, rows: Math.min(work.rows, 200) });
        const first = await shifted(even, rows, 10_000);
        for (const shift of shifts) expect(await shifted(even, rows, shift)).toEqual(first);
      }),
      { seed: 41, numRuns: 12 },
    );
  });

  it('traffic before, during and after a re-basing is served as if there were none', async () => {
    // rows 40 ns apart over 40 us, ending up to 20 us after the moment times are re-based
    const rows = Array.from({ length: 1000 }, (_, i): Row => {
      return {
        op: i % 3 === 0 ? 'W' : 'R',
        address: (i * 7919 * 64) % 2 ** 25,
        bytes: 1 + ((i * 37) % 700),
        timePs: i * 40_000,
      };
    });
    for (const page of ['open', 'closed', 'timeout'] as const) {
      const design: Design = { ...PLAIN, page, stacks: 2 };
      const first = await shifted(design, rows, 10_000);
      // the origin moves when the time is half as far again as a re-basing
      for (const half of [1.5 * REBASE_HALF, 2.5 * REBASE_HALF]) {
        const shift = Math.round((half * 312.5 - 20_000_000) / 10_000) * 10_000;
        expect(await shifted(design, rows, shift)).toEqual(first);
      }
    }
  });

  it('with any refresh a long silence passes and checks hold after it', async () => {
    for (const refresh of REFRESHES.slice(1)) {
      const pkg = build({ ...PLAIN, refresh, page: 'timeout', channels: 1 }, 'memory.0.timings.tREFI=3900 ns');
      const rows: Row[] = [];
      for (const start of [0, 300_000_000_000]) {
        for (let i = 0; i < 200; i++)
          rows.push({ op: i % 4 === 0 ? 'W' : 'R', address: i * 4096, bytes: 256, timePs: start + i * 5000 });
      }
      const { recording } = await simulate(pkg, accessTrace(rows), { replay: 'open' });
      everyClockIsAccountedFor(pkg, recording);
      expect(recording.kernels[0].requests).toBe(400);
      // refreshes are those of the time that passed, give or take what may be owed or done ahead
      const { refresh: r, organisation: o, timings } = pkg.memory[0];
      const units = r.mode === 'per-bank' || r.scope === 'sid' ? o.sids : 1;
      const banks = r.mode === 'per-bank' ? o.bank_groups * o.banks_per_group : 1;
      // where none may be owed, rows must be closed before tREFI is over, so the interval is shorter by what that may take
      const t = (name: TimingName): number => timings[name].ck;
      const close = r.postpone > 0 ? 0 : t('tRC') + t('WL') + o.burst_ck + t('tWR') + t('tRTP') + t('tRP') + 32;
      const due = (recording.elapsedCk / t('tREFI')) * units * banks;
      const most = r.mode === 'per-bank' ? due : (recording.elapsedCk / (t('tREFI') - close)) * units;
      const done = r.mode === 'per-bank' ? recording.dram.refreshesBank : recording.dram.refreshesAll;
      for (const count of done) {
        expect(count).toBeGreaterThanOrEqual(due - units * banks * (r.postpone + 1));
        expect(count).toBeLessThanOrEqual(most + units * banks * (r.pullIn + 1));
      }
    }
  });
});

describe('scaling all clocks and times by two', () => {
  /** Both packages give separations in clocks; the second one's clocks, latencies and rates are all half as fast. */
  function twins(design: Design) {
    const base = build({ ...design, device: 'hbm3-6.4' });
    const timings = TIMING_NAMES.map((name) => `${name}: ${base.memory[0].timings[name].ck} ck`).join(', ');
    const make = (factor: number) =>
      build(
        { ...design, device: 'hbm3-6.4', clocks: [`${1.6 / factor} GHz`, `${0.8 / factor} GHz`] },
        `memory.0.clock=${1.25 / factor} GHz`, // a half clock of 400 ps: no time is a rounded one,
        `memory.0.timings={ ${timings} }`,
        `memory.0.controller.page_timeout=${60 * factor} ns`,
        `memory.0.controller.age_bound=${1000 * factor} ns`,
        `memory.0.controller.pipeline=${5 * factor} ns`,
        `memory.0.base_die={ ingress: ${5 * factor} ns, egress: ${4 * factor} ns }`,
        // 256 lanes x 20 GT/s is 400 ps a flit, whole before and after
        `links.0.rate=${20 / factor} GT/s`,
        `links.0.latency=${3 * factor} ns`,
        `compute.0.peak={ bf16: ${3 / factor} TFLOP/s }`,
        ...(design.eastStacks > 0
          ? [
              `links.1.rate=${20 / factor} GT/s`,
              `links.1.latency=${3 * factor} ns`,
              `compute.1.peak={ bf16: ${3 / factor} TFLOP/s }`,
            ]
          : []),
      );
    return [make(1), make(2)] as const;
  }

  it('doubles every time, keeps every count and every clock of the log', async () => {
    await fc.assert(
      fc.asyncProperty(anyDesign, anyWork, fc.constantFrom('open', 'closed', 'paced'), async (design, work, replay) => {
        const [fast, slow] = twins(design);
        // times on a grid of clocks, so that no edge is a rounded one
        const rows = rowsOf(fast, work).map((row) => ({
          ...row,
          timePs: Math.round((row.timePs as number) / 1250) * 1250,
        }));
        const go = async (pkg: typeof fast, factor: number) => {
          const { all, collector } = finished();
          const scaled = rows.map((row) => ({ ...row, timePs: row.timePs * factor }));
          const { recording, commands } = await simulate(pkg, accessTrace(scaled, ['even', 'odd']), {
            replay,
            log: true,
            collectors: [collector],
          });
          // channels of one window are run one after the other: each in its own order
          const byChannel = [...commands].sort((x, y) => x.p - y.p || x.ck - y.ck);
          return { recording, commands: byChannel, all };
        };
        const a = await go(fast, 1);
        const b = await go(slow, 2);
        expect(b.recording.makespanPs).toBe(2 * a.recording.makespanPs);
        expect(b.commands).toEqual(a.commands);
        expect(b.all).toEqual(
          a.all.map((r) => ({ ...r, donePs: 2 * r.donePs, stages: r.stages.map((delay) => 2 * delay) })),
        );
        expect(b.recording.dram).toEqual(a.recording.dram);
        expect(b.recording.bandwidthStack).toEqual(a.recording.bandwidthStack);
        expect(b.recording.links).toEqual(a.recording.links);
      }),
      { seed: 42, numRuns: 30 },
    );
  });

  it('kernels too', async () => {
    const [fast, slow] = twins({ ...PLAIN, stacks: 2, eastStacks: 1 });
    const text =
      'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\n' +
      'k,main,bf16,3 MFLOP,64 KiB,32 KiB,uniform granule=64B span=1MiB,sequential,4 KiB\n' +
      'l,side,,0,32 KiB,0,sequential,,4 KiB\n';
    const a = (await simulate(fast, await kernelTrace(fast, text))).recording;
    const b = (await simulate(slow, await kernelTrace(slow, text))).recording;
    expect(b.makespanPs).toBe(2 * a.makespanPs);
    expect(b.kernels.map((k) => k.computePs)).toEqual(a.kernels.map((k) => 2 * k.computePs));
    expect(b.bandwidthStack).toEqual(a.bandwidthStack);
  });
});

// times are kept relative to an epoch; a data bus may be idle for longer than such a time reaches (0.34 s)
it.each([0.5, 7])('a trace may start %d s late: the bandwidth stack still adds up', async (seconds) => {
  const pkg = smallPackage();
  const start = seconds * 1e12;
  const rows: Row[] = [{ op: 'R', address: 0, bytes: 32, timePs: start }];
  const { recording } = await simulate(pkg, accessTrace(rows), { replay: 'open' });
  everyClockIsAccountedFor(pkg, recording);
  expect(recording.kernels[0].startPs).toBeGreaterThanOrEqual(start);
  expect(recording.makespanPs).toBeLessThan(start + 200_000);
});
