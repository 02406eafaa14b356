import { STACK_CLASSES } from './recording.js';

/**
 * The bandwidth stack (Eyerman, Heirman and Hur, 2022) while the run goes on. Each pseudo-channel's data bus is tiled, from clock
 * 0 to the end, by the bursts on it and the gaps between them. A gap is cut at the moments its limits would have let the burst go,
 * in the order chargeColumn() takes them, and each piece goes to the limit that ends it. The pieces telescope, so their sum is the
 * gap, exactly. The same pieces are added up three times: by pseudo-channel, by the kernel whose request ended them, and by slice
 * of time. What reads wait for in the queues is charged along: the time all of them spent waiting since the column command before
 * is shared out over the pieces of that time.
 */

const CLASS_BITS = 4;
const CLASSES = STACK_CLASSES.length; // 16: indices below are shifted, not multiplied
const REFRESH = STACK_CLASSES.indexOf('refresh');
const ROW_CYCLE = STACK_CLASSES.indexOf('row_cycle');
const ACTIVATE_WINDOW = STACK_CLASSES.indexOf('activate_window');
const COLUMN_GAP = STACK_CLASSES.indexOf('column_gap');
const TURNAROUND = STACK_CLASSES.indexOf('turnaround');
const COMMAND_BUS = STACK_CLASSES.indexOf('command_bus');
const DRAIN = STACK_CLASSES.indexOf('starved_drain');
const IMBALANCE = STACK_CLASSES.indexOf('starved_imbalance');
const SLICES = 512;
const FIRST_SLICE_CK = 256;
const MAX_PSEUDO = 4096;
const MAX_KERNELS = 65536; // as many as a trace may have; pages are not touched until used

const stack = new Float64Array(MAX_PSEUDO << CLASS_BITS); // (p << CLASS_BITS) + class: ck of the data bus
const waits = new Float64Array(MAX_PSEUDO << CLASS_BITS); // (p << CLASS_BITS) + class: reads waiting x half clocks
const byKernel = new Float64Array(MAX_KERNELS << CLASS_BITS); // (kernel << CLASS_BITS) + class: ck
const bySlice = new Float64Array(SLICES << CLASS_BITS); // (slice << CLASS_BITS) + class: ck, all pseudo-channels
const begins = new Float64Array(MAX_KERNELS); // clock of a kernel's first issue
const lastKernel = new Int32Array(MAX_PSEUDO); // per pseudo-channel: of the last burst, -1 when there was none
const SLICE = new Float64Array([FIRST_SLICE_CK, 1 / FIRST_SLICE_CK]); // length of a slice in ck, and its inverse
let kernels = 0; // kernels charged so far

export function resetAttribution(pseudoChannels: number): void {
  stack.fill(0, 0, pseudoChannels << CLASS_BITS);
  waits.fill(0, 0, pseudoChannels << CLASS_BITS);
  byKernel.fill(0, 0, kernels << CLASS_BITS);
  bySlice.fill(0);
  lastKernel.fill(-1, 0, pseudoChannels);
  SLICE[0] = FIRST_SLICE_CK;
  SLICE[1] = 1 / FIRST_SLICE_CK;
  kernels = 0;
}

/** The first request of a kernel is issued at clock `ck`: a data bus that idled before that did not wait for this kernel. */
export function kernelBegins(kernel: number, ck: number): void {
  begins[kernel] = ck;
}

/**
 * Charges a column command of `kernel` at `t` whose burst of `burst` ck starts at clock `start` (absolute) after a data bus idle
 * for `gap` half clocks (less than 1: none). Other times are half clocks on the clock of `t`. Limits, earliest first: the queue
 * was empty until `since` (charged to `cause`, whatever was refreshed meanwhile: that cost nobody anything), the bank was
 * refreshing until `bankRefreshEnd`, the row cycle alone would have let the column go at `rowReady`, the activate window at
 * `windowReady`, the row bus at `bankReady`, the column separation at `groupReady` (a turnaround when `kind` is not
 * `lastKind`); what is left is the wait for the column command bus. `waited` is the time reads spent in the queue since the
 * column command before, at `before`, in entries x half clocks.
 */
export function chargeColumn(
  p: number,
  kernel: number,
  kind: number,
  lastKind: number,
  t: number,
  start: number,
  burst: number,
  gap: number,
  since: number,
  cause: number,
  bankRefreshEnd: number,
  rowReady: number,
  windowReady: number,
  bankReady: number,
  groupReady: number,
  before: number,
  waited: number,
): void {
  if (kernel >= kernels) kernels = kernel + 1;
  const at = p << CLASS_BITS;
  const of = kernel << CLASS_BITS;
  const previous = lastKernel[p];
  lastKernel[p] = kernel;
  stack[at + kind] += burst;
  byKernel[of + kind] += burst;
  const idle = gap > 0 ? gap >> 1 : 0;
  // in one slice of time nearly always
  let slice = Math.floor((start - idle) * SLICE[1]);
  const whole = start + burst <= (slice + 1) * SLICE[0] && slice < SLICES;
  slice <<= CLASS_BITS;
  if (whole) bySlice[slice + kind] += burst;
  else spread(kind, start, burst);
  // the command before took its burst's time, unless nothing was queued since
  const shared = since > before ? 0 : burst;
  if (idle === 0) {
    if (waited > 0) waits[at + lastKind] += waited;
    return;
  }
  const served = after(idle, t, since);
  const refreshed = after(served, t, bankRefreshEnd);
  const cycled = after(refreshed, t, rowReady);
  const windowed = after(cycled, t, windowReady);
  const bussed = after(windowed, t, bankReady);
  const separated = after(bussed, t, groupReady);
  const separation = kind === lastKind ? COLUMN_GAP : TURNAROUND;
  // what the bus idled before this kernel began is the time of the kernel it served before
  if (previous !== kernel && previous >= 0) {
    const early = Math.min(idle - served, begins[kernel] - (start - idle));
    if (early > 0) {
      byKernel[of + cause] -= early;
      byKernel[(previous << CLASS_BITS) + cause] += early;
    }
  }
  if (whole) {
    if (served !== idle) {
      stack[at + cause] += idle - served;
      byKernel[of + cause] += idle - served;
      bySlice[slice + cause] += idle - served;
    }
    stack[at + REFRESH] += served - refreshed;
    byKernel[of + REFRESH] += served - refreshed;
    bySlice[slice + REFRESH] += served - refreshed;
    stack[at + ROW_CYCLE] += refreshed - cycled;
    byKernel[of + ROW_CYCLE] += refreshed - cycled;
    bySlice[slice + ROW_CYCLE] += refreshed - cycled;
    stack[at + ACTIVATE_WINDOW] += cycled - windowed;
    byKernel[of + ACTIVATE_WINDOW] += cycled - windowed;
    bySlice[slice + ACTIVATE_WINDOW] += cycled - windowed;
    stack[at + COMMAND_BUS] += windowed - bussed + separated;
    byKernel[of + COMMAND_BUS] += windowed - bussed + separated;
    bySlice[slice + COMMAND_BUS] += windowed - bussed + separated;
    stack[at + separation] += bussed - separated;
    byKernel[of + separation] += bussed - separated;
    bySlice[slice + separation] += bussed - separated;
  } else {
    charge(at, of, cause, start - idle, idle - served);
    charge(at, of, REFRESH, start - served, served - refreshed);
    charge(at, of, ROW_CYCLE, start - refreshed, refreshed - cycled);
    charge(at, of, ACTIVATE_WINDOW, start - cycled, cycled - windowed);
    charge(at, of, COMMAND_BUS, start - windowed, windowed - bussed);
    charge(at, of, separation, start - bussed, bussed - separated);
    charge(at, of, COMMAND_BUS, start - separated, separated);
  }
  if (waited > 0) {
    const each = waited / (shared + served);
    if (shared > 0) waits[at + lastKind] += each * shared;
    if (served > 0) {
      waits[at + REFRESH] += each * (served - refreshed);
      waits[at + ROW_CYCLE] += each * (refreshed - cycled);
      waits[at + ACTIVATE_WINDOW] += each * (cycled - windowed);
      waits[at + COMMAND_BUS] += each * (windowed - bussed + separated);
      waits[at + separation] += each * (bussed - separated);
    } else if (shared === 0) waits[at + lastKind] += waited;
  }
}

/** How many of the last `left` clocks before `t` lie after `ready`. */
function after(left: number, t: number, ready: number): number {
  return ready <= t - 2 * left ? left : ready >= t ? 0 : (t - ready) >> 1;
}

function charge(at: number, of: number, cls: number, from: number, ck: number): void {
  if (ck === 0) return;
  stack[at + cls] += ck;
  byKernel[of + cls] += ck;
  spread(cls, from, ck);
}

/** Adds `ck` clocks from clock `from` on to the slices they lie in. */
function spread(cls: number, from: number, ck: number): void {
  const end = from + ck;
  while (end > SLICES * SLICE[0]) merge();
  let slice = Math.floor(from * SLICE[1]);
  while (from < end) {
    const to = Math.min(end, (slice + 1) * SLICE[0]);
    bySlice[(slice << CLASS_BITS) + cls] += to - from;
    from = to;
    slice++;
  }
}

/** Joins slices two by two, so that twice the time fits. */
function merge(): void {
  for (let i = 0; i < SLICES << (CLASS_BITS - 1); i++) {
    const first = ((i >> CLASS_BITS) << (CLASS_BITS + 1)) + (i & (CLASSES - 1));
    bySlice[i] = bySlice[first] + bySlice[first + CLASSES];
  }
  bySlice.fill(0, SLICES << (CLASS_BITS - 1));
  SLICE[0] *= 2;
  SLICE[1] /= 2;
}

/** Charges the idle tail of `ck` clocks from clock `from` on: the first `before` of them while others still got work. */
export function chargeTail(p: number, from: number, ck: number, before: number): void {
  const imbalance = Math.min(ck, before);
  chargeIdle(p, -1, IMBALANCE, from, imbalance);
  chargeIdle(p, -1, DRAIN, from + imbalance, ck - imbalance);
}

/**
 * Charges `ck` clocks from clock `from` on, in which nothing was queued, to the class of what ended them: a request of `kernel`,
 * or -1 at the end of the run.
 */
export function chargeIdle(p: number, kernel: number, cause: number, from: number, ck: number): void {
  stack[(p << CLASS_BITS) + cause] += ck;
  if (kernel >= 0) byKernel[(kernel << CLASS_BITS) + cause] += ck;
  spread(cause, from, ck);
}

export interface Attribution {
  readonly stack: Float64Array; // p * classes + class, ck
  readonly readWait: Float64Array; // p * classes + class, reads x half clocks
  readonly byKernel: Float64Array; // kernel * classes + class, ck
  readonly bySlice: Float64Array; // slice * classes + class, ck, up to the last slice charged
  readonly sliceCk: number;
}

/** What was charged so far, of `pseudoChannels` pseudo-channels and `count` kernels. */
export function attribution(pseudoChannels: number, count: number): Attribution {
  let used = SLICES << CLASS_BITS;
  while (used > 0 && bySlice[used - 1] === 0) used--;
  return {
    stack: stack.slice(0, pseudoChannels << CLASS_BITS),
    readWait: waits.slice(0, pseudoChannels << CLASS_BITS),
    byKernel: byKernel.slice(0, count << CLASS_BITS),
    bySlice: bySlice.slice(0, Math.ceil(used / CLASSES) * CLASSES),
    sliceCk: SLICE[0],
  };
}
