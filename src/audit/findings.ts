import type { Events } from './events.js';
import { RULE_NAMES, type RuleName } from './rule-names.js';
import type { LoggedCommand, Shape } from './shape.js';

/** One rule broken by one command. */
export interface Violation {
  readonly rule: RuleName;
  readonly command: LoggedCommand | null; // the one that came at the wrong time; null: the end of the log
  readonly earlier: LoggedCommand | null; // the one it is counted from; null: the start of the log, or none
  readonly bound: 'at least' | 'at most' | null; // null: not a matter of time
  readonly required_ck: number | null; // separation asked for; may end in .5
  readonly found_ck: number | null;
  readonly note: string; // what the numbers do not say, or ''
}

const KEPT = 100; // violations kept in full, beside the first of each rule

const EMPTY: Uint8Array = Uint8Array.from(RULE_NAMES, () => 0);

/**
 * Collects what is broken. A command breaks a rule once, however many earlier commands it comes too close to: against the one
 * that asks for the latest time (the first found of equals).
 */
export class Findings {
  readonly counts = new Float64Array(RULE_NAMES.length); // by rule number
  readonly kept: Violation[] = [];
  pending = 0; // rules broken by the command in hand
  private readonly isPending = EMPTY.slice(); // by rule number
  private readonly bounds = new Float64Array(RULE_NAMES.length); // half clocks: the soonest (latest) the command may come
  private readonly atMost = EMPTY.slice();
  private readonly events: (Events | null)[] = RULE_NAMES.map(() => null); // where the earlier command stands
  private readonly slots = new Int32Array(RULE_NAMES.length);
  private readonly notes: string[] = RULE_NAMES.map(() => '');

  constructor(private readonly shape: Shape) {}

  /** The command in hand comes before `bound`, which the command in `events[slot]` asks for. */
  tooSoon(rule: number, events: Events | null, slot: number, bound: number, note = ''): void {
    if (this.isPending[rule] === 1 && bound <= this.bounds[rule]) return;
    this.set(rule, events, slot, bound, 0, note);
  }

  /** The command in hand, or the end of the log, comes after `bound`. */
  tooLate(rule: number, events: Events | null, slot: number, bound: number, note = ''): void {
    this.set(rule, events, slot, bound, 1, note);
  }

  /** The command in hand must not come at all. */
  wrong(rule: number, events: Events | null, slot: number, note: string): void {
    this.set(rule, events, slot, Number.NaN, 0, note);
  }

  private set(rule: number, events: Events | null, slot: number, bound: number, atMost: number, note: string): void {
    if (this.isPending[rule] === 0) this.pending++;
    this.isPending[rule] = 1;
    this.bounds[rule] = bound;
    this.atMost[rule] = atMost;
    this.events[rule] = events;
    this.slots[rule] = slot;
    this.notes[rule] = note;
  }

  /** Counts what is pending and keeps it if there is room. `command` null: the end of the log, at `halfCk`. */
  flush(command: LoggedCommand | null, halfCk: number, channel: number): void {
    for (let rule = 0; rule < RULE_NAMES.length; rule++) {
      if (this.isPending[rule] === 0) continue;
      this.isPending[rule] = 0;
      if (this.kept.length < KEPT || this.counts[rule] === 0)
        this.kept.push(this.violation(rule, command, halfCk, channel));
      this.counts[rule]++;
    }
    this.pending = 0;
  }

  private violation(rule: number, command: LoggedCommand | null, halfCk: number, channel: number): Violation {
    const events = this.events[rule];
    const slot = this.slots[rule];
    const bound = this.bounds[rule];
    const timed = !Number.isNaN(bound);
    const origin = events === null ? 0 : events.issued[slot];
    const given = events !== null && events.line[slot] > 0;
    return {
      rule: RULE_NAMES[rule],
      command,
      earlier: given ? this.shape.unpack(events.what[slot], channel, origin, events.line[slot]) : null,
      bound: timed ? (this.atMost[rule] === 1 ? 'at most' : 'at least') : null,
      required_ck: timed ? (bound - origin) / 2 : null,
      found_ck: timed ? (halfCk - origin) / 2 : null,
      note: this.notes[rule],
    };
  }
}
