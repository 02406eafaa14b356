import { RULE_NAMES } from '../../src/audit/index.js';
import type { MemoryGroup, Package } from '../../src/config/package.js';
import type { Command } from './build.js';

/**
 * The rules read once more, with no thought for speed: every command is held against every one before it, and the state of a bank
 * is found by going through the log from its beginning. Logs must be in order of time.
 */
export interface Broken {
  readonly rule: string;
  readonly line: number;
  readonly bound: number | null; // ck at which the command would have been right
}

export function naiveAudit(pkg: Package, log: readonly Command[]): Broken[] {
  const [memory] = pkg.memory;
  return log.flatMap((_, j) => {
    const worst = new Map<string, number | null>();
    for (const [rule, bound] of demands(memory, log.slice(0, j + 1))) {
      const before = worst.get(rule);
      if (before === undefined || (before !== null && bound !== null && bound > before)) worst.set(rule, bound);
    }
    return [...worst]
      .map(([rule, bound]) => ({ rule, line: j + 2, bound }))
      .sort((a, b) => RULE_NAMES.indexOf(a.rule as never) - RULE_NAMES.indexOf(b.rule as never));
  });
}

/** The refresh rules broken at the end of a log: one a bank, or a set of banks refreshed together, that has waited too long. */
export function naiveEnd(pkg: Package, log: readonly Command[]): string[] {
  const [memory] = pkg.memory;
  const { channels, pseudo_channels } = memory.organisation;
  const { mode, scope } = memory.refresh;
  if (mode === 'off') return [];
  const banks = allBanks(memory);
  const broken: string[] = [];
  for (let channel = 0; channel < channels; channel++)
    for (let pc = 0; pc < pseudo_channels; pc++) {
      const own = log.filter((c) => c.channel === channel && c.pc === pc);
      const end = own.at(-1)?.ck ?? 0;
      // banks that are refreshed together carry the same name
      const unit = ([sid, group, bank]: Bank): string =>
        mode === 'per-bank' ? `${sid}.${group}.${bank}` : scope === 'sid' ? `${sid}` : 'all';
      for (const name of new Set(banks.map(unit))) {
        const together = banks.filter((bank) => unit(bank) === name);
        const { widest, latest } = refreshBounds(memory, own, together);
        if (end > widest) broken.push('refresh gap');
        else if (end > latest) broken.push('refresh owed');
      }
    }
  return broken;
}

const isAct = (c: Command): boolean => c.name === 'ACT';
const isRead = (c: Command): boolean => c.name === 'RD' || c.name === 'RDA';
const isWrite = (c: Command): boolean => c.name === 'WR' || c.name === 'WRA';
const isColumn = (c: Command): boolean => isRead(c) || isWrite(c);
const isPre = (c: Command): boolean => c.name === 'PRE' || c.name === 'PREA';
const isAll = (c: Command): boolean => c.name === 'REFab' || c.name === 'RFMab';
const isPerBank = (c: Command): boolean => c.name === 'REFpb' || c.name === 'RFMpb';
const sameChannel = (a: Command, b: Command): boolean => a.stack === b.stack && a.channel === b.channel;
const samePc = (a: Command, b: Command): boolean => sameChannel(a, b) && a.pc === b.pc;
const sameGroup = (a: Command, b: Command): boolean => a.sid === b.sid && a.group === b.group;

type Bank = readonly [sid: number, group: number, bank: number];

/** Every rule the last command of `log` breaks, perhaps several times, with the clock each asks for. */
function demands(memory: MemoryGroup, log: readonly Command[]): [string, number | null][] {
  const broken: [string, number | null][] = [];
  const last = log[log.length - 1];
  const before = log.slice(0, -1);
  const at = (name: keyof typeof memory.timings): number => memory.timings[name].ck;
  const burst = memory.organisation.burst_ck;
  const soonest = (rule: string, bound: number): void => {
    if (last.ck < bound) broken.push([rule, bound]);
  };
  const hits = (c: Command, bank: Bank): boolean => reaches(memory, c, bank);
  const activates = (c: Command): boolean => isAct(c) || (memory.refresh.refpbInActivateWindow && isPerBank(c));
  const inWindow = (c: Command): boolean => memory.activateWindowScope === 'pseudo_channel' || c.sid === last.sid;

  // ---- one bank at a time ------------------------------------------------------------------------------------------------------
  const touched = allBanks(memory).filter((bank) => hits(last, bank));
  const wantsClosed = isAct(last) || isAll(last) || isPerBank(last);
  for (const bank of touched) {
    const own = before.filter((c) => samePc(c, last) && hits(c, bank));
    const state = bankState(memory, own);
    for (const c of own) {
      if (isAct(c) && wantsClosed) soonest('tRC', c.ck + at('tRC'));
      if (isAct(c) && isPre(last)) soonest('tRAS', c.ck + at('tRAS'));
      if (isAct(c) && isRead(last)) soonest('tRCDRD', c.ck + at('tRCDRD'));
      if (isAct(c) && isWrite(last)) soonest('tRCDWR', c.ck + at('tRCDWR'));
      if (isRead(c) && isPre(last)) soonest('tRTP', c.ck + at('tRTP'));
      if (isWrite(c) && isPre(last)) soonest('tWR', c.ck + at('WL') + burst + at('tWR'));
      if (isAll(c)) soonest('tRFCab', c.ck + at('tRFCab'));
      if (isPerBank(c)) soonest('tRFCpb', c.ck + at('tRFCpb'));
    }
    if (wantsClosed) {
      if (state.closedAt !== null) soonest('tRP', state.closedAt + at('tRP'));
      if (state.ownAt !== null) soonest('own precharge', state.ownAt + at('tRP'));
      if (state.row !== null) broken.push(['open row', null]);
    }
    if (isColumn(last) && state.row === null) broken.push(['no open row', null]);
    if (isColumn(last) && state.row !== null && last.row >= 0 && last.row !== state.row)
      broken.push(['other row', null]);
  }

  // ---- between banks -----------------------------------------------------------------------------------------------------------
  for (const c of before) {
    if (!samePc(c, last)) continue;
    if (activates(c) && activates(last) && inWindow(c)) {
      if (sameGroup(c, last)) soonest('tRRD_L', c.ck + at('tRRD_L'));
      else soonest('tRRD_S', c.ck + at('tRRD_S'));
    }
    if ((isRead(c) && isColumn(last)) || (isWrite(c) && isWrite(last))) {
      const rule = c.sid !== last.sid ? 'tCCD_R' : sameGroup(c, last) ? 'tCCD_L' : 'tCCD_S';
      soonest(rule, c.ck + at(rule));
    }
    if (isRead(c) && isWrite(last)) soonest('tRTW', c.ck + at('RL') + burst - at('WL') + at('tRTW'));
    if (isWrite(c) && isRead(last)) {
      const rule = sameGroup(c, last) ? 'tWTR_L' : 'tWTR_S';
      soonest(rule, c.ck + at('WL') + burst + at(rule));
    }
    if (isPre(c) && isPre(last)) soonest('tPPD', c.ck + at('tPPD'));
    if (isPerBank(c) && isPerBank(last)) soonest('tRREFD', c.ck + at('tRREFD'));
    if (isPerBank(c) && isAct(last) && !(sameGroup(c, last) && c.bank === last.bank))
      soonest('tRREFD', c.ck + at('tRREFD'));
    if (isColumn(c) && isColumn(last)) {
      const data = (x: Command): number => x.ck + (isRead(x) ? at('RL') : at('WL'));
      if (data(last) < data(c) + burst && data(c) < data(last) + burst)
        soonest('data bus', data(c) + burst - (data(last) - last.ck));
    }
  }
  if (activates(last)) {
    const window = before.filter((c) => samePc(c, last) && activates(c) && inWindow(c));
    for (const c of window.slice(0, -3)) soonest('tFAW', c.ck + at('tFAW')); // three more between it and the last
  }

  // ---- command buses -----------------------------------------------------------------------------------------------------------
  const { separate, actHalfCk, preHalfCk, refHalfCk, columnHalfCk } = memory.buses;
  for (const c of before) {
    if (!sameChannel(c, last) || (separate && isColumn(c) !== isColumn(last))) continue;
    const hold = isAct(c) ? actHalfCk : isPre(c) ? preHalfCk : isColumn(c) ? columnHalfCk : refHalfCk;
    soonest(separate ? (isColumn(last) ? 'column bus' : 'row bus') : 'command bus', c.ck + hold / 2);
  }
  if (isColumn(last) && !Number.isInteger(last.ck)) broken.push(['clock edge', null]);

  // ---- refreshes ---------------------------------------------------------------------------------------------------------------
  if (last.name === 'REFab' || last.name === 'REFpb') {
    if (memory.refresh.mode !== 'off') {
      const own = before.filter((c) => samePc(c, last));
      const { widest, latest, most } = refreshBounds(memory, own, touched);
      if (last.ck > widest) broken.push(['refresh gap', widest]);
      else if (last.ck > latest) broken.push(['refresh owed', latest]);
      soonest('refresh ahead', (most - memory.refresh.pullIn) * at('tREFI'));
    }
    if (
      last.name === 'REFpb' &&
      setInHand(
        memory,
        before.filter((c) => samePc(c, last)),
        last.sid,
      ).has(bankKey(last))
    )
      broken.push(['refresh order', null]);
  }
  return broken;
}

/** Does a command go to this bank of its pseudo-channel, alone or among others? */
function reaches({ refresh }: MemoryGroup, c: Command, [sid, group, bank]: Bank): boolean {
  if (isAll(c)) return refresh.scope === 'pseudo_channel' || c.sid === sid;
  if (c.name === 'PREA') return c.sid < 0 || c.sid === sid;
  return c.sid === sid && c.group === group && c.bank === bank;
}

/** Until when the next refresh of `banks` may wait, by the gap and by what is owed, after the commands of a pseudo-channel. */
function refreshBounds(memory: MemoryGroup, own: readonly Command[], banks: readonly Bank[]) {
  const { postpone } = memory.refresh;
  const interval = memory.timings.tREFI.ck;
  const refreshes = banks.map((bank) =>
    own.filter((c) => (c.name === 'REFab' || c.name === 'REFpb') && reaches(memory, c, bank)),
  );
  const done = refreshes.map((list) => list.length);
  return {
    widest: Math.min(...refreshes.map((list) => list.at(-1)?.ck ?? 0)) + (postpone + 1) * interval,
    latest: (Math.min(...done) + 1 + postpone) * interval,
    most: Math.max(...done), // refreshes of the bank that has had most
  };
}

function allBanks({ organisation: o }: MemoryGroup): Bank[] {
  const banks: Bank[] = [];
  for (let sid = 0; sid < o.sids; sid++)
    for (let group = 0; group < o.bank_groups; group++)
      for (let bank = 0; bank < o.banks_per_group; bank++) banks.push([sid, group, bank]);
  return banks;
}

/** Row open after the commands of one bank, and when it last was closed by a precharge and by an own precharge. */
function bankState(memory: MemoryGroup, own: readonly Command[]) {
  const at = (name: keyof typeof memory.timings): number => memory.timings[name].ck;
  let row: number | null = null;
  let closedAt: number | null = null;
  let ownAt: number | null = null;
  own.forEach((c, i) => {
    if (isAct(c)) row = c.row;
    if (isPre(c) && row !== null) closedAt = c.ck;
    if (isPre(c) || isAll(c) || isPerBank(c)) row = null;
    if ((c.name === 'RDA' || c.name === 'WRA') && row !== null) {
      row = null;
      const starts = own.slice(0, i + 1).map((x) => {
        if (isAct(x)) return x.ck + at('tRAS');
        if (isRead(x)) return x.ck + at('tRTP');
        return isWrite(x) ? x.ck + at('WL') + memory.organisation.burst_ck + at('tWR') : 0;
      });
      ownAt = Math.max(...starts);
    }
  });
  return { row: row as number | null, closedAt: closedAt as number | null, ownAt: ownAt as number | null };
}

const bankKey = (c: Command): string => `${c.group}.${c.bank}`;

/** Banks of a stack ID that the set of per-bank refreshes in hand has had. */
function setInHand(memory: MemoryGroup, before: readonly Command[], sid: number): Set<string> {
  const { bank_groups, banks_per_group } = memory.organisation;
  const set = new Set<string>();
  for (const c of before) {
    if (c.name === 'REFab' && (memory.refresh.scope === 'pseudo_channel' || c.sid === sid)) set.clear();
    if (c.name === 'REFpb' && c.sid === sid) set.add(bankKey(c));
    if (set.size === bank_groups * banks_per_group) set.clear();
  }
  return set;
}
