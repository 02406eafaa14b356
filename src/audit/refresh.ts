import type { MemoryGroup } from '../config/package.js';
import { Events } from './events.js';
import type { Findings } from './findings.js';
import { ruleNumber } from './rule-names.js';
import type { Limits } from './separations.js';
import type { Shape } from './shape.js';

const GAP = ruleNumber('refresh gap');
const OWED = ruleNumber('refresh owed');
const AHEAD = ruleNumber('refresh ahead');
const ORDER = ruleNumber('refresh order');

/**
 * The pace and the order of refreshes, bank by bank: an all-bank refresh is one for each bank in its scope. A bank's nth refresh
 * is due somewhere from (n - 1) to n x tREFI, wherever the controller's phase lies; up to `postpone` may be owed and `pullIn` be
 * ahead. The log is taken to begin at clock 0 with every bank just refreshed and no set of per-bank refreshes begun.
 */
export class RefreshPace {
  private readonly last: Events; // last refresh of each bank
  private readonly done: Float64Array; // refreshes of each bank
  private readonly inSet: Uint8Array; // by bank: 1 when the set in hand has refreshed it
  private readonly setSize: Int32Array; // by stack ID of a pseudo-channel: banks of the set in hand refreshed
  private readonly paced: boolean; // refresh off: what refreshes there are may come when they like
  private readonly gap: number; // half clocks

  constructor(
    private readonly shape: Shape,
    private readonly memory: MemoryGroup,
    private readonly limits: Limits,
    private readonly findings: Findings,
  ) {
    const banks = shape.banks * shape.pseudoChannels;
    this.last = new Events(banks);
    this.last.since.fill(0);
    this.done = new Float64Array(banks);
    this.inSet = new Uint8Array(banks);
    this.setSize = new Int32Array(shape.sids * shape.pseudoChannels);
    this.paced = memory.refresh.mode !== 'off';
    this.gap = (limits.postpone + 1) * limits.refreshInterval;
  }

  /** A refresh of banks `first` up to, not including, `end`, numbered over the package. */
  check(first: number, end: number, halfCk: number, perBank: boolean): void {
    if (perBank && this.inSet[first] === 1) {
      this.findings.wrong(ORDER, this.last, first, 'other banks of the set still wait');
    }
    if (!this.paced) return;
    this.late(first, end, halfCk, '');
    let most = first;
    for (let bank = first + 1; bank < end; bank++) if (this.done[bank] > this.done[most]) most = bank;
    const soonest = (this.done[most] - this.limits.pullIn) * this.limits.refreshInterval;
    if (halfCk < soonest) {
      this.findings.tooSoon(AHEAD, null, 0, soonest, `refresh ${this.done[most] + 1}`);
    }
  }

  put(first: number, end: number, halfCk: number, line: number, what: number, perBank: boolean): void {
    for (let bank = first; bank < end; bank++) {
      this.last.put(bank, halfCk, halfCk, line, what);
      this.done[bank]++;
    }
    const { banksPerSid } = this.shape;
    if (!perBank) {
      // an all-bank refresh begins the sets of its banks anew (from memory: it sets the device's bank counter back)
      this.inSet.fill(0, first, end);
      this.setSize.fill(0, Math.floor(first / banksPerSid), Math.floor(end / banksPerSid));
    } else if (this.inSet[first] === 0) {
      const sid = Math.floor(first / banksPerSid);
      this.inSet[first] = 1;
      if (++this.setSize[sid] === banksPerSid) {
        this.inSet.fill(0, sid * banksPerSid, (sid + 1) * banksPerSid);
        this.setSize[sid] = 0;
      }
    }
  }

  /** At the end of the log: which banks of pseudo-channel `p` have waited too long, one finding a refresh that is missing. */
  finish(p: number, endHalfCk: number): void {
    if (!this.paced) return;
    const { banks, banksPerSid } = this.shape;
    const { mode, scope } = this.memory.refresh;
    const unit = mode === 'per-bank' ? 1 : scope === 'sid' ? banksPerSid : banks;
    for (let first = 0; first < banks; first += unit) {
      const place = this.shape.placeName(
        p,
        unit < banks ? Math.floor(first / banksPerSid) : -1,
        unit === 1 ? first : -1,
      );
      this.late(p * banks + first, p * banks + first + unit, endHalfCk, place);
      if (this.findings.pending > 0) this.findings.flush(null, endHalfCk, this.shape.channelOf(p));
    }
  }

  /** Is a refresh of these banks, or the end of the log, later than the one that is due may be? A gap is not also owed. */
  private late(first: number, end: number, halfCk: number, place: string): void {
    let oldest = first; // bank longest without refresh
    let fewest = first;
    for (let bank = first + 1; bank < end; bank++) {
      if (this.last.since[bank] < this.last.since[oldest]) oldest = bank;
      if (this.done[bank] < this.done[fewest]) fewest = bank;
    }
    const due = (this.done[fewest] + 1 + this.limits.postpone) * this.limits.refreshInterval;
    const widest = this.last.since[oldest] + this.gap;
    if (halfCk > widest) {
      this.findings.tooLate(GAP, this.last, oldest, widest, place);
    } else if (halfCk > due) {
      this.findings.tooLate(OWED, null, 0, due, `${place === '' ? '' : `${place}: `}refresh ${this.done[fewest] + 1}`);
    }
  }
}
