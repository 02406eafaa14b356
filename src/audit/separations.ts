import type { MemoryGroup } from '../config/package.js';
import type { Kind } from './commands.js';
import type { RuleName } from './rule-names.js';

/** Whose earlier command counts, seen from the later one. Bank groups are those of one stack ID. */
export type Scope =
  | 'same bank'
  | 'other bank' // anywhere else in the pseudo-channel
  | 'same group'
  | 'other group' // of the same stack ID
  | 'other sid'
  | 'pseudo-channel';

/** The least time from the first clock edge of an earlier command to that of a later one. */
export interface Separation {
  readonly rule: RuleName;
  readonly from: readonly Kind[];
  readonly to: readonly Kind[];
  readonly scopes: readonly Scope[];
  readonly halfCk: number;
}

/** Every separation between two commands, named here and nowhere else. Those over more than two commands are in `limits`. */
export function separations(memory: MemoryGroup): readonly Separation[] {
  const t = clocks(memory);
  const burst = memory.organisation.burst_ck;
  const activation: Kind[] = memory.refresh.refpbInActivateWindow ? ['ACT', 'REFpb'] : ['ACT'];
  const elsewhere: Scope[] =
    memory.activateWindowScope === 'pseudo_channel' ? ['other group', 'other sid'] : ['other group'];
  const refresh: Kind[] = ['REFab', 'REFpb'];
  const any: Kind[] = ['ACT', 'RD', 'WR', 'PRE', 'REFab', 'REFpb'];
  const rows: [RuleName, Kind[], Kind[], Scope[], number][] = [
    // rule          from         to                     scope                         clocks
    ['tRC', ['ACT'], ['ACT', ...refresh], ['same bank'], t.tRC],
    ['tRAS', ['ACT'], ['PRE'], ['same bank'], t.tRAS],
    ['tRP', ['PRE'], ['ACT', ...refresh], ['same bank'], t.tRP],
    ['own precharge', ['OWN'], ['ACT', ...refresh], ['same bank'], t.tRP],
    ['tRCDRD', ['ACT'], ['RD'], ['same bank'], t.tRCDRD],
    ['tRCDWR', ['ACT'], ['WR'], ['same bank'], t.tRCDWR],
    ['tRTP', ['RD'], ['PRE'], ['same bank'], t.tRTP],
    ['tWR', ['WR'], ['PRE'], ['same bank'], t.WL + burst + t.tWR],
    ['tRRD_L', activation, activation, ['same group'], t.tRRD_L],
    ['tRRD_S', activation, activation, elsewhere, t.tRRD_S],
    ['tCCD_L', ['RD'], ['RD', 'WR'], ['same group'], t.tCCD_L],
    ['tCCD_S', ['RD'], ['RD', 'WR'], ['other group'], t.tCCD_S],
    ['tCCD_R', ['RD'], ['RD', 'WR'], ['other sid'], t.tCCD_R],
    ['tCCD_L', ['WR'], ['WR'], ['same group'], t.tCCD_L],
    ['tCCD_S', ['WR'], ['WR'], ['other group'], t.tCCD_S],
    ['tCCD_R', ['WR'], ['WR'], ['other sid'], t.tCCD_R],
    ['tRTW', ['RD'], ['WR'], ['pseudo-channel'], t.RL + burst - t.WL + t.tRTW],
    ['tWTR_L', ['WR'], ['RD'], ['same group'], t.WL + burst + t.tWTR_L],
    ['tWTR_S', ['WR'], ['RD'], ['other group', 'other sid'], t.WL + burst + t.tWTR_S],
    ['tPPD', ['PRE'], ['PRE'], ['pseudo-channel'], t.tPPD],
    ['tRFCab', ['REFab'], any, ['same bank'], t.tRFCab],
    ['tRFCpb', ['REFpb'], any, ['same bank'], t.tRFCpb],
    ['tRREFD', ['REFpb'], ['REFpb'], ['pseudo-channel'], t.tRREFD],
    ['tRREFD', ['REFpb'], ['ACT'], ['other bank'], t.tRREFD],
  ];
  return rows.map(([rule, from, to, scopes, ck]) => ({ rule, from, to, scopes, halfCk: 2 * ck }));
}

/** What is not a least time between two commands: windows, bus times, paces. Half clocks, and counts of refreshes. */
export interface Limits {
  readonly activateWindow: number; // from an activation to the fourth after it
  readonly act: number; // time a command holds its bus
  readonly pre: number;
  readonly ref: number;
  readonly column: number;
  readonly readData: number; // RD to the first bit of its data
  readonly writeData: number; // WR to the first bit of its data
  readonly burst: number;
  readonly rasMin: number; // ACT, RD and WR to an own precharge
  readonly readToPrecharge: number;
  readonly writeToPrecharge: number;
  readonly refreshInterval: number; // tREFI
  readonly postpone: number; // refreshes
  readonly pullIn: number; // refreshes
}

export function limits(memory: MemoryGroup): Limits {
  const t = clocks(memory);
  const { buses, refresh, organisation } = memory;
  const burst = organisation.burst_ck;
  return {
    activateWindow: 2 * t.tFAW,
    act: buses.actHalfCk,
    pre: buses.preHalfCk,
    ref: buses.refHalfCk,
    column: buses.columnHalfCk,
    readData: 2 * t.RL,
    writeData: 2 * t.WL,
    burst: 2 * burst,
    rasMin: 2 * t.tRAS,
    readToPrecharge: 2 * t.tRTP,
    writeToPrecharge: 2 * (t.WL + burst + t.tWR),
    refreshInterval: 2 * t.tREFI,
    postpone: refresh.postpone,
    pullIn: refresh.pullIn,
  };
}

/** The device's timings as plain clocks. */
function clocks({ timings }: MemoryGroup): Readonly<Record<keyof typeof timings, number>> {
  return Object.fromEntries(Object.entries(timings).map(([name, { ck }]) => [name, ck])) as Record<
    keyof typeof timings,
    number
  >;
}
