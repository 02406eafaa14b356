import fc from 'fast-check';
import { expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import type { Trace } from '../../src/trace/batch.js';
import { accessTrace, kernelTrace, type LoggedCommand, type Outcome, simulate } from '../helpers/engine.js';
import { everyClockIsAccountedFor } from './accounts.js';
import { anyDesign, anyReplay, anyWork, build, type Design, finished, PLAIN, REFRESHES, rowsOf } from './cases.js';

/*
 * The engine goes forward in windows; how long they are must not show, nor what ran before. And on each of these runs the
 * bandwidth stack must account for every clock.
 */

type Wishes = NonNullable<Parameters<typeof simulate>[2]>;

async function everything(pkg: Package, trace: Trace, wishes: Wishes) {
  const { all, collector } = finished();
  const { recording, commands } = await simulate(pkg, trace, { ...wishes, log: true, collectors: [collector] });
  // channels run one after the other within a window, so only each channel's own order is promised
  const { organisation: o } = pkg.memory[0];
  const byChannel: LoggedCommand[][] = Array.from({ length: o.stacks * o.channels }, () => []);
  for (const command of commands) byChannel[Math.floor(command.p / o.pseudo_channels)].push(command);
  return { recording, commands: byChannel, samples: all };
}

/** The longest window the engine takes: from a request's sending to the earliest moment an answer can be back, ps. */
function roundTripPs(pkg: Package): number {
  const { baseDie } = pkg.memory[0];
  return Math.min(...pkg.links.map((l) => l.flitPs + 2 * l.latencyPs)) + baseDie.ingressPs + baseDie.egressPs;
}

async function sameInAnyWindow(
  pkg: Package,
  trace: () => Trace | Promise<Trace>,
  wishes: Wishes,
): Promise<Outcome['recording']> {
  const whole = await everything(pkg, await trace(), wishes);
  const trip = roundTripPs(pkg);
  for (const windowPs of [trip / 2, trip / 5, 2 * pkg.memory[0].clockPs]) {
    const cut = await everything(pkg, await trace(), { ...wishes, windowPs });
    expect(cut.commands).toEqual(whole.commands);
    expect(cut.samples).toEqual(whole.samples);
    expect(cut.recording).toEqual(whole.recording);
  }
  for (const log of whole.commands) {
    for (let i = 1; i < log.length; i++) expect(log[i].ck).toBeGreaterThanOrEqual(log[i - 1].ck);
  }
  everyClockIsAccountedFor(pkg, whole.recording);
  return whole.recording;
}

it('windows of any length give the same commands, samples and counters (access traces)', async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, anyReplay, async (design, work, replay) => {
      const pkg = build(design);
      const rows = rowsOf(pkg, work);
      await sameInAnyWindow(pkg, () => accessTrace(rows, ['even', 'odd']), { replay });
    }),
    { seed: 7, numRuns: 50 },
  );
});

const KERNELS = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat
copy,main,,0,24 KiB,24 KiB,sequential,sequential,4 KiB,2
product,main,bf16,1 MFLOP,24 KiB,8 KiB,block rows=16 width=256B pitch=4KiB,strided stride=8KiB granule=64B,4 KiB,1
gather,side,,0,12 KiB,4 KiB,uniform granule=64B span=1MiB,sequential,4 KiB,1
skewed,side,,0,8 KiB,8 KiB,zipf s=1.1 granule=128B span=1MiB,sequential,4 KiB,1
strides,main,,0,16 KiB,0,strided stride=2KiB granule=512B,,4 KiB,1
list,third,,0,1 KiB,0,chase granule=64B span=1MiB,,512 B,1
`;

it('windows of any length give the same result (kernels, every kind of refresh)', async () => {
  for (const refresh of REFRESHES)
    for (const eastStacks of [0, 1]) {
      for (const page of ['open', 'closed', 'timeout'] as const) {
        const pkg = build({ ...PLAIN, refresh, page, eastStacks, queue: 8 });
        await sameInAnyWindow(pkg, () => kernelTrace(pkg, KERNELS), {});
      }
    }
});

it('a run leaves nothing behind: again, and after a run of another package, all is the same', async () => {
  const small: Design = { ...PLAIN, refresh: REFRESHES[4], page: 'timeout', queue: 8 };
  const large: Design = {
    ...PLAIN,
    stacks: 3,
    eastStacks: 2,
    channels: 3,
    refresh: REFRESHES[3],
    page: 'closed',
    device: 'hbm2-1.8',
  };
  const work = {
    pattern: 'uniform',
    rows: 1500,
    writes: 0.4,
    size: 0,
    gapPs: 1000,
    after: true,
    tiles: false,
    seed: 3,
  } as const;
  const go = (design: Design) => {
    const pkg = build(design);
    return everything(pkg, accessTrace(rowsOf(pkg, work), ['even', 'odd']), { replay: 'open' });
  };
  const first = await go(small);
  const again = await go(small);
  const other = await go(large);
  const cutPkg = build(large);
  await simulate(cutPkg, accessTrace(rowsOf(cutPkg, work), ['even', 'odd']), { untilPs: 200_000 }); // left in the middle
  const third = await go(small);
  const otherAgain = await go(large);
  expect(again).toEqual(first);
  expect(third).toEqual(first);
  expect(otherAgain).toEqual(other);
});

it('the bandwidth stack and its cost can be left out without any other difference', async () => {
  const pkg = build({ ...PLAIN, refresh: REFRESHES[5] });
  const work = {
    pattern: 'zipf',
    rows: 1000,
    writes: 0.4,
    size: 0,
    gapPs: 1000,
    after: false,
    tiles: true,
    seed: 4,
  } as const;
  const trace = () => accessTrace(rowsOf(pkg, work), ['even', 'odd']);
  const withStack = await everything(pkg, trace(), {});
  const without = await everything(pkg, trace(), { attribution: false });
  expect(without.commands).toEqual(withStack.commands);
  expect(without.samples).toEqual(withStack.samples);
  expect(without.recording.dram).toEqual(withStack.recording.dram);
});
