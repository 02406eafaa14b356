import {
  ARRIVE,
  DATA_END,
  FIRST_COLUMN,
  FLAGS,
  NEXT,
  NUMBER_OR_COMMAND,
  PLACE,
  RECORD_DOUBLES,
  RECORD_INTS,
  type Requests,
} from './request-records.js';

/**
 * Base-die egress: answers (read data, forwarded reads, write acknowledgements) wait here for the DRAM clock at which they are
 * complete, and leave in the order (clock, pseudo-channel, order of production), whatever the order channels were run in.
 */

export const DATA = 0;
export const ACKNOWLEDGEMENT = 1;
export const FORWARDED = 2;

let doubles: Float64Array = new Float64Array(0); // request records
let ints: Int32Array = new Int32Array(0);
let head = new Int32Array(0); // per (stack, ck & mask): first answer of that clock, -1 when none
let tail = new Int32Array(0);
let waiting = new Int32Array(0); // per stack: answers not drained yet
let drained = new Float64Array(0); // per stack: clocks below this have been drained
let mask = 0;
let size = 0; // buckets per stack
let perStack = 1; // pseudo-channels of a stack

/** `aheadCk`: the longest time from the production of an answer to its completion, plus one window, in clocks. */
export function resetEgress(requests: Requests, stacks: number, pseudoChannelsPerStack: number, aheadCk: number): void {
  ({ doubles, ints } = requests);
  size = 2 ** Math.ceil(Math.log2(aheadCk + 4));
  mask = size - 1;
  head = new Int32Array(stacks * size).fill(-1);
  tail = new Int32Array(stacks * size).fill(-1);
  waiting = new Int32Array(stacks);
  drained = new Float64Array(stacks);
  perStack = pseudoChannelsPerStack;
}

/** An answer of pseudo-channel `p` is complete at `end` half clocks; all times in half clocks. */
export function answerReady(
  p: number,
  handle: number,
  kind: number,
  arrived: number,
  command: number,
  column: number,
  end: number,
): void {
  const d = handle * RECORD_DOUBLES;
  const i = handle * RECORD_INTS;
  doubles[d + ARRIVE] = arrived;
  doubles[d + NUMBER_OR_COMMAND] = command;
  doubles[d + FIRST_COLUMN] = column;
  doubles[d + DATA_END] = end;
  ints[i + FLAGS] |= kind << 2;
  const stack = (p / perStack) | 0;
  const ck = Math.ceil(end / 2);
  const at = stack * size + (ck & mask);
  waiting[stack]++;
  const last = tail[at];
  if (last < 0) {
    head[at] = handle;
    tail[at] = handle;
    ints[i + NEXT] = -1;
  } else if (ints[last * RECORD_INTS + PLACE] <= p) {
    ints[last * RECORD_INTS + NEXT] = handle;
    ints[i + NEXT] = -1;
    tail[at] = handle;
  } else {
    insert(at, handle, p);
  }
}

/** Puts a late answer behind those of its own and lower pseudo-channels. */
function insert(at: number, handle: number, p: number): void {
  let before = -1;
  let after = head[at];
  while (ints[after * RECORD_INTS + PLACE] <= p) {
    before = after;
    after = ints[after * RECORD_INTS + NEXT];
  }
  ints[handle * RECORD_INTS + NEXT] = after;
  if (before < 0) head[at] = handle;
  else ints[before * RECORD_INTS + NEXT] = handle;
}

/** Hands on, in order, all answers of a stack complete before clock `until`. `leave` gets the handle. */
export function drainEgress(stack: number, until: number, leave: (handle: number) => void): void {
  if (waiting[stack] > 0) {
    for (let ck = drained[stack]; ck < until; ck++) {
      const at = stack * size + (ck & mask);
      let handle = head[at];
      if (handle < 0) continue;
      head[at] = -1;
      tail[at] = -1;
      while (handle >= 0) {
        const following = ints[handle * RECORD_INTS + NEXT];
        waiting[stack]--;
        leave(handle);
        handle = following;
      }
      if (waiting[stack] === 0) break;
    }
  }
  if (until > drained[stack]) drained[stack] = until;
}

/** With nothing waiting, moves the drained mark on to clock `ck`, so that no drain walks over an idle stretch. */
export function skipEgress(ck: number): void {
  for (let stack = 0; stack < drained.length; stack++) if (ck > drained[stack]) drained[stack] = ck;
}

/** Whether any answer is still waiting to be complete. */
export function egressBusy(): boolean {
  for (let stack = 0; stack < waiting.length; stack++) if (waiting[stack] > 0) return true;
  return false;
}
