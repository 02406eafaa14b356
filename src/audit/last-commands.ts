import type { MemoryGroup } from '../config/package.js';
import { ACT, KIND_COUNT, REFPB } from './commands.js';
import { compile, type Rows } from './compile.js';
import { Events } from './events.js';
import type { Findings } from './findings.js';
import { ruleNumber } from './rule-names.js';
import { type Limits, separations } from './separations.js';
import type { Shape } from './shape.js';

const WINDOW = ruleNumber('tFAW');
const WINDOW_SIZE = 4; // activations any window may hold

/**
 * The table of separations at work: the last command of each kind in each bank, bank group and pseudo-channel, and the last four
 * activations of each activate window. Only the last can matter, since commands of a channel come in order of time.
 */
export class LastCommands {
  readonly byBank: Events; // slot: (p x banks + bank) x KIND_COUNT + kind
  private readonly byGroup: Events; // slot: (p x groups + group) x KIND_COUNT + kind
  private readonly byPseudoChannel: Events; // slot: p x KIND_COUNT + kind
  private readonly windows: Events; // slot: window x WINDOW_SIZE + turn
  private readonly turn: Uint8Array; // by window: slot of its oldest activation
  private readonly windowPerSid: boolean;
  private readonly isActivation = new Uint8Array(KIND_COUNT);
  // rows of the table by kind of the later command
  private readonly sameBank: readonly Rows[];
  private readonly otherBank: readonly Rows[];
  private readonly sameGroup: readonly Rows[];
  private readonly otherGroup: readonly Rows[];
  private readonly otherSid: readonly Rows[];
  private readonly anywhere: readonly Rows[];

  constructor(
    private readonly shape: Shape,
    memory: MemoryGroup,
    private readonly limits: Limits,
    private readonly findings: Findings,
  ) {
    const table = separations(memory);
    this.sameBank = compile(table, 'same bank');
    this.otherBank = compile(table, 'other bank');
    this.sameGroup = compile(table, 'same group');
    this.otherGroup = compile(table, 'other group');
    this.otherSid = compile(table, 'other sid');
    this.anywhere = compile(table, 'pseudo-channel');
    this.windowPerSid = memory.activateWindowScope === 'sid';
    this.isActivation[ACT] = 1;
    this.isActivation[REFPB] = memory.refresh.refpbInActivateWindow ? 1 : 0;
    const { pseudoChannels, banks, groups, sids } = shape;
    this.byBank = new Events(pseudoChannels * banks * KIND_COUNT);
    this.byGroup = new Events(pseudoChannels * groups * KIND_COUNT);
    this.byPseudoChannel = new Events(pseudoChannels * KIND_COUNT);
    const windows = this.windowPerSid ? pseudoChannels * sids : pseudoChannels;
    this.windows = new Events(windows * WINDOW_SIZE);
    this.turn = new Uint8Array(windows);
  }

  /** What holds between commands of one bank. `bank` is numbered over the package. */
  checkBank(bank: number, kind: number, halfCk: number): void {
    this.checkRows(this.sameBank[kind], this.byBank, bank * KIND_COUNT, halfCk);
  }

  /** What holds in the whole pseudo-channel, whichever banks the commands go to. */
  checkPseudoChannel(p: number, kind: number, halfCk: number): void {
    this.checkRows(this.anywhere[kind], this.byPseudoChannel, p * KIND_COUNT, halfCk);
  }

  /** What holds between commands of different banks, for a command to bank `bank` of pseudo-channel p. */
  checkOthers(p: number, bank: number, kind: number, halfCk: number): void {
    const { groups, banks, banksPerSid, organisation } = this.shape;
    const sid = Math.floor(bank / banksPerSid);
    const group = Math.floor(bank / organisation.banks_per_group);
    const firstOfSid = sid * organisation.bank_groups;
    const endOfSid = firstOfSid + organisation.bank_groups;
    const same = this.sameGroup[kind];
    const other = this.otherGroup[kind];
    const otherSid = this.otherSid[kind];
    if (same.count + other.count + otherSid.count > 0) {
      for (let g = 0; g < groups; g++) {
        const rows = g === group ? same : g >= firstOfSid && g < endOfSid ? other : otherSid;
        this.checkRows(rows, this.byGroup, (p * groups + g) * KIND_COUNT, halfCk);
      }
    }
    const banksApart = this.otherBank[kind];
    for (let i = 0; i < banksApart.count; i++) {
      // the last of the whole pseudo-channel tells whether any bank can be too near
      const latest = this.byPseudoChannel.since[p * KIND_COUNT + banksApart.from[i]];
      if (halfCk >= latest + banksApart.halfCk[i]) continue;
      for (let b = 0; b < banks; b++) {
        if (b !== bank) this.checkRow(banksApart, i, this.byBank, (p * banks + b) * KIND_COUNT, halfCk);
      }
    }
    if (this.isActivation[kind] === 1) this.checkWindow(this.windowPerSid ? p * this.shape.sids + sid : p, halfCk);
  }

  private checkRows(rows: Rows, events: Events, node: number, halfCk: number): void {
    for (let i = 0; i < rows.count; i++) this.checkRow(rows, i, events, node, halfCk);
  }

  private checkRow(rows: Rows, i: number, events: Events, node: number, halfCk: number): void {
    const slot = node + rows.from[i];
    const soonest = events.since[slot] + rows.halfCk[i];
    if (halfCk < soonest) this.findings.tooSoon(rows.rule[i], events, slot, soonest);
  }

  /** The fourth activation before this one is the one that its turn is about to overwrite. */
  private checkWindow(window: number, halfCk: number): void {
    const slot = window * WINDOW_SIZE + this.turn[window];
    const soonest = this.windows.since[slot] + this.limits.activateWindow;
    if (halfCk < soonest) this.findings.tooSoon(WINDOW, this.windows, slot, soonest);
  }

  /** Takes note of a command to one bank of pseudo-channel p. */
  putBank(p: number, bank: number, kind: number, halfCk: number, line: number, what: number): void {
    const { banks, groups, sids, banksPerSid, organisation } = this.shape;
    const group = Math.floor(bank / organisation.banks_per_group);
    this.byBank.put((p * banks + bank) * KIND_COUNT + kind, halfCk, halfCk, line, what);
    this.byGroup.put((p * groups + group) * KIND_COUNT + kind, halfCk, halfCk, line, what);
    this.byPseudoChannel.put(p * KIND_COUNT + kind, halfCk, halfCk, line, what);
    if (this.isActivation[kind] === 1) {
      const window = this.windowPerSid ? p * sids + Math.floor(bank / banksPerSid) : p;
      this.windows.put(window * WINDOW_SIZE + this.turn[window], halfCk, halfCk, line, what);
      this.turn[window] = (this.turn[window] + 1) % WINDOW_SIZE;
    }
  }

  /** Takes note of a command for its pseudo-channel alone: what it does to banks is told bank by bank. */
  putPseudoChannel(p: number, kind: number, halfCk: number, line: number, what: number): void {
    this.byPseudoChannel.put(p * KIND_COUNT + kind, halfCk, halfCk, line, what);
  }
}
