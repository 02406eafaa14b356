import { expect, it } from 'vitest';
import { type AuditReport, COMMANDS, createAudit, RULE_NAMES, type RuleName } from '../../src/audit/index.js';
import type { MemoryGroup, Package, TimingName } from '../../src/config/package.js';
import { accessTrace, type LoggedCommand as Logged, simulate } from '../helpers/engine.js';
import { build, type Design, PLAIN, rowsOf } from './cases.js';

/*
 * One violation of every rule, planted in logs of real runs on HBM3, which are clean before. For a separation, a pair of commands
 * that stand exactly as far apart as they must is looked for by auditing with a device that asks for a little more; in the true
 * device's log the later one is then moved one step sooner. So every one of these rules is also seen to bind: no slack is lost.
 */

interface Run {
  readonly pkg: Package;
  readonly log: readonly Logged[]; // in the order written
  readonly endCk: number;
}

async function runOf(design: Partial<Design>, ...overrides: string[]): Promise<Run> {
  const pkg = build({ ...PLAIN, queue: 32, window: 64, channels: 1, ...design }, ...overrides);
  const rows = rowsOf(pkg, {
    pattern: 'uniform',
    rows: 3000,
    writes: 0.4,
    size: 64,
    gapPs: 0,
    after: false,
    tiles: false,
    seed: 3,
  });
  const { commands, recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), { log: true });
  return { pkg, log: commands, endCk: recording.elapsedCk };
}

const ALL_BANK = 'mode: all-bank, postpone: 1, pull_in: 0';
const runs = {
  open: await runOf({ refresh: ALL_BANK }),
  patient: await runOf({ refresh: 'mode: all-bank, postpone: 2, pull_in: 0' }),
  closed: await runOf({ refresh: ALL_BANK, page: 'closed' }),
  perBank: await runOf({ refresh: 'mode: per-bank, postpone: 1' }),
  longRow: await runOf({ refresh: ALL_BANK }, 'memory.0.timings.tRC=80 ck'), // the preset's is tRAS + tRP less a clock
  oneBus: await runOf({ refresh: ALL_BANK }, 'memory.0.command_buses.separate=false'),
};
const RUNS = Object.values(runs);

/** Audits commands that stand on lines 2, 3, ... in the order given. */
function audit(pkg: Package, log: readonly Logged[], endCk?: number): AuditReport {
  const { organisation: o } = pkg.memory[0];
  const checker = createAudit(pkg);
  for (const c of log) {
    const channel = Math.floor(c.p / o.pseudo_channels);
    checker.command(
      2 * c.ck,
      Math.floor(channel / o.channels),
      channel % o.channels,
      c.p % o.pseudo_channels,
      c.sid,
      c.bankGroup,
      c.bank,
      c.row,
      c.column,
      COMMANDS.indexOf(c.command),
      c.request,
    );
  }
  return checker.finish(endCk === undefined ? undefined : 2 * endCk);
}

it('the logs are clean as they are', () => {
  for (const { pkg, log, endCk } of RUNS) {
    expect(log.length).toBeGreaterThan(8000);
    expect(audit(pkg, log, endCk)).toMatchObject({ ok: true, violations: 0 });
  }
});

/** The package with its memory changed, past the checks of package files. */
function changed({ pkg }: Run, change: (memory: MemoryGroup) => Partial<MemoryGroup>): Package {
  return { ...pkg, memory: [{ ...pkg.memory[0], ...change(pkg.memory[0]) }] };
}

const longer =
  (name: TimingName) =>
  ({ timings }: MemoryGroup): Partial<MemoryGroup> => ({
    timings: { ...timings, [name]: { ...timings[name], ck: timings[name].ck + 1 } },
  });
const longerOn =
  (bus: 'actHalfCk' | 'columnHalfCk') =>
  ({ buses }: MemoryGroup): Partial<MemoryGroup> => ({ buses: { ...buses, [bus]: buses[bus] + 1 } });

/** A device that asks for more, by the rule that then finds commands too near. */
const STRICTER: Partial<Record<RuleName, (memory: MemoryGroup) => Partial<MemoryGroup>>> = {
  tRC: longer('tRC'),
  tRAS: longer('tRAS'),
  tRP: longer('tRP'),
  'own precharge': longer('tRP'),
  tRCDRD: longer('tRCDRD'),
  tRCDWR: longer('tRCDWR'),
  tRTP: longer('tRTP'),
  tWR: longer('tWR'),
  tRRD_L: longer('tRRD_L'),
  tRRD_S: longer('tRRD_S'),
  tFAW: longer('tFAW'),
  tCCD_L: longer('tCCD_L'),
  tCCD_S: longer('tCCD_S'),
  tCCD_R: longer('tCCD_R'),
  tRTW: longer('tRTW'),
  tWTR_L: longer('tWTR_L'),
  tWTR_S: longer('tWTR_S'),
  tPPD: longer('tPPD'),
  tRFCab: longer('tRFCab'),
  tRFCpb: longer('tRFCpb'),
  tRREFD: longer('tRREFD'),
  'row bus': longerOn('actHalfCk'),
  'column bus': longerOn('columnHalfCk'),
  'command bus': longerOn('columnHalfCk'),
  'data bus': ({ organisation }) => ({ organisation: { ...organisation, burst_ck: organisation.burst_ck + 1 } }),
};

const isColumn = (c: Logged): boolean => /^(RD|WR)/.test(c.command);

it.each(Object.entries(STRICTER) as [RuleName, (memory: MemoryGroup) => Partial<MemoryGroup>][])(
  '%s binds, and a command one step sooner is found out',
  (rule, stricter) => {
    for (const run of RUNS) {
      const tight = audit(changed(run, stricter), run.log).kept.flatMap(({ rule: name, command, earlier, ...v }) => {
        const slack = (v.found_ck ?? 0) - (v.required_ck ?? 0) + (/bus/.test(name) && name !== 'data bus' ? 0.5 : 1);
        return name === rule && command !== null && earlier !== null && slack === 0 ? [{ command, earlier }] : [];
      });
      if (tight.length === 0) continue;
      const [{ command, earlier }] = tight;
      const late = command.line - 2;
      const moved = { ...run.log[late], ck: run.log[late].ck - (isColumn(run.log[late]) ? 1 : 0.5) };
      // logs are in order of time: it goes before those of its channel that it now precedes
      const rest = run.log.toSpliced(late, 1);
      const before = rest.findIndex((c, i) => i >= earlier.line - 1 && c.ck > moved.ck);
      const log = rest.toSpliced(before < 0 ? late : Math.min(before, late), 0, moved);
      const found = audit(run.pkg, log).kept.find((v) => v.rule === rule && v.command?.line === log.indexOf(moved) + 2);
      expect(found).toMatchObject({ bound: 'at least', earlier: { ck: earlier.ck, command: earlier.command } });
      expect(found?.found_ck).toBeLessThan(found?.required_ck as number);
      return;
    }
    throw new Error(`no two commands of any log are ${rule} apart`);
  },
);

/** What is not a separation: an edit of a log, and the rule it breaks. */
const EDITS: Partial<Record<RuleName, () => AuditReport>> = {
  'open row': () => without(runs.open, (c, i, log) => c.command === 'PRE' && next(log, i)?.command === 'ACT'),
  'no open row': () => without(runs.open, (c, i, log) => c.command === 'ACT' && next(log, i)?.command === 'RD'),
  'other row': () =>
    edited(
      runs.open,
      (c) => c.command === 'WR',
      (c) => ({ ...c, row: c.row ^ 1 }),
    ),
  'clock edge': () =>
    edited(
      runs.open,
      (c) => c.command === 'RD',
      (c) => ({ ...c, ck: c.ck + 0.5 }),
    ),
  'address range': () =>
    edited(
      runs.open,
      (c) => c.command === 'ACT',
      (c) => ({ ...c, row: 16384 }),
    ),
  'time order': () =>
    edited(
      runs.open,
      (c, i) => i > 100 && c.command === 'RD',
      (c) => ({ ...c, ck: c.ck - 200 }),
    ),
  'refresh order': () =>
    edited(
      runs.perBank,
      (c, i, log) =>
        c.command === 'REFpb' && log.slice(0, i).some((b) => b.command === 'REFpb' && b.p === c.p && b.sid === c.sid),
      (c, i, log) => {
        const before = log
          .slice(0, i)
          .filter((b) => b.command === 'REFpb' && b.p === c.p && b.sid === c.sid)
          .at(-1) as Logged;
        return { ...c, bankGroup: before.bankGroup, bank: before.bank };
      },
    ),
  // two refreshes of a pseudo-channel left out in a row: more than (1 + 1) x tREFI go by
  'refresh gap': () => fewer(runs.open, 2, 3),
  // every second one left out: no gap is longer than (2 + 1) x tREFI, but ever more are owed
  'refresh owed': () => fewer(runs.patient, 1, 3),
  'refresh ahead': () => {
    const first = runs.open.log.findIndex((c) => c.command === 'REFab');
    const again = { ...runs.open.log[first] };
    return audit(runs.open.pkg, runs.open.log.toSpliced(first + 1, 0, { ...again, ck: again.ck + 0.5 }));
  },
};

type Test = (c: Logged, i: number, log: readonly Logged[]) => boolean;

/** The next command of the same bank. */
const next = (log: readonly Logged[], i: number): Logged | undefined => {
  const { p, sid, bankGroup, bank } = log[i];
  return log.find((c, j) => j > i && c.p === p && c.sid === sid && c.bankGroup === bankGroup && c.bank === bank);
};

function without({ pkg, log }: Run, which: Test): AuditReport {
  const at = log.findIndex(which);
  expect(at).toBeGreaterThanOrEqual(0);
  return audit(pkg, log.toSpliced(at, 1));
}

function edited(
  { pkg, log }: Run,
  which: Test,
  change: (c: Logged, i: number, log: readonly Logged[]) => Logged,
): AuditReport {
  const at = log.findIndex(which);
  expect(at).toBeGreaterThanOrEqual(0);
  return audit(pkg, log.with(at, change(log[at], at, log)));
}

/** The log without these refreshes of pseudo-channel 0, counted from 0. */
function fewer({ pkg, log, endCk }: Run, ...which: number[]): AuditReport {
  const refreshes = log.filter((c) => c.p === 0 && c.command === 'REFab');
  const gone = which.map((i) => refreshes[i]);
  expect(gone).not.toContain(undefined);
  return audit(
    pkg,
    log.filter((c) => !gone.includes(c)),
    endCk,
  );
}

it.each(Object.entries(EDITS))('%s, planted', (rule, report) => {
  const { ok, kept } = report();
  expect(ok).toBe(false);
  expect(kept.map((v) => v.rule)).toContain(rule);
});

it('every rule of the audit is among them', () => {
  expect([...Object.keys(STRICTER), ...Object.keys(EDITS)].sort()).toEqual([...RULE_NAMES].sort());
});
