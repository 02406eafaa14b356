import type { Package } from '../config/package.js';
import { CommandBuses, DataBuses } from './buses.js';
import {
  ACT,
  COMMANDS,
  IS_REFRESH,
  KIND_COUNT,
  KIND_OF,
  MANY_BANKS,
  OWN,
  OWN_PRECHARGE,
  PRE,
  RD,
  REFAB,
  REFPB,
  WR,
} from './commands.js';
import { Findings } from './findings.js';
import { LastCommands } from './last-commands.js';
import { logged, outOfRange } from './place.js';
import { RefreshPace } from './refresh.js';
import { type AuditReport, makeReport } from './report.js';
import { ruleNumber } from './rule-names.js';
import { limits } from './separations.js';
import { Shape } from './shape.js';

const OPEN_ROW = ruleNumber('open row');
const NO_OPEN_ROW = ruleNumber('no open row');
const OTHER_ROW = ruleNumber('other row');
const TIME_ORDER = ruleNumber('time order');
const ADDRESS_RANGE = ruleNumber('address range');

const CLOSED = -1;

export interface Audit {
  /**
   * Takes the next command of the log. Times are half clocks; `command` is a number of COMMANDS; fields that a command does not
   * use are -1; `bank` is within its group; `line` is its line in the log, by default that of a log with nothing but a header
   * and commands. Commands of one channel come in order of time; channels may be mixed in any way.
   */
  command(
    halfCk: number,
    stack: number,
    channel: number,
    pc: number,
    sid: number,
    bankGroup: number,
    bank: number,
    row: number,
    column: number,
    command: number,
    request: number,
    line?: number,
  ): void;
  /**
   * Ends the log and reports. `endHalfCk`: until when the log was kept; every bank must have had its refreshes by then. Without
   * it each pseudo-channel ends with its last command, and one without commands is not asked for refreshes.
   */
  finish(endHalfCk?: number): AuditReport;
}

/** A checker of the command log of one run of `pkg`, from clock 0 with all banks closed. Keeps a fixed amount of memory. */
export function createAudit(pkg: Package): Audit {
  return new Checker(pkg);
}

class Checker implements Audit {
  private readonly shape: Shape;
  private readonly limits;
  private readonly findings: Findings;
  private readonly lasts: LastCommands;
  private readonly commandBuses: CommandBuses;
  private readonly dataBuses: DataBuses;
  private readonly pace: RefreshPace;
  private readonly refreshPerSid: boolean; // one REFab closes one stack ID
  private readonly openRow: Int32Array; // by bank of the package; CLOSED: none
  private readonly channelTime: Float64Array; // half clocks of each channel's last command; -1: none yet
  private readonly ends: Float64Array; // half clocks of each pseudo-channel's last command; -1: none
  private readonly counts = new Float64Array(COMMANDS.length);
  private commands = 0;
  private start = Number.POSITIVE_INFINITY; // half clocks of the earliest command

  constructor(private readonly pkg: Package) {
    const [memory] = pkg.memory;
    this.shape = new Shape(memory.organisation);
    this.limits = limits(memory);
    this.findings = new Findings(this.shape);
    this.lasts = new LastCommands(this.shape, memory, this.limits, this.findings);
    this.commandBuses = new CommandBuses(this.shape, memory, this.limits, this.findings);
    this.dataBuses = new DataBuses(this.shape, this.limits, this.findings);
    this.pace = new RefreshPace(this.shape, memory, this.limits, this.findings);
    this.refreshPerSid = memory.refresh.scope === 'sid';
    this.openRow = new Int32Array(this.shape.banks * this.shape.pseudoChannels).fill(CLOSED);
    this.channelTime = new Float64Array(this.shape.channels).fill(-1);
    this.ends = new Float64Array(this.shape.pseudoChannels).fill(-1);
  }

  command(
    halfCk: number,
    stack: number,
    channel: number,
    pc: number,
    sid: number,
    bankGroup: number,
    bank: number,
    row: number,
    column: number,
    command: number,
    _request: number,
    line: number = this.commands + 2,
  ): void {
    this.commands++;
    this.counts[command]++;
    if (halfCk < this.start) this.start = halfCk;
    const { shape, findings } = this;
    const o = shape.organisation;
    const misplaced = outOfRange(
      this.shape.organisation,
      this.refreshPerSid,
      stack,
      channel,
      pc,
      sid,
      bankGroup,
      bank,
      row,
      column,
      command,
    );
    const inRange = misplaced === '';
    const kind = KIND_OF[command];
    const many = MANY_BANKS[command] === 1;
    const wholePc = many && (sid < 0 || (kind === REFAB && !this.refreshPerSid));
    const c = stack * o.channels + channel; // channel of the package
    const p = c * o.pseudo_channels + pc;
    // the banks of p the command goes to, `first` up to `end`: one, those of a stack ID, or all
    const oneBank = (sid * o.bank_groups + bankGroup) * o.banks_per_group + bank;
    const first = many ? (wholePc ? 0 : sid * shape.banksPerSid) : oneBank;
    const end = many ? (wholePc ? shape.banks : first + shape.banksPerSid) : first + 1;
    if (!inRange) {
      findings.wrong(ADDRESS_RANGE, null, 0, misplaced);
    } else if (halfCk < this.channelTime[c]) {
      // what came before it is not known any more, so nothing else is asked of it; what comes after it may still rely on it
      findings.wrong(TIME_ORDER, null, 0, `the command before it in this channel is at ck ${this.channelTime[c] / 2}`);
    } else {
      this.check(c, p, kind, command, first, end, row, halfCk);
    }
    if (findings.pending > 0) {
      // before the command takes the place of those it is held against
      const place = { stack, channel, pseudo_channel: pc, sid, bank_group: bankGroup, bank, row, column };
      findings.flush(logged(halfCk, place, command, line), halfCk, c);
    }
    if (!inRange) return;
    const what = shape.what(command, pc, wholePc ? -1 : sid, many ? -1 : first);
    this.apply(c, p, kind, command, first, end, row, halfCk, line, what);
  }

  finish(endHalfCk?: number): AuditReport {
    for (let p = 0; p < this.shape.pseudoChannels; p++) this.pace.finish(p, Math.max(this.ends[p], endHalfCk ?? 0));
    const end = Math.max(0, endHalfCk ?? 0, ...this.channelTime);
    const counted = { commands: this.commands, byCommand: this.counts, startCk: this.start / 2, endCk: end / 2 };
    return makeReport(this.pkg, counted, this.findings);
  }

  /** Everything the command must find: banks `first` up to `end` of pseudo-channel p are those it goes to. */
  private check(
    channel: number,
    p: number,
    kind: number,
    command: number,
    first: number,
    end: number,
    row: number,
    halfCk: number,
  ): void {
    const base = p * this.shape.banks;
    this.commandBuses.check(channel, kind, halfCk);
    for (let bank = first; bank < end; bank++) {
      this.lasts.checkBank(base + bank, kind, halfCk);
      this.checkRow(base + bank, kind, row);
    }
    this.lasts.checkPseudoChannel(p, kind, halfCk);
    if (MANY_BANKS[command] === 0) this.lasts.checkOthers(p, first, kind, halfCk);
    if (kind === RD || kind === WR) this.dataBuses.check(p, kind, halfCk);
    if (IS_REFRESH[command] === 1) this.pace.check(base + first, base + end, halfCk, kind === REFPB);
  }

  /** Is the bank's row as the command needs it? PRE may find any: on a closed bank it does nothing. */
  private checkRow(bank: number, kind: number, row: number): void {
    if (kind === PRE) return;
    const open = this.openRow[bank];
    const events = this.lasts.byBank;
    const activate = bank * KIND_COUNT + ACT;
    if (kind === RD || kind === WR) {
      if (open === CLOSED) {
        const [own, pre] = [bank * KIND_COUNT + OWN, bank * KIND_COUNT + PRE];
        this.findings.wrong(
          NO_OPEN_ROW,
          events,
          events.issued[own] > events.issued[pre] ? own : pre,
          'the bank is closed',
        );
      } else if (row >= 0 && row !== open) {
        this.findings.wrong(OTHER_ROW, events, activate, `row ${open} is open`);
      }
    } else if (open !== CLOSED) {
      this.findings.wrong(OPEN_ROW, events, activate, `row ${open} is open`);
    }
  }

  /** What the command does, for those after it. */
  private apply(
    channel: number,
    p: number,
    kind: number,
    command: number,
    first: number,
    end: number,
    row: number,
    halfCk: number,
    line: number,
    what: number,
  ): void {
    const base = p * this.shape.banks;
    const { lasts, openRow } = this;
    this.channelTime[channel] = halfCk;
    this.ends[p] = halfCk;
    this.commandBuses.put(channel, kind, halfCk, line, what);
    if (kind === PRE || kind === REFAB) {
      lasts.putPseudoChannel(p, kind, halfCk, line, what);
      for (let bank = base + first; bank < base + end; bank++) {
        // a precharge of a closed bank does nothing: its tRP counts from what closed it
        if (kind === PRE && openRow[bank] === CLOSED) continue;
        lasts.byBank.put(bank * KIND_COUNT + kind, halfCk, halfCk, line, what);
        openRow[bank] = CLOSED;
      }
    } else {
      lasts.putBank(p, first, kind, halfCk, line, what);
      if (kind === ACT) openRow[base + first] = row;
      else if (kind === REFPB) openRow[base + first] = CLOSED;
      else {
        this.dataBuses.put(p, kind, halfCk, line, what);
        if (OWN_PRECHARGE[command] === 1) this.ownPrecharge(base + first, halfCk, line, what);
      }
    }
    if (IS_REFRESH[command] === 1) this.pace.put(base + first, base + end, halfCk, line, what, kind === REFPB);
  }

  /** The bank begins to precharge when its ACT, its last read and its last write all allow it. */
  private ownPrecharge(bank: number, halfCk: number, line: number, what: number): void {
    if (this.openRow[bank] === CLOSED) return;
    const { since } = this.lasts.byBank;
    const slot = bank * KIND_COUNT;
    const begin = Math.max(
      since[slot + ACT] + this.limits.rasMin,
      since[slot + RD] + this.limits.readToPrecharge,
      since[slot + WR] + this.limits.writeToPrecharge,
    );
    this.lasts.byBank.put(slot + OWN, begin, halfCk, line, what);
    this.openRow[bank] = CLOSED;
  }
}
