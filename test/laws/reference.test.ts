import { expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { STACK_CLASSES, type StackClass } from '../../src/engine/index.js';
import { stream } from '../../src/random.js';
import { accessTrace, placer, type Row, type Sample, simulate, sum } from '../helpers/engine.js';
import { lonePackage } from '../helpers/packages.js';

/*
 * A second simulator, slow and plain, for the one case that needs no queueing: an engine with a window of one reads atom after
 * atom from one pseudo-channel, rows stay open, nothing is refreshed. Each latency follows from the constants of the package and
 * the rules between PRE, ACT and RD. It shares no code with the engine but the package's values.
 */

interface Step {
  readonly sid: number;
  readonly bankGroup: number;
  readonly bank: number;
  readonly row: number;
  readonly column: number;
}

type Expected = Pick<
  Sample,
  | 'window_wait'
  | 'down_link_queue'
  | 'down_link_transit'
  | 'controller_queue'
  | 'bank_preparation'
  | 'data_transfer'
  | 'up_link_queue'
  | 'up_link_transit'
  | 'donePs'
>;

interface Reference {
  readonly reads: Expected[];
  waitingCk: number; // from arrival to the column command, all reads together
  rowCycleCk: number; // the part of it that the bank's own PRE, ACT, tRAS and tRC would have taken alone
}

function reference(pkg: Package, steps: readonly Step[]): Reference {
  const [{ clockPs, timings, organisation, baseDie, buses }] = pkg.memory;
  const [link] = pkg.links;
  const [die] = pkg.dies;
  const t = (name: keyof typeof timings): number => timings[name].ck;
  // times below are clocks; a time on the row bus may end in .5
  const key = (s: Step): string => `${s.sid} ${s.bankGroup} ${s.bank}`;
  const open = new Map<string, number>();
  const lastAct = new Map<string, number>();
  const lastPre = new Map<string, number>();
  const lastRead = new Map<string, number>();
  const acts: { at: number; step: Step }[] = [];
  const reads: { at: number; step: Step }[] = [];
  let rowBus = 0; // free from
  let anyPre = Number.NEGATIVE_INFINITY;
  const edge = (ps: number): number => {
    // the engine's clock edges are at whole picoseconds, rounded up
    let k = Math.floor(ps / die.clockPs) - 1;
    while (Math.ceil(k * die.clockPs - 1e-6) < ps) k++;
    return Math.ceil(k * die.clockPs - 1e-6);
  };
  const ps = (ck: number): number => Math.ceil(ck * clockPs - 1e-6);

  const out: Reference = { reads: [], waitingCk: 0, rowCycleCk: 0 };
  let issue = 0;
  let ready = 0;
  for (const step of steps) {
    const bank = key(step);
    const linkDone = Math.ceil(issue + link.flitPs); // one flit, the link is idle
    const arrive = Math.ceil((linkDone + link.latencyPs + baseDie.ingressPs) / clockPs - 1e-9);

    let first = -1; // first command
    let rowReady = 0; // when the column could go for the bank's sake alone
    const free = (at: number): number => Math.max(at, rowBus, arrive);
    if (open.has(bank) && open.get(bank) !== step.row) {
      const pre = free(
        Math.max(
          (lastAct.get(bank) as number) + t('tRAS'),
          (lastRead.get(bank) as number) + t('tRTP'),
          anyPre + t('tPPD'),
        ),
      );
      rowBus = pre + buses.preHalfCk / 2;
      lastPre.set(bank, pre);
      anyPre = pre;
      open.delete(bank);
      first = pre;
    }
    if (!open.has(bank)) {
      let act = arrive;
      if (lastPre.has(bank)) act = Math.max(act, (lastPre.get(bank) as number) + t('tRP'));
      if (lastAct.has(bank)) act = Math.max(act, (lastAct.get(bank) as number) + t('tRC'));
      rowReady = act + t('tRCDRD');
      for (const { at, step: other } of acts) {
        const same = other.sid === step.sid && other.bankGroup === step.bankGroup;
        act = Math.max(act, at + (same ? t('tRRD_L') : t('tRRD_S')));
      }
      if (acts.length >= 4) act = Math.max(act, acts[acts.length - 4].at + t('tFAW'));
      act = free(act);
      rowBus = act + buses.actHalfCk / 2;
      acts.push({ at: act, step });
      lastAct.set(bank, act);
      open.set(bank, step.row);
      if (first < 0) first = act;
    }
    let read = Math.max(arrive, (lastAct.get(bank) as number) + t('tRCDRD'));
    for (const { at, step: other } of reads) {
      const same = other.sid === step.sid && other.bankGroup === step.bankGroup;
      read = Math.max(read, at + (same ? t('tCCD_L') : other.sid === step.sid ? t('tCCD_S') : t('tCCD_R')));
    }
    read = Math.ceil(read); // column commands start on whole clocks
    reads.push({ at: read, step });
    lastRead.set(bank, read);
    if (first < 0) first = read;
    const dataEnd = ps(read + t('RL') + organisation.burst_ck);
    const up = dataEnd + baseDie.egressPs;
    const back = Math.ceil(up + link.flitPs) + link.latencyPs;
    const done = edge(back);
    const waited = read - arrive;
    out.waitingCk += waited;
    out.rowCycleCk += waited - Math.min(waited, Math.max(0, Math.floor(read - rowReady)));
    out.reads.push({
      window_wait: issue - ready,
      down_link_queue: 0,
      down_link_transit: ps(arrive) - issue,
      controller_queue: ps(first) - ps(arrive),
      bank_preparation: ps(read) - ps(first),
      data_transfer: dataEnd - ps(read),
      up_link_queue: 0,
      up_link_transit: done - dataEnd,
      donePs: done,
    });
    // the engine looks for its next request at the edge at which the answer is there; it was ready since its last issue slot
    ready = issue + Math.floor(die.clockPs);
    issue = done;
  }
  return out;
}

const VARIANTS: readonly (readonly string[])[] = [
  [],
  ['memory.0.controller.scheduler=fcfs'],
  ['compute.0.clock=1.3 GHz'],
  ['memory.0.clock=1.4 GHz', 'links.0.rate=12 GT/s', 'links.0.latency=7 ns'],
  [
    'memory.0.timings={ tRC: 300 ck, tRRD_S: 90 ck, tRRD_L: 120 ck, tFAW: 700 ck, tPPD: 31 ck, tRTP: 95 ck, tCCD_L: 140 ck, tCCD_R: 130 ck }',
  ],
];

/** The engine's and the reference's answer to the same random reads, few banks and rows so that hits, misses and conflicts are many. */
async function both(overrides: readonly string[], seed: number) {
  const pkg = lonePackage('compute.0.engines=1', 'compute.0.window=1', ...overrides);
  const address = placer(pkg);
  const random = stream('reference', seed);
  const pick = (n: number): number => Math.floor(random() * n);
  const steps = Array.from({ length: 400 }, (): Step => {
    return { sid: pick(2), bankGroup: pick(4), bank: pick(2), row: pick(seed), column: pick(32) };
  });
  const rows = steps.map((step): Row => ({ op: 'R', address: address(step), bytes: 1 + pick(32) }));
  const { samples, recording } = await simulate(pkg, accessTrace(rows), { keepSamples: true });
  return { samples, recording, expected: reference(pkg, steps) };
}

const cases = VARIANTS.map((overrides) => [overrides] as const);

it.each(cases)('reads one at a time take what the rules say: %j', async (overrides) => {
  for (const seed of [1, 2, 3]) {
    const { samples, expected } = await both(overrides, seed);
    expect(samples).toHaveLength(expected.reads.length);
    samples.forEach(({ op, bytes, ...sample }, i) => {
      expect({ i, ...sample }).toEqual({ i, ...expected.reads[i] });
    });
  }
});

// an ACT is wanted when its request has come, however long the bank had been closed before
it.each(cases)('the bandwidth stack says what they waited for: %j', async (overrides) => {
  for (const seed of [1, 2, 3]) {
    const { recording, expected } = await both(overrides, seed);
    const stack = (name: StackClass): number => recording.bandwidthStack[STACK_CLASSES.indexOf(name)];
    expect(stack('row_cycle')).toBe(expected.rowCycleCk);
    const waits = ['row_cycle', 'activate_window', 'column_gap', 'command_bus', 'turnaround'] as const;
    expect(sum(waits.map(stack))).toBe(expected.waitingCk);
    const starved = STACK_CLASSES.filter((name) => name.startsWith('starved')).map(stack);
    expect(sum(starved)).toBe(recording.elapsedCk - expected.waitingCk - stack('read_data'));
  }
});
