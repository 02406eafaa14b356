import { STACK_CLASSES } from './recording.js';

/**
 * The bandwidth stack (Eyerman, Heirman and Hur, 2022) while the run goes on: each gap on a pseudo-channel's data bus is cut at
 * the moments its limits would have let the burst go, in the order charge() takes them, and each piece goes to the limit that
 * ends it. The pieces telescope, so their sum is the gap, exactly.
 */

const CLASSES = STACK_CLASSES.length;
const READ_DATA = STACK_CLASSES.indexOf('read_data');
const REFRESH = STACK_CLASSES.indexOf('refresh');
const ROW_CYCLE = STACK_CLASSES.indexOf('row_cycle');
const ACTIVATE_WINDOW = STACK_CLASSES.indexOf('activate_window');
const COLUMN_GAP = STACK_CLASSES.indexOf('column_gap');
const TURNAROUND = STACK_CLASSES.indexOf('turnaround');
const COMMAND_BUS = STACK_CLASSES.indexOf('command_bus');
const DRAIN = STACK_CLASSES.indexOf('starved_drain');
const IMBALANCE = STACK_CLASSES.indexOf('starved_imbalance');

let stack = new Float64Array(0); // stack[p * CLASSES + class], ck

export function resetAttribution(pseudoChannels: number): void {
  stack = new Float64Array(pseudoChannels * CLASSES);
}

export function bandwidthStack(): Float64Array {
  return stack;
}

/** A burst of `ck` clocks of read (kind 0) or write (kind 1) data. */
export function chargeBurst(p: number, kind: number, ck: number): void {
  stack[p * CLASSES + READ_DATA + kind] += ck;
}

/**
 * Charges the `gap` half clocks before a column command at `t` (its data follows a data bus idle that long). Times are half
 * clocks. Limits, earliest first: the queue was empty until `since` (charged to `cause`, whatever was refreshed meanwhile: that cost
 * nobody anything), the bank was refreshing until `bankRefreshEnd`, the row cycle alone would have let the column go at `rowReady`,
 * the activate window at `windowReady`, the row bus at `bankReady`, the column separation at `groupReady` (a turnaround when
 * `turned`); what is left is the wait for the column command bus.
 */
export function chargeGap(
  p: number,
  t: number,
  gap: number,
  since: number,
  cause: number,
  bankRefreshEnd: number,
  rowReady: number,
  windowReady: number,
  bankReady: number,
  groupReady: number,
  turned: boolean,
): void {
  const at = p * CLASSES;
  // whole clocks only: positions are clocks before t, rounded towards t
  const total = gap >> 1;
  let left = total;
  if (since > t - 2 * left) {
    const rest = since >= t ? 0 : (t - since) >> 1;
    stack[at + cause] += left - rest;
    left = rest;
  }
  left = cut(at + REFRESH, t, left, bankRefreshEnd);
  left = cut(at + ROW_CYCLE, t, left, rowReady);
  left = cut(at + ACTIVATE_WINDOW, t, left, windowReady);
  left = cut(at + COMMAND_BUS, t, left, bankReady);
  left = cut(at + (turned ? TURNAROUND : COLUMN_GAP), t, left, groupReady);
  stack[at + COMMAND_BUS] += left;
}

/** Charges what of the last `left` clocks before `t` lies before `ready`, and returns what lies after it. */
function cut(index: number, t: number, left: number, ready: number): number {
  if (left === 0 || ready <= t - 2 * left) return left;
  const rest = ready >= t ? 0 : (t - ready) >> 1;
  stack[index] += left - rest;
  return rest;
}

/** Charges the idle tail of `ck` clocks: the first `before` of them while others still got work. */
export function chargeTail(p: number, ck: number, before: number): void {
  const at = p * CLASSES;
  const imbalance = Math.min(ck, before);
  stack[at + IMBALANCE] += imbalance;
  stack[at + DRAIN] += ck - imbalance;
}

/** Charges `ck` clocks in which nothing was queued to the class of what ended them. */
export function chargeIdle(p: number, cause: number, ck: number): void {
  stack[p * CLASSES + cause] += ck;
}
