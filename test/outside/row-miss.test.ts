import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { accessTrace, type LoggedCommand, placer, type Row, simulate } from '../helpers/engine.js';
import { lone, only, rate } from '../helpers/outside.js';

/*
 * Ceilings that follow from the timing rules alone: banks / tRC, 4 / tFAW, one bank, one bank group (JEDEC's rules; the
 * arithmetic is that of any DRAM text), and the slots of HBM's row bus (JESD238 section 3.1.3, through a cross-standard digest).
 * Each pattern is made to meet one ceiling and no other.
 *
 * Tolerance, chosen beforehand: a good schedule comes within 5 % from below, over the middle of the run. From above there is none:
 * wherever one looks, `group` commands after another take group / ceiling clocks or more.
 */
const LEAST = 0.95;
const MANY = 12_000;

type Place = Parameters<ReturnType<typeof placer>>[0];

/** When the commands of some kinds went, for 32 B reads at the places given. */
async function reads(pkg: Package, place: (i: number) => Place, ...names: string[]): Promise<LoggedCommand[]> {
  const address = placer(pkg);
  function* rows(): Generator<Row> {
    for (let i = 0; i < MANY; i++) yield { op: 'R', address: address(place(i)), bytes: 32 };
  }
  const { commands } = await simulate(pkg, accessTrace(rows()), { log: true });
  const counted = only(commands, ...names);
  expect(counted.length).toBe(MANY);
  return counted;
}

/** `group` commands a `clocks`: approached, never exceeded. */
function meets(log: readonly LoggedCommand[], group: number, clocks: number): void {
  let closest = Number.POSITIVE_INFINITY;
  for (let i = group; i < log.length; i++) closest = Math.min(closest, log[i].ck - log[i - group].ck);
  expect(closest).toBeGreaterThanOrEqual(clocks);
  expect(rate(log) / (group / clocks)).toBeGreaterThanOrEqual(LEAST);
}

describe.each(['hbm3-6.4', 'hbm2-1.8'] as const)('%s, refresh off', (device) => {
  const { timings } = lone(device).memory[0];
  const ck = (name: keyof typeof timings): number => timings[name].ck;
  const banks = 16; // of one stack ID

  // every read its own row; neighbours in different bank groups
  const scattered = (i: number): Place => ({ bankGroup: i & 3, bank: (i >> 2) & 3, row: (i >> 4) & 16383 });

  it('ever new rows over all banks: 4 / tFAW', async () => {
    expect(4 / ck('tFAW')).toBeLessThan(banks / ck('tRC')); // the window is what holds here
    // where four tRRD_S are longer than the window (HBM2: 16 of 15 ck) they are the ceiling; so tRRD is set out of the way
    const pkg = lone(device, 'memory.0.timings={ tRRD_S: 2 ck, tRRD_L: 2 ck }');
    meets(await reads(pkg, scattered, 'ACT'), 4, ck('tFAW'));
  });

  it('as the preset is: 4 / tFAW or 1 / tRRD_S, whichever is less', async () => {
    meets(await reads(lone(device), scattered, 'ACT'), 4, Math.max(ck('tFAW'), 4 * ck('tRRD_S')));
  });

  it('ever new rows over all banks, a short activate window: banks / tRC', async () => {
    const pkg = lone(
      device,
      'memory.0.timings={ tFAW: 4 ck, tRRD_S: 1 ck, tRRD_L: 1 ck, tCCD_L: 2 ck }',
      'memory.0.controller.page=closed', // precharges of their own would fill HBM2's row bus: 16 x (2 + 1) ck of a tRC of 44
    );
    meets(await reads(pkg, scattered, 'ACT'), banks, ck('tRC'));
  });

  it('ever new rows of one bank: one a tRC', async () => {
    meets(await reads(lone(device), (i) => ({ row: i & 16383 }), 'ACT'), 1, ck('tRC'));
  });

  it('open rows of one bank group: one column command a tCCD_L, half the peak', async () => {
    expect(ck('tCCD_S') / ck('tCCD_L')).toBe(1 / 2);
    expect(ck('tCCD_S')).toBe(lone(device).memory[0].organisation.burst_ck); // so that tCCD_S is the peak
    meets(await reads(lone(device), (i) => ({ row: 5, column: i & 31, bank: (i >> 5) & 3 }), 'RD'), 1, ck('tCCD_L'));
  });
});

/*
 * The row bus is shared by a channel's pseudo-channels. HBM3: 1.5 ck an ACT, at 1.6 GHz at most 1067 million a second and channel.
 * HBM2: two clocks, from memory, 450 million at 900 MHz.
 */
describe.each([
  { device: 'hbm3-6.4', slot: 1.5, millions: 1067 },
  { device: 'hbm2-1.8', slot: 2, millions: 450 },
] as const)('row bus of $device', ({ device, slot, millions }) => {
  it(`${millions} M ACT/s a channel`, async () => {
    const pkg = lone(
      device,
      // a data bus of twice the speed, so that it does not hold; rows closed by the reads, since a precharge takes the row bus too
      'memory.0.organisation={ channels: 1, pseudo_channels: 2, burst_ck: 1 }',
      'memory.0.controller.page=closed',
      'memory.0.timings={ tFAW: 4 ck, tRRD_S: 1 ck, tRRD_L: 1 ck, tCCD_L: 1 ck, tCCD_S: 1 ck, tRC: 20 ck, tRAS: 10 ck, tRP: 8 ck, tRTP: 2 ck, tRCDRD: 8 ck }',
      'address_map.interleave=[pseudo_channel, channel, stack]',
    );
    const place = (i: number): Place => ({
      p: i & 1,
      bankGroup: (i >> 1) & 3,
      bank: (i >> 3) & 3,
      row: (i >> 5) & 16383,
    });
    const log = await reads(pkg, place, 'ACT');
    meets(log, 1, slot);
    const perMicrosecond = 1e6 / pkg.memory[0].clockPs; // clocks
    expect(perMicrosecond / slot).toBeCloseTo(millions, 0);
    expect(rate(log) * perMicrosecond).toBeGreaterThanOrEqual(LEAST * millions);
    expect(new Set(log.map((c) => c.p)).size).toBe(2);
  });
});
