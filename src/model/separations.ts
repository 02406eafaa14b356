import type { MemoryGroup, TimingName } from '../config/package.js';

/**
 * The timing rules as the engine uses them: every separation in half clocks, counted from the first clock edge of one command
 * to the first clock edge of the next. This is the only place that turns JEDEC names into command-to-command separations.
 */
export interface Separations {
  readonly tRC: number;
  readonly tRAS: number;
  readonly tRP: number;
  readonly actToRead: number; // tRCDRD
  readonly actToWrite: number; // tRCDWR
  readonly readToPre: number; // tRTP
  readonly writeToPre: number; // WL + burst + tWR
  readonly preToPre: number; // tPPD, same pseudo-channel
  readonly faw: number; // tFAW: first to fifth ACT
  readonly refreshAll: number; // tRFCab
  readonly refreshBank: number; // tRFCpb
  readonly refreshBankToNext: number; // tRREFD: to the next REFpb, or to an ACT elsewhere
  readonly refreshInterval: number; // tREFI
  readonly readLatency: number; // RL: RD to its first data clock
  readonly writeLatency: number; // WL
  readonly burst: number; // data bus clocks of one atom
  readonly readToWrite: number; // RL + burst - WL + bus turnaround
  readonly writeToReadShort: number; // WL + burst + tWTR_S
  readonly writeToReadLong: number; // WL + burst + tWTR_L, same bank group
  /** column[group * groups + nextGroup]: tCCD_L, tCCD_S or tCCD_R between column commands of one kind. */
  readonly column: Int32Array;
  /** act[group * groups + nextGroup]: tRRD_L or tRRD_S; 0 where the device's window does not reach across stack IDs. */
  readonly act: Int32Array;
  /** 1 where an ACT in `group` counts in the activate window of `nextGroup`, same index as `act`. */
  readonly windowShared: Uint8Array;
}

export function separationsOf(memory: MemoryGroup): Separations {
  const { organisation: o, timings } = memory;
  const half = (name: TimingName): number => 2 * timings[name].ck;
  const burst = 2 * o.burst_ck;
  const groups = o.sids * o.bank_groups;
  const sidOf = (group: number): number => Math.floor(group / o.bank_groups);
  const column = new Int32Array(groups * groups);
  const act = new Int32Array(groups * groups);
  const windowShared = new Uint8Array(groups * groups);
  for (let from = 0; from < groups; from++) {
    for (let to = 0; to < groups; to++) {
      const sameSid = sidOf(from) === sidOf(to);
      column[from * groups + to] = from === to ? half('tCCD_L') : sameSid ? half('tCCD_S') : half('tCCD_R');
      const reaches = sameSid || memory.activateWindowScope === 'pseudo_channel';
      act[from * groups + to] = from === to ? half('tRRD_L') : reaches ? half('tRRD_S') : 0;
      windowShared[from * groups + to] = reaches ? 1 : 0;
    }
  }
  return {
    tRC: half('tRC'),
    tRAS: half('tRAS'),
    tRP: half('tRP'),
    actToRead: half('tRCDRD'),
    actToWrite: half('tRCDWR'),
    readToPre: half('tRTP'),
    writeToPre: half('WL') + burst + half('tWR'),
    preToPre: half('tPPD'),
    faw: half('tFAW'),
    refreshAll: half('tRFCab'),
    refreshBank: half('tRFCpb'),
    refreshBankToNext: half('tRREFD'),
    refreshInterval: half('tREFI'),
    readLatency: half('RL'),
    writeLatency: half('WL'),
    burst,
    readToWrite: half('RL') + burst - half('WL') + half('tRTW'),
    writeToReadShort: half('WL') + burst + half('tWTR_S'),
    writeToReadLong: half('WL') + burst + half('tWTR_L'),
    column,
    act,
    windowShared,
  };
}
