import { type AuditReport, COMMANDS, type CommandName, createAudit } from '../../src/audit/index.js';
import type { MemoryGroup, Package, TimingName } from '../../src/config/package.js';
import { TIMING_NAMES } from '../../src/config/package.js';

/** Small and all different, so that sums in tests say which values they are made of. */
export const CK: Readonly<Record<TimingName, number>> = {
  tRC: 31,
  tRAS: 20,
  tRP: 9,
  tRCDRD: 8,
  tRCDWR: 6,
  tRRD_S: 2,
  tRRD_L: 3,
  tFAW: 14,
  tRTP: 4,
  tWR: 7,
  tWTR_S: 3,
  tWTR_L: 5,
  tCCD_S: 2,
  tCCD_L: 4,
  tCCD_R: 3,
  tPPD: 2,
  tRTW: 2,
  tRFCab: 50,
  tRFCpb: 40,
  tREFI: 400,
  tRREFD: 10,
  RL: 9,
  WL: 5,
};
export const BURST = 2;

export interface Device {
  readonly timings?: Partial<Record<TimingName, number>>; // ck
  readonly organisation?: Partial<MemoryGroup['organisation']>;
  readonly buses?: Partial<MemoryGroup['buses']>;
  readonly refresh?: Partial<MemoryGroup['refresh']>;
  readonly activateWindowScope?: MemoryGroup['activateWindowScope'];
}

/** A package of which only what the audit reads is filled with care: one stack, 2 channels x 2 pseudo-channels x 2 SIDs x 2 x 2. */
export function device(change: Device = {}): Package {
  const clocks = { ...CK, ...change.timings };
  const timings = Object.fromEntries(
    TIMING_NAMES.map((name) => [name, { ck: clocks[name], ns: clocks[name], source: 'test' }]),
  ) as MemoryGroup['timings'];
  const memory: MemoryGroup = {
    name: 'memory',
    device: 'test',
    clockPs: 1000,
    peakBytesPerS: 64e9,
    organisation: {
      stacks: 1,
      channels: 2,
      pseudo_channels: 2,
      sids: 2,
      bank_groups: 2,
      banks_per_group: 2,
      rows: 16,
      columns: 8,
      burst_ck: BURST,
      atom_bytes: 32,
      ...change.organisation,
    },
    timings,
    activateWindowScope: change.activateWindowScope ?? 'pseudo_channel',
    buses: { separate: true, actHalfCk: 3, preHalfCk: 1, refHalfCk: 1, columnHalfCk: 2, ...change.buses },
    refresh: {
      mode: 'off',
      scope: 'pseudo_channel',
      postpone: 2,
      pullIn: 1,
      temperatureC: 70,
      refpbInActivateWindow: true,
      ...change.refresh,
    },
    controller: {
      readQueue: 8,
      writeQueue: 8,
      scheduler: 'fr-fcfs',
      hitCap: 4,
      ageBoundCk: 1000,
      page: 'open',
      pageTimeoutCk: 100,
      drainHigh: 6,
      drainLow: 2,
      pipelineCk: 4,
    },
    baseDie: { ingressPs: 0, egressPs: 0 },
    notes: [],
  };
  return {
    name: 'test',
    file: 'test.yaml',
    hash: '',
    caution: '',
    dies: [],
    memory: [memory],
    links: [],
    addressMap: { granuleBytes: 256, interleave: ['stack', 'channel'], rotate: false, fields: [], xor: [] },
  };
}

/** A command and its place; a bank is written sid.group.bank, as in '0.1.1'. */
export interface Command {
  readonly ck: number;
  readonly name: CommandName;
  readonly stack: number;
  readonly channel: number;
  readonly pc: number;
  readonly sid: number;
  readonly group: number;
  readonly bank: number;
  readonly row: number;
  readonly column: number;
}

export interface Elsewhere {
  readonly stack?: number;
  readonly channel?: number;
  readonly pc?: number;
  readonly row?: number;
  readonly column?: number;
}

/** One command. `at`: 'sid.group.bank', 'sid', or '' for the whole pseudo-channel. ACT opens row 1, columns are 0. */
export function cmd(ck: number, name: CommandName, at = '0.0.0', where: Elsewhere = {}): Command {
  const [sid = -1, group = -1, bank = -1] = at === '' ? [] : at.split('.').map(Number);
  const column = /^(RD|WR)/.test(name) ? 0 : -1;
  const row = name === 'ACT' ? 1 : -1;
  return { ck, name, stack: 0, channel: 0, pc: 0, sid, group, bank, row, column, ...where };
}

/** Audits a log whose commands stand on lines 2, 3, ... */
export function audit(pkg: Package, log: readonly Command[], endCk?: number): AuditReport {
  const checker = createAudit(pkg);
  for (const c of log) {
    checker.command(
      2 * c.ck,
      c.stack,
      c.channel,
      c.pc,
      c.sid,
      c.group,
      c.bank,
      c.row,
      c.column,
      COMMANDS.indexOf(c.name),
      -1,
    );
  }
  return checker.finish(endCk === undefined ? undefined : 2 * endCk);
}

/** The rules a log breaks and how often: {} for a clean one. */
export function broken(pkg: Package, log: readonly Command[], endCk?: number): Record<string, number> {
  const { rules } = audit(pkg, log, endCk);
  return Object.fromEntries(rules.filter((r) => r.violations > 0).map((r) => [r.rule, r.violations]));
}
