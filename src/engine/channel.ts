import type { MemoryGroup } from '../config/package.js';
import type { Separations } from '../model/separations.js';
import type { System } from '../model/system.js';
import { chargeColumn, chargeIdle, chargeTail, resetAttribution } from './attribution.js';
import { creditFreed } from './credits.js';
import { ACKNOWLEDGEMENT, answerReady, DATA, FORWARDED } from './egress.js';
import { COMMANDS, type CommandSink } from './recording.js';
import { countMoved } from './traffic.js';

/**
 * The DRAM channel and its controller, stepped from one possible command to the next. All hot state is in this one module, in
 * constants that are not exported, because the optimising compiler folds those and no others; the price is a long file, so it
 * is laid out in the order of a request's life: arrive, classify, choose, issue, finish; then refresh, then the main loop.
 *
 * Times are half clocks relative to `epoch`. Indices into `M` are record starts: `pr` a pseudo-channel's, `br` a bank's, `slot`
 * a queue entry's; 0 is never a record, so it stands for "none".
 */

const FAR = 0x7fffffff; // later than any time
const UNSET = -0x3fffffff; // a time not reached yet; long before any time, and still safe to take a time from

const CAPACITY = 1 << 25; // Int32 words; the pages are not touched until used
const M = new Int32Array(CAPACITY).subarray(12); // large buffers start 16 bytes into a page; this puts records on cache lines

// pseudo-channel record; candidate kinds are 1 column, 2 PRE, 3 ACT
const PR_WORDS = 1024;
const MODE = 0; // queue being served: 0 reads, 1 writes
const N = 0; // + kind (1 … 3): banks in the candidate list
const TIME = 3; // + kind: cached choice: when
const BEST = 6; // + kind: … its list entry
const BEST_AGE = 9; // + kind: … its age
const DIRTY = 12; // + kind: the choice must be made anew
const IN_HEAD = 16; // requests on their way in, in order of arrival
const IN_TAIL = 17;
const COUNT = 18; // + op: entries that may be served
const N_PARKED = 20; // + op
const OLD_HEAD = 22; // + op: entries by age
const OLD_TAIL = 24; // + op
const FREE = 26; // + op: unused slots
const URGENT = 28; // + op: entry past the age bound, 0 when none
const NEXT_AGE = 30;
const PPD_READY = 31; // earliest next PRE (tPPD)
const DATA_END = 32; // end of the last burst
const SINCE = 33; // when the queues last became non-empty
const CAUSE = 34; // class of the request that ended the last emptiness
const LAST_KIND = 35; // of the last column command
const REF_END = 37; // per-bank refresh: tRREFD since the last one has passed
const TICK = 38; // next time the refresh bookkeeping wants a look
const REF_TIME = 39; // next refresh command (or the precharge before it)
const REF_UNIT = 40;
const PARKED = 41; // entries that wait for an older one to the same address
const LAST_COLUMN = 42; // time of the last column command
const FORCED = 43; // 1: draining writes down to the low watermark
const OLDEST_OPEN = 44; // page timeout: banks with an open row, by last use
const NEWEST_OPEN = 45;
const OCC_AT = 46; // when the queue occupancy integrals were last brought up to date
const REF_BANK = 47; // per-bank refresh under way: the bank
const LAST_OF = 48; // + op: time of the last column command of that kind
const NEXT_AT = 50; // cached: time of the pseudo-channel's next event, whichever channel goes first
const NEXT_EVENT = 51; // … and which, see runChannel
const STALE = 52; // 1: that must be found anew
const DUE = 64; // + unit: next refresh interval starts
const OWED = 68; // + unit: refreshes due and not done; negative when done ahead
const WANTED = 72; // + unit: 1 while the unit is being closed for a refresh
const LAST_REF = 76; // + unit: time of the last refresh
const DONE = 80; // + unit: per-bank refresh, banks of the set already refreshed, a bit each
const RECENT = 88; // + sid * 4: the last four ACT times
const RECENT_AT = 104; // + sid: index of the oldest of them
const COL_READY = 112; // + op * 32 + group: earliest column command by column separations from those of the same kind
const ACT_READY_G = 176; // + group: earliest ACT by tRRD and tFAW
const LAST_WRITE = 208; // + group: last write command
const LIST = 0; // + 256 * kind: candidate lists of four-word entries
const LIST_SHIFT = 8;

// entry of a candidate list, so that a choice reads one stretch of memory
const E_BANK = 0;
const E_READY = 1; // the bank's own earliest time for the command
const E_GROUP = 2;
const E_AGE = 3; // of the request it is for

// bank record
const BR_WORDS = 32;
const OPEN = 0; // open row, -1 when closed
const ACT_READY = 1;
const PRE_READY = 2;
const BANK_COL_READY = 3; // + op: ACT + tRCD
const HEAD = 5; // + op: entries of this bank, oldest first
const TAIL = 7; // + op
const HIT = 9; // entry whose column command is next, 0 when none
const HITS = 10; // column commands since ACT
const KIND = 11; // candidate list: 0 none, 1 column, 2 PRE, 3 ACT
const POSITION = 12; // its entry in that list
const GROUP = 13;
const BLOCKED = 15; // a refresh is about to take the bank
const ACT_WANTED = 16; // when the last ACT could have gone but for the activate window
const ACT_WINDOW = 17; // … and but for the row bus
const BANK_REF_END = 18;
const BANK_LAST = 19; // last column command
const OPEN_PREV = 20; // page timeout list
const OPEN_NEXT = 21;
const BANK_INDEX = 22;
const BANK_ATOMS = 23; // column commands, counted since the last re-base; see shiftTimes
const BANK_ACTS = 24;
const BANK_CONFLICTS = 25;

// queue slot record
const SLOT_WORDS = 16;
const B_NEXT = 0; // same bank, younger
const B_PREV = 1;
const A_NEXT = 2; // same queue, younger; also the free, inbox and parked lists
const A_PREV = 3;
const SLOT_BANK = 4; // bank record
const ROW = 5;
const COLUMN = 6; // next column
const LEFT = 7; // atoms still to come
const ARRIVED = 8;
const FIRST = 9; // first command
const FIRST_COLUMN = 10;
const HANDLE = 11;
const KERNEL = 12;
const SLOT_AGE = 13;
const FLAGS = 14; // bit 0: op; bit 1: someone waits for this entry; bits 8…: starvation class
const ATOMS = 15;

const MAX_PSEUDO = 4096;
const channelNow = new Int32Array(MAX_PSEUDO); // per channel: time of the last event
const columnBus = new Int32Array(MAX_PSEUDO); // per channel: column command bus free
const rowBus = new Int32Array(MAX_PSEUDO);
const lastPc = new Int32Array(MAX_PSEUDO); // per channel: pseudo-channel that issued a column command last
const queued = new Int32Array(MAX_PSEUDO); // per channel: requests on their way in or queued
const activeList = new Int32Array(MAX_PSEUDO);
const isActive = new Uint8Array(MAX_PSEUDO);
const reads = new Float64Array(MAX_PSEUDO);
const writes = new Float64Array(MAX_PSEUDO);
const activates = new Float64Array(MAX_PSEUDO);
const precharges = new Float64Array(MAX_PSEUDO);
const refreshesAll = new Float64Array(MAX_PSEUDO);
const refreshesBank = new Float64Array(MAX_PSEUDO);
const rowHits = new Float64Array(MAX_PSEUDO);
const rowMisses = new Float64Array(MAX_PSEUDO);
const rowConflicts = new Float64Array(MAX_PSEUDO);
const forwarded = new Float64Array(MAX_PSEUDO);
const occupancy = new Float64Array(2 * MAX_PSEUDO); // entry x half clocks, p * 2 + op
const residence = new Float64Array(2 * MAX_PSEUDO); // sum of (freed - arrived), half clocks
const entries = new Int32Array(2 * MAX_PSEUDO); // admitted and not freed
const deepest = new Int32Array(2 * MAX_PSEUDO);
const slotNumber = new Float64Array(MAX_PSEUDO * 256); // per slot index: the request's number, for the log

const readWaited = new Float64Array(MAX_PSEUDO); // occupancy of the read queue up to the last column command
const idleCarry = new Float64Array(MAX_PSEUDO); // half clocks of idle data bus that no longer fit between DATA_END and now
const bankCounts = new Float64Array(3 * MAX_PSEUDO * 64); // (p * banks + bank) * 3: atoms, ACTs, conflicts before the last re-base
let active = 0; // channels in activeList
const ORIGIN = new Float64Array(2); // absolute half clocks: [EPOCH] added to every relative time, [WRITE_END] end of the last write burst
const EPOCH = 0;
const WRITE_END = 1;
// the run's constants, by their index in K: reads of a constant array cost less than reads of module variables
const K = new Int32Array(64);
const PCS = 0; // pseudo-channels per channel
const CHANNELS = 1;
const BANKS = 2;
const GROUPS = 3;
const SIDS = 4;
const BANKS_PER_SID = 5;
const BANKS_PER_GROUP = 6;
const BANK_BASE = 7; // where bank records start
const SLOT_BASE = 8;
const DEPTH = 9; // slots per pseudo-channel, reads then writes
const tRC = 10;
const tRAS = 11;
const tRP = 12;
const RCD_READ = 13;
const RCD_WRITE = 14;
const READ_TO_PRE = 15;
const WRITE_TO_PRE = 16;
const PRE_TO_PRE = 17;
const FAW = 18;
const RFC_ALL = 19;
const RFC_BANK = 20;
const RREFD = 21;
const REFI = 22;
const READ_LATENCY = 23;
const WRITE_LATENCY = 24;
const BURST = 25;
const READ_TO_WRITE = 26;
const WRITE_TO_READ_S = 27;
const WRITE_TO_READ_L = 28;
const SHARED_WINDOW = 29; // one activate window over all stack IDs
const ACT_HOLD = 30;
const PRE_HOLD = 31;
const REF_HOLD = 32;
const COL_HOLD = 33;
const ONE_BUS = 34;
const FCFS = 35;
const HIT_CAP = 36;
const AGE_BOUND = 37;
const PAGE = 38; // 0 open, 1 closed, 2 timeout
const PAGE_TIMEOUT = 39;
const DRAIN_HIGH = 40;
const DRAIN_LOW = 41;
const PIPELINE = 42;
const REFRESH_MODE = 43; // 0 off, 1 all-bank, 2 per-bank
const REF_UNITS = 44; // refresh units per pseudo-channel
const POSTPONE = 45;
const PULL_IN = 46;
const GAP_LIMIT = 47; // longest wait before a refresh is forced, half clocks
const REF_IN_WINDOW = 48;
const ATTRIBUTION = 49;
const REF_NAMES_SID = 50; // 1 where REFab closes one stack ID, whatever their number
const columnSeparation = new Int32Array(1024); // see Separations.column
const actSeparation = new Int32Array(1024);
const windowShared = new Uint8Array(1024);
let sink: CommandSink | null = null;

const COMMAND = Object.fromEntries(COMMANDS.map((name, i) => [name, i])) as Record<(typeof COMMANDS)[number], number>;
const CMD_ACT = COMMAND.ACT;
const CMD_RD = COMMAND.RD;
const CMD_PRE = COMMAND.PRE;

export interface ChannelOptions {
  readonly attribution: boolean;
  readonly onCommand: CommandSink | null;
}

/** Lays out and clears the state of every channel for a new run. */
export function resetChannels(system: System, sep: Separations, memory: MemoryGroup, options: ChannelOptions): void {
  const { controller, refresh, buses } = memory;
  K[PCS] = system.pseudoChannels;
  K[CHANNELS] = system.stacks * system.channels;
  K[BANKS] = system.banks;
  K[GROUPS] = system.groups;
  K[SIDS] = system.sids;
  K[BANKS_PER_SID] = system.banks / system.sids;
  K[BANKS_PER_GROUP] = system.banksPerGroup;
  K[DEPTH] = controller.readQueue + controller.writeQueue;
  K[BANK_BASE] = PR_WORDS * (system.total + 1);
  K[SLOT_BASE] = K[BANK_BASE] + BR_WORDS * K[BANKS] * system.total;
  const used = K[SLOT_BASE] + SLOT_WORDS * K[DEPTH] * system.total;
  if (
    system.total > MAX_PSEUDO ||
    used > M.length ||
    K[DEPTH] * system.total > slotNumber.length ||
    K[BANKS] > 64 ||
    K[GROUPS] > 32 ||
    K[SIDS] > 4
  ) {
    throw new RangeError(
      `the package is larger than the engine's tables: at most ${MAX_PSEUDO} pseudo-channels of 64 banks, 32 bank groups and 4 stack IDs, and ${slotNumber.length} queue entries in all`,
    );
  }
  M.fill(0, 0, used);
  K[tRC] = sep.tRC;
  K[tRAS] = sep.tRAS;
  K[tRP] = sep.tRP;
  K[RCD_READ] = sep.actToRead;
  K[RCD_WRITE] = sep.actToWrite;
  K[READ_TO_PRE] = sep.readToPre;
  K[WRITE_TO_PRE] = sep.writeToPre;
  K[PRE_TO_PRE] = sep.preToPre;
  K[FAW] = sep.faw;
  K[RFC_ALL] = sep.refreshAll;
  K[RFC_BANK] = sep.refreshBank;
  K[RREFD] = sep.refreshBankToNext;
  K[REFI] = sep.refreshInterval;
  K[READ_LATENCY] = sep.readLatency;
  K[WRITE_LATENCY] = sep.writeLatency;
  K[BURST] = sep.burst;
  columnSeparation.set(sep.column);
  K[READ_TO_WRITE] = sep.readToWrite;
  K[WRITE_TO_READ_S] = sep.writeToReadShort;
  K[WRITE_TO_READ_L] = sep.writeToReadLong;
  actSeparation.set(sep.act);
  windowShared.set(sep.windowShared);
  K[SHARED_WINDOW] = memory.activateWindowScope === 'pseudo_channel' ? 1 : 0;
  K[ACT_HOLD] = buses.actHalfCk;
  K[PRE_HOLD] = buses.preHalfCk;
  K[REF_HOLD] = buses.refHalfCk;
  K[COL_HOLD] = buses.columnHalfCk;
  K[ONE_BUS] = !buses.separate ? 1 : 0;
  K[FCFS] = controller.scheduler === 'fcfs' ? 1 : 0;
  K[HIT_CAP] = controller.hitCap;
  K[AGE_BOUND] = Math.min(2 * controller.ageBoundCk, 1 << 28);
  K[PAGE] = controller.page === 'open' ? 0 : controller.page === 'closed' ? 1 : 2;
  K[PAGE_TIMEOUT] = 2 * controller.pageTimeoutCk;
  K[DRAIN_HIGH] = controller.drainHigh;
  K[DRAIN_LOW] = controller.drainLow;
  K[PIPELINE] = 2 * controller.pipelineCk;
  K[REFRESH_MODE] = refresh.mode === 'off' ? 0 : refresh.mode === 'all-bank' ? 1 : 2;
  K[REF_UNITS] = K[REFRESH_MODE] === 2 || refresh.scope === 'sid' ? K[SIDS] : 1;
  K[POSTPONE] = refresh.postpone;
  K[PULL_IN] = K[REFRESH_MODE] === 1 ? refresh.pullIn : 0;
  // a refresh is forced early enough to close the rows before the gap runs out, whatever was issued last and whoever has the bus
  const closing = Math.max(K[tRC], Math.max(K[tRAS], K[READ_TO_PRE], K[WRITE_TO_PRE]) + K[tRP]) + 64;
  K[GAP_LIMIT] = (K[POSTPONE] + 1) * K[REFI] - closing;
  K[REF_IN_WINDOW] = refresh.refpbInActivateWindow ? 1 : 0;
  K[REF_NAMES_SID] = refresh.scope === 'sid' ? 1 : 0;
  K[ATTRIBUTION] = options.attribution ? 1 : 0;
  sink = options.onCommand;
  ORIGIN[EPOCH] = 0;
  active = 0;
  ORIGIN[WRITE_END] = 0;
  for (const counter of [channelNow, columnBus, rowBus, lastPc, queued, isActive, reads, writes, activates])
    counter.fill(0);
  for (const counter of [precharges, refreshesAll, refreshesBank, rowHits, rowMisses, rowConflicts, forwarded])
    counter.fill(0);
  for (const counter of [idleCarry, readWaited]) counter.fill(0);
  bankCounts.fill(0, 0, 3 * system.total * system.banks);
  for (const counter of [occupancy, residence, entries, deepest]) counter.fill(0);
  resetAttribution(system.total);
  for (let p = 0; p < system.total; p++) layOut(p, system.total, controller.readQueue);
}

function layOut(p: number, total: number, readQueue: number): void {
  const pr = PR_WORDS * (p + 1);
  for (let kind = 1; kind <= 3; kind++) M[pr + DIRTY + kind] = 1;
  M[pr + PPD_READY] = UNSET;
  M[pr + LAST_OF] = UNSET;
  M[pr + LAST_OF + 1] = UNSET;
  M[pr + TICK] = FAR;
  M[pr + REF_TIME] = FAR;
  M[pr + REF_END] = UNSET;
  M[pr + LAST_COLUMN] = UNSET;
  for (let i = COL_READY; i < LAST_WRITE + 32; i++) M[pr + i] = UNSET;
  for (let i = 0; i < 16; i++) M[pr + RECENT + i] = UNSET;
  for (let b = 0; b < K[BANKS]; b++) {
    const br = bankRecord(p, b);
    M[br + OPEN] = -1;
    M[br + ACT_READY] = UNSET;
    M[br + PRE_READY] = UNSET;
    M[br + BANK_REF_END] = UNSET;
    M[br + GROUP] = Math.floor(b / K[BANKS_PER_GROUP]);
    M[br + BANK_INDEX] = b;
  }
  for (let i = 0; i < K[DEPTH]; i++) {
    const slot = K[SLOT_BASE] + SLOT_WORDS * (p * K[DEPTH] + i);
    const op = i < readQueue ? 0 : 1;
    M[slot + FLAGS] = op;
    M[slot + A_NEXT] = M[pr + FREE + op];
    M[pr + FREE + op] = slot;
  }
  if (K[REFRESH_MODE] !== 0) {
    for (let u = 0; u < K[REF_UNITS]; u++) {
      const interval = refreshStep();
      // phases are spread evenly over pseudo-channels and their units
      M[pr + DUE + u] = Math.max(1, Math.floor((interval * (p * K[REF_UNITS] + u + 1)) / (total * K[REF_UNITS])));
      M[pr + LAST_REF + u] = M[pr + DUE + u] - interval; // as if it had gone on for ever
    }
    setTick(pr);
  }
}

function bankRecord(p: number, bank: number): number {
  return K[BANK_BASE] + BR_WORDS * (p * K[BANKS] + bank);
}

function pseudoOf(pr: number): number {
  return ((pr / PR_WORDS) | 0) - 1;
}

/** From one refresh of a unit to the next: tREFI, or its share a bank. */
function refreshStep(): number {
  return K[REFRESH_MODE] === 2 ? Math.floor(K[REFI] / K[BANKS_PER_SID]) : K[REFI];
}

// ---- arrive ----------------------------------------------------------------------------------------------------------------

/**
 * Sends a request to a controller queue; the caller holds a credit, so there is a slot. `arrive` is absolute half clocks and
 * never earlier than that of the request sent to this pseudo-channel before. `cause` is the class to charge if the queue starved.
 */
export function sendToChannel(
  p: number,
  op: number,
  arrive: number,
  bank: number,
  row: number,
  column: number,
  atoms: number,
  handle: number,
  kernel: number,
  cause: number,
  number: number,
): void {
  const pr = PR_WORDS * (p + 1);
  const slot = M[pr + FREE + op];
  M[pr + FREE + op] = M[slot + A_NEXT];
  M[slot + SLOT_BANK] = K[BANK_BASE] + BR_WORDS * (p * K[BANKS] + bank);
  M[slot + ROW] = row;
  M[slot + COLUMN] = column;
  M[slot + LEFT] = atoms;
  M[slot + ATOMS] = atoms;
  M[slot + ARRIVED] = arrive - ORIGIN[EPOCH];
  M[slot + FIRST] = UNSET;
  M[slot + FIRST_COLUMN] = UNSET;
  M[slot + HANDLE] = handle;
  M[slot + KERNEL] = kernel;
  M[slot + FLAGS] = op | (cause << 8);
  M[slot + A_NEXT] = 0;
  if (sink !== null) slotNumber[((slot - K[SLOT_BASE]) / SLOT_WORDS) | 0] = number;
  if (M[pr + IN_HEAD] === 0) M[pr + IN_HEAD] = slot;
  else M[M[pr + IN_TAIL] + A_NEXT] = slot;
  M[pr + IN_TAIL] = slot;
  const channel = (p / K[PCS]) | 0;
  queued[channel]++;
  if (isActive[channel] === 0) {
    isActive[channel] = 1;
    activeList[active++] = channel;
  }
}

/** Takes the next request of the inbox into the queues at its arrival time `t`. */
function admit(pr: number, t: number): void {
  const slot = M[pr + IN_HEAD];
  M[pr + IN_HEAD] = M[slot + A_NEXT];
  const p = pseudoOf(pr);
  const op = M[slot + FLAGS] & 1;
  integrate(pr, p, t);
  const count = ++entries[p * 2 + op];
  if (count > deepest[p * 2 + op]) deepest[p * 2 + op] = count;
  M[slot + SLOT_AGE] = M[pr + NEXT_AGE]++;
  if (isEmpty(pr)) {
    M[pr + SINCE] = t;
    M[pr + CAUSE] = M[slot + FLAGS] >> 8;
  }
  if (op === 1)
    answerReady(
      p,
      M[slot + HANDLE],
      ACKNOWLEDGEMENT,
      t + ORIGIN[EPOCH],
      t + ORIGIN[EPOCH],
      t + ORIGIN[EPOCH],
      t + K[PIPELINE] + ORIGIN[EPOCH],
    );
  place(pr, p, slot, op, t);
}

/** Puts an entry where it belongs: served from the write queue, behind an older entry to the same address, or in its bank. */
function place(pr: number, p: number, slot: number, op: number, t: number): void {
  const br = M[slot + SLOT_BANK];
  if (M[br + HEAD + (op ^ 1)] !== 0 || M[pr + PARKED] !== 0) {
    const older = conflicting(pr, br, slot, op);
    if (older !== 0) {
      if (op === 0 && covers(older, slot)) {
        forwarded[p]++;
        answerReady(
          p,
          M[slot + HANDLE],
          FORWARDED,
          M[slot + ARRIVED] + ORIGIN[EPOCH],
          t + ORIGIN[EPOCH],
          t + ORIGIN[EPOCH],
          t + K[PIPELINE] + ORIGIN[EPOCH],
        );
        free(pr, p, slot, op, t);
        return;
      }
      M[older + FLAGS] |= 2;
      M[slot + A_NEXT] = 0;
      if (M[pr + PARKED] === 0) M[pr + PARKED] = slot;
      else {
        let last = M[pr + PARKED];
        while (M[last + A_NEXT] !== 0) last = M[last + A_NEXT];
        M[last + A_NEXT] = slot;
      }
      M[pr + N_PARKED + op]++;
      chooseMode(pr, t);
      return;
    }
  }
  const last = M[pr + OLD_TAIL + op];
  M[slot + A_NEXT] = 0;
  M[slot + A_PREV] = last;
  if (last === 0) M[pr + OLD_HEAD + op] = slot;
  else M[last + A_NEXT] = slot;
  M[pr + OLD_TAIL + op] = slot;
  const youngest = M[br + TAIL + op];
  M[slot + B_NEXT] = 0;
  M[slot + B_PREV] = youngest;
  if (youngest === 0) M[br + HEAD + op] = slot;
  else M[youngest + B_NEXT] = slot;
  M[br + TAIL + op] = slot;
  M[pr + COUNT + op]++;
  if (op === M[pr + MODE]) {
    const kind = M[br + KIND];
    if (youngest === 0 || (kind === 2 && M[slot + ROW] === M[br + OPEN])) classify(pr, br, t);
  }
  chooseMode(pr, t);
}

/** The youngest older entry that `slot` may not pass: a write for a read; any entry for a write. 0 when there is none. */
function conflicting(pr: number, br: number, slot: number, op: number): number {
  let found = 0;
  for (let other = M[br + HEAD + (op ^ 1)]; other !== 0; other = M[other + B_NEXT]) {
    if (overlaps(other, slot)) found = other;
  }
  for (let other = M[pr + PARKED]; other !== 0; other = M[other + A_NEXT]) {
    if (other === slot) break;
    const otherOp = M[other + FLAGS] & 1;
    if (M[other + SLOT_BANK] === br && (op === 1 || otherOp === 1) && overlaps(other, slot)) found = other;
  }
  return found;
}

function overlaps(a: number, b: number): boolean {
  if (M[a + ROW] !== M[b + ROW]) return false;
  const aEnd = M[a + COLUMN] + M[a + LEFT];
  const aStart = aEnd - M[a + ATOMS];
  return M[b + COLUMN] < aEnd && M[b + COLUMN] + M[b + LEFT] > aStart;
}

/** Whether write entry `a` holds all the atoms that read `b` asks for. */
function covers(a: number, b: number): boolean {
  const aEnd = M[a + COLUMN] + M[a + LEFT];
  return (M[a + FLAGS] & 1) === 1 && M[b + COLUMN] >= aEnd - M[a + ATOMS] && M[b + COLUMN] + M[b + LEFT] <= aEnd;
}

function isEmpty(pr: number): boolean {
  return M[pr + COUNT] + M[pr + COUNT + 1] + M[pr + N_PARKED] + M[pr + N_PARKED + 1] === 0;
}

/** Brings the time integral of the queue occupancies up to `t`. */
function integrate(pr: number, p: number, t: number): void {
  const dt = t - M[pr + OCC_AT];
  if (dt > 0) {
    occupancy[p * 2] += dt * entries[p * 2];
    occupancy[p * 2 + 1] += dt * entries[p * 2 + 1];
    M[pr + OCC_AT] = t;
  }
}

// ---- classify: what each bank wants next -------------------------------------------------------------------------------------

/** Finds a bank's next command for the queue being served at `t` and moves it to the right candidate list. */
function classify(pr: number, br: number, t: number): void {
  const mode = M[pr + MODE];
  const head = M[br + HEAD + mode];
  let kind = 0;
  let hit = 0;
  let age = 0;
  let ready = 0;
  if (head !== 0 && M[br + BLOCKED] === 0) {
    const open = M[br + OPEN];
    age = M[head + SLOT_AGE];
    if (open < 0) {
      kind = 3;
      ready = M[br + ACT_READY];
    } else if (M[head + ROW] === open) {
      kind = 1;
      hit = head;
      ready = M[br + BANK_COL_READY + mode];
    } else {
      kind = 2;
      ready = M[br + PRE_READY];
      // an older conflict waits: hits go first until the cap, unless the conflict is past its age bound or order is strict
      if (K[FCFS] === 0 && M[br + HITS] < K[HIT_CAP] && M[pr + URGENT + mode] !== head) {
        for (hit = M[head + B_NEXT]; hit !== 0; hit = M[hit + B_NEXT]) if (M[hit + ROW] === open) break;
        if (hit !== 0) {
          kind = 1;
          age = M[hit + SLOT_AGE];
          ready = M[br + BANK_COL_READY + mode];
        }
      }
    }
  }
  M[br + HIT] = hit;
  const was = M[br + KIND];
  if (was !== kind && was !== 0) unlist(pr, br, was);
  M[br + KIND] = kind;
  if (kind === 0) return;
  let entry = M[br + POSITION];
  if (was === kind) {
    if (M[entry + E_AGE] === age) return;
    M[entry + E_AGE] = age;
    M[pr + DIRTY + kind] = 1;
    return;
  }
  entry = pr + LIST + (kind << LIST_SHIFT) + 4 * M[pr + N + kind]++;
  M[br + POSITION] = entry;
  M[entry + E_BANK] = br;
  M[entry + E_READY] = ready;
  const group = M[br + GROUP];
  M[entry + E_GROUP] = group;
  M[entry + E_AGE] = age;
  if (M[pr + DIRTY + kind] === 1) return;
  // a valid choice only has to be compared with the newcomer
  let e = ready > t ? ready : t;
  if (kind === 1) {
    const g = M[pr + COL_READY + (mode << 5) + group];
    e = ((g > e ? g : e) + 1) & ~1;
  } else {
    const g = kind === 2 ? M[pr + PPD_READY] : M[pr + ACT_READY_G + group];
    e = g > e ? g : e;
  }
  const best = M[pr + TIME + kind];
  if (e < best || (e === best && age < M[pr + BEST_AGE + kind])) {
    M[pr + TIME + kind] = e;
    M[pr + BEST + kind] = entry;
    M[pr + BEST_AGE + kind] = age;
  }
}

/** Takes a bank out of a candidate list; the last entry takes its place. */
function unlist(pr: number, br: number, kind: number): void {
  const last = pr + LIST + (kind << LIST_SHIFT) + 4 * --M[pr + N + kind];
  const entry = M[br + POSITION];
  const best = M[pr + BEST + kind];
  if (best === entry) M[pr + DIRTY + kind] = 1;
  else if (best === last) M[pr + BEST + kind] = entry;
  if (last !== entry) {
    const moved = M[last + E_BANK];
    M[entry + E_BANK] = moved;
    M[entry + E_READY] = M[last + E_READY];
    M[entry + E_GROUP] = M[last + E_GROUP];
    M[entry + E_AGE] = M[last + E_AGE];
    M[moved + POSITION] = entry;
  }
}

/** Chooses between serving reads and draining writes; see the watermarks of the controller. */
function chooseMode(pr: number, t: number): void {
  const r = M[pr + COUNT];
  const w = M[pr + COUNT + 1];
  let mode = 0;
  if (w > 0) {
    let forced = M[pr + FORCED];
    if (w >= K[DRAIN_HIGH] || M[pr + N_PARKED] > 0) forced = 1;
    else if (t - M[M[pr + OLD_HEAD + 1] + ARRIVED] > K[AGE_BOUND]) forced = 1;
    else if (w <= K[DRAIN_LOW]) forced = 0;
    M[pr + FORCED] = forced;
    if (forced === 1 || r === 0) mode = 1;
  }
  if (mode !== M[pr + MODE]) switchMode(pr, mode, t);
}

/** Turns the pseudo-channel to the other queue: the turnaround holds for every group, and each bank wants something else. */
function switchMode(pr: number, mode: number, t: number): void {
  M[pr + MODE] = mode;
  const to = pr + COL_READY + (mode << 5);
  const last = M[pr + LAST_OF + (mode ^ 1)];
  if (last !== UNSET) {
    for (let g = 0; g < K[GROUPS]; g++) {
      let e = last + (mode === 1 ? K[READ_TO_WRITE] : K[WRITE_TO_READ_S]);
      if (mode === 0 && M[pr + LAST_WRITE + g] !== UNSET) {
        const long = M[pr + LAST_WRITE + g] + K[WRITE_TO_READ_L];
        e = long > e ? long : e;
      }
      if (e > M[to + g]) M[to + g] = e;
    }
  }
  for (let kind = 1; kind <= 3; kind++) {
    M[pr + N + kind] = 0;
    M[pr + DIRTY + kind] = 1;
  }
  const first = bankRecord(pseudoOf(pr), 0);
  for (let br = first; br < first + K[BANKS] * BR_WORDS; br += BR_WORDS) {
    M[br + KIND] = 0;
    if (M[br + HEAD + mode] !== 0) classify(pr, br, t);
  }
}

/** Marks the oldest entry of the queue being served when it is past the age bound. */
function watchAge(pr: number, t: number): void {
  const mode = M[pr + MODE];
  const oldest = M[pr + OLD_HEAD + mode];
  if (oldest !== 0 && t - M[oldest + ARRIVED] > K[AGE_BOUND] && M[pr + URGENT + mode] !== oldest) {
    M[pr + URGENT + mode] = oldest;
    classify(pr, M[oldest + SLOT_BANK], t);
  }
  if (mode === 0) {
    const write = M[pr + OLD_HEAD + 1];
    if (write !== 0 && t - M[write + ARRIVED] > K[AGE_BOUND]) chooseMode(pr, t);
  }
}

// ---- choose ----------------------------------------------------------------------------------------------------------------

/** Caches the earliest column command at or after `floor` (a whole clock); the oldest entry's among those of one clock. */
function chooseColumn(pr: number, floor: number): void {
  let best = FAR;
  let bestAge = FAR;
  let bestEntry = 0;
  const mode = M[pr + MODE];
  const groups = pr + COL_READY + (mode << 5);
  const from = pr + LIST + (1 << LIST_SHIFT);
  const oldest = K[FCFS] === 1 ? M[pr + OLD_HEAD + mode] : 0;
  for (let entry = from, end = from + 4 * M[pr + N + 1]; entry < end; entry += 4) {
    let e = M[entry + E_READY];
    const g = M[groups + M[entry + E_GROUP]];
    e = g > e ? g : e;
    e = floor > e ? floor : (e + 1) & ~1;
    const age = M[entry + E_AGE];
    if (e < best || (e === best && age < bestAge)) {
      if (oldest !== 0 && M[M[entry + E_BANK] + HIT] !== oldest) continue;
      best = e;
      bestAge = age;
      bestEntry = entry;
    }
  }
  M[pr + TIME + 1] = best;
  M[pr + BEST + 1] = bestEntry;
  M[pr + BEST_AGE + 1] = bestAge;
  M[pr + DIRTY + 1] = K[FCFS] === 1 ? 1 : 0; // in strict order a newcomer is no rival, and the oldest may change
}

/** Caches the earliest PRE at or after `floor`; the oldest entry's among those of one half clock. */
function choosePrecharge(pr: number, floor: number): void {
  let best = FAR;
  let bestAge = FAR;
  let bestEntry = 0;
  const ppd = M[pr + PPD_READY] > floor ? M[pr + PPD_READY] : floor;
  const from = pr + LIST + (2 << LIST_SHIFT);
  for (let entry = from, end = from + 4 * M[pr + N + 2]; entry < end; entry += 4) {
    let e = M[entry + E_READY];
    e = ppd > e ? ppd : e;
    const age = M[entry + E_AGE];
    if (e < best || (e === best && age < bestAge)) {
      best = e;
      bestAge = age;
      bestEntry = entry;
    }
  }
  M[pr + TIME + 2] = best;
  M[pr + BEST + 2] = bestEntry;
  M[pr + BEST_AGE + 2] = bestAge;
  M[pr + DIRTY + 2] = 0;
}

/**
 * Caches the earliest ACT at or after `floor`; the oldest entry's among those of one half clock. Under random traffic this scan
 * is the longest of all and its comparisons are coin tosses, so it takes the minimum of one number made of both without a
 * branch: how late, then how young (younger than 16,383 requests counts as that).
 */
function chooseActivate(pr: number, floor: number): void {
  const groups = pr + ACT_READY_G;
  const from = pr + LIST + (3 << LIST_SHIFT);
  const oldest = M[M[pr + OLD_HEAD + M[pr + MODE]] + SLOT_AGE];
  let best = FAR;
  let bestEntry = from;
  for (let entry = from, end = from + 4 * M[pr + N + 3]; entry < end; entry += 4) {
    let late = M[entry + E_READY] - floor;
    const window = M[groups + M[entry + E_GROUP]] - late - floor;
    late += window & ~(window >> 31);
    late &= ~(late >> 31);
    let young = M[entry + E_AGE] - oldest;
    young = (young | ((MOST_YOUNG - young) >> 31)) & MOST_YOUNG;
    const difference = ((late << YOUNG_BITS) | young) - best;
    const better = difference >> 31;
    best += difference & better;
    bestEntry ^= (bestEntry ^ entry) & better;
  }
  M[pr + TIME + 3] = floor + (best >> YOUNG_BITS);
  M[pr + BEST + 3] = bestEntry;
  M[pr + BEST_AGE + 3] = M[bestEntry + E_AGE];
  M[pr + DIRTY + 3] = 0;
}
const YOUNG_BITS = 14;
const MOST_YOUNG = (1 << YOUNG_BITS) - 1;

// ---- issue -----------------------------------------------------------------------------------------------------------------

function issueColumn(pr: number, channel: number, t: number): void {
  const p = pseudoOf(pr);
  const br = M[M[pr + BEST + 1] + E_BANK];
  const slot = M[br + HIT];
  const kind = M[pr + MODE];
  const group = M[br + GROUP];
  if (M[slot + FIRST] === UNSET) {
    M[slot + FIRST] = t;
    rowHits[p]++;
  }
  if (M[slot + FIRST_COLUMN] === UNSET) M[slot + FIRST_COLUMN] = t;
  const start = t + (kind === 0 ? K[READ_LATENCY] : K[WRITE_LATENCY]);
  if (K[ATTRIBUTION] === 1) {
    const gap = start - M[pr + DATA_END];
    const startCk = (start + ORIGIN[EPOCH]) / 2;
    if (idleCarry[p] > 0) {
      const carried = idleCarry[p] / 2;
      chargeIdle(p, M[slot + KERNEL], M[pr + CAUSE], startCk - (gap >> 1) - carried, carried);
      idleCarry[p] = 0;
    }
    integrate(pr, p, t);
    const waited = occupancy[p * 2] - readWaited[p];
    readWaited[p] = occupancy[p * 2];
    const rcd = kind === 0 ? K[RCD_READ] : K[RCD_WRITE];
    chargeColumn(
      p,
      M[slot + KERNEL],
      kind,
      M[pr + LAST_KIND],
      t,
      startCk,
      K[BURST] >> 1,
      gap,
      M[pr + SINCE],
      M[pr + CAUSE],
      M[br + BANK_REF_END],
      M[br + ACT_WANTED] + rcd,
      M[br + ACT_WINDOW] + rcd,
      M[br + BANK_COL_READY + kind],
      M[pr + COL_READY + (kind << 5) + group],
      M[pr + LAST_COLUMN],
      waited,
    );
  }
  M[pr + DATA_END] = start + K[BURST];
  M[pr + LAST_KIND] = kind;
  M[pr + LAST_COLUMN] = t;
  if (kind === 0) reads[p]++;
  else writes[p]++;
  columnBus[channel] = t + K[COL_HOLD];
  if (K[ONE_BUS] === 1) rowBus[channel] = t + K[COL_HOLD];

  // column separations towards every group; those to the other kind are looked up when the mode switches
  M[pr + LAST_OF + kind] = t;
  if (kind === 1) M[pr + LAST_WRITE + group] = t;
  const to = pr + COL_READY + (kind << 5);
  const from = group * K[GROUPS];
  for (let g = 0; g < K[GROUPS]; g++) {
    const e = t + columnSeparation[from + g];
    if (e > M[to + g]) M[to + g] = e;
  }
  const pre = t + (kind === 0 ? K[READ_TO_PRE] : K[WRITE_TO_PRE]);
  if (pre > M[br + PRE_READY]) M[br + PRE_READY] = pre;
  const hits = ++M[br + HITS];
  M[br + BANK_ATOMS]++;
  const column = M[slot + COLUMN]++;
  const left = --M[slot + LEFT];
  M[pr + DIRTY + 1] = 1;

  let own = 0; // 1: the command carries its own precharge
  if (left === 0) {
    unqueue(pr, br, slot, kind);
    if (K[PAGE] === 1 && !rowWanted(br, kind)) own = 1;
  }
  if (sink !== null) log(sink, t, p, br, M[slot + ROW], column, CMD_RD + 2 * kind + own, slot);
  if (own === 1) {
    precharges[p]++;
    M[br + OPEN] = -1;
    const ready = M[br + PRE_READY] + K[tRP]; // PRE_READY holds K[tRAS], tRTP and write recovery of this row
    if (ready > M[br + ACT_READY]) M[br + ACT_READY] = ready;
  }
  if (K[PAGE] === 2) usedNow(pr, br, t);
  if (left === 0) {
    finish(pr, p, slot, kind, t, start + K[BURST]);
    classify(pr, br, t);
    chooseMode(pr, t);
    if (M[slot + FLAGS] & 2) release(pr, p, t);
    if (isEmpty(pr)) becameIdle(pr, t);
  } else if (hits === K[HIT_CAP]) {
    classify(pr, br, t);
  }
  watchAge(pr, t);
}

/** Whether another entry of the queue being served hits the open row. */
function rowWanted(br: number, mode: number): boolean {
  const open = M[br + OPEN];
  for (let s = M[br + HEAD + mode]; s !== 0; s = M[s + B_NEXT]) if (M[s + ROW] === open) return true;
  return false;
}

function issuePrecharge(pr: number, channel: number, t: number): void {
  const p = pseudoOf(pr);
  const br = M[M[pr + BEST + 2] + E_BANK];
  const head = M[br + HEAD + M[pr + MODE]];
  if (M[head + FIRST] === UNSET) {
    M[head + FIRST] = t;
    rowConflicts[p]++;
    M[br + BANK_CONFLICTS]++;
  }
  precharge(pr, p, br, channel, t);
  classify(pr, br, t);
}

function issueActivate(pr: number, channel: number, t: number): void {
  const p = pseudoOf(pr);
  const br = M[M[pr + BEST + 3] + E_BANK];
  const head = M[br + HEAD + M[pr + MODE]];
  if (M[head + FIRST] === UNSET) {
    M[head + FIRST] = t;
    rowMisses[p]++;
  }
  activate(pr, p, br, channel, t, M[head + ROW], head);
  classify(pr, br, t);
}

function activate(pr: number, p: number, br: number, channel: number, t: number, row: number, slot: number): void {
  activates[p]++;
  M[br + BANK_ACTS]++;
  rowBus[channel] = t + K[ACT_HOLD];
  if (K[ONE_BUS] === 1) columnBus[channel] = t + K[ACT_HOLD];
  const group = M[br + GROUP];
  const wanted = Math.max(M[br + ACT_READY], M[slot + ARRIVED]);
  const window = M[pr + ACT_READY_G + group];
  M[br + ACT_WANTED] = wanted;
  M[br + ACT_WINDOW] = window > wanted ? window : wanted;
  M[br + OPEN] = row;
  M[br + HITS] = 0;
  M[br + ACT_READY] = t + K[tRC];
  M[br + PRE_READY] = t + K[tRAS];
  M[br + BANK_COL_READY] = t + K[RCD_READ];
  M[br + BANK_COL_READY + 1] = t + K[RCD_WRITE];
  countInWindow(pr, group, t);
  if (K[PAGE] === 2) usedNow(pr, br, t);
  if (sink !== null) log(sink, t, p, br, row, -1, CMD_ACT, slot);
}

/** An ACT (or a refresh that counts as one) at `t` in `group`: tRRD and tFAW towards every group. */
function countInWindow(pr: number, group: number, t: number): void {
  const sid = K[SHARED_WINDOW] === 1 ? 0 : Math.floor(group / (K[GROUPS] / K[SIDS]));
  const index = pr + RECENT_AT + sid;
  const at = pr + RECENT + 4 * sid;
  M[at + M[index]] = t;
  M[index] = (M[index] + 1) & 3;
  const fifth = M[at + M[index]] + K[FAW];
  const from = group * K[GROUPS];
  M[pr + DIRTY + 3] = 1;
  for (let g = 0; g < K[GROUPS]; g++) {
    if (windowShared[from + g] === 0) continue;
    let e = t + actSeparation[from + g];
    e = fifth > e ? fifth : e;
    if (e > M[pr + ACT_READY_G + g]) M[pr + ACT_READY_G + g] = e;
  }
}

function precharge(pr: number, p: number, br: number, channel: number, t: number): void {
  precharges[p]++;
  rowBus[channel] = t + K[PRE_HOLD];
  if (K[ONE_BUS] === 1) columnBus[channel] = t + K[PRE_HOLD];
  if (sink !== null) log(sink, t, p, br, -1, -1, CMD_PRE, 0);
  closed(pr, br, t);
  M[pr + PPD_READY] = t + K[PRE_TO_PRE];
  M[pr + DIRTY + 2] = 1;
}

function closed(pr: number, br: number, t: number): void {
  M[br + OPEN] = -1;
  const ready = t + K[tRP];
  if (ready > M[br + ACT_READY]) M[br + ACT_READY] = ready;
  if (K[PAGE] === 2) forgetOpen(pr, br);
}

function log(
  to: CommandSink,
  t: number,
  p: number,
  br: number,
  row: number,
  column: number,
  command: number,
  slot: number,
): void {
  const group = M[br + GROUP];
  const perSid = K[GROUPS] / K[SIDS];
  const sid = Math.floor(group / perSid);
  const number = slot === 0 ? -1 : slotNumber[(slot - K[SLOT_BASE]) / SLOT_WORDS];
  to(
    t + ORIGIN[EPOCH],
    p,
    sid,
    group - sid * perSid,
    M[br + BANK_INDEX] % K[BANKS_PER_GROUP],
    row,
    column,
    command,
    number,
  );
}

// ---- finish ----------------------------------------------------------------------------------------------------------------

/** Takes an entry out of its bank's list and the list by age. */
function unqueue(pr: number, br: number, slot: number, op: number): void {
  let previous = M[slot + B_PREV];
  let next = M[slot + B_NEXT];
  if (previous === 0) M[br + HEAD + op] = next;
  else M[previous + B_NEXT] = next;
  if (next === 0) M[br + TAIL + op] = previous;
  else M[next + B_PREV] = previous;
  previous = M[slot + A_PREV];
  next = M[slot + A_NEXT];
  if (previous === 0) M[pr + OLD_HEAD + op] = next;
  else M[previous + A_NEXT] = next;
  if (next === 0) M[pr + OLD_TAIL + op] = previous;
  else M[next + A_PREV] = previous;
  if (M[pr + URGENT + op] === slot) M[pr + URGENT + op] = 0;
  M[pr + COUNT + op]--;
}

function finish(pr: number, p: number, slot: number, op: number, t: number, dataEnd: number): void {
  countMoved(M[slot + KERNEL], op, M[slot + ATOMS], t + ORIGIN[EPOCH]);
  if (op === 0) {
    const first = M[slot + FIRST] + ORIGIN[EPOCH];
    answerReady(
      p,
      M[slot + HANDLE],
      DATA,
      M[slot + ARRIVED] + ORIGIN[EPOCH],
      first,
      M[slot + FIRST_COLUMN] + ORIGIN[EPOCH],
      dataEnd + ORIGIN[EPOCH],
    );
  } else if (dataEnd + ORIGIN[EPOCH] > ORIGIN[WRITE_END]) {
    ORIGIN[WRITE_END] = dataEnd + ORIGIN[EPOCH];
  }
  free(pr, p, slot, op, t);
}

function free(pr: number, p: number, slot: number, op: number, t: number): void {
  integrate(pr, p, t);
  entries[p * 2 + op]--;
  queued[(p / K[PCS]) | 0]--;
  residence[p * 2 + op] += t - M[slot + ARRIVED];
  M[slot + A_NEXT] = M[pr + FREE + op];
  M[pr + FREE + op] = slot;
  creditFreed(p, op, t + ORIGIN[EPOCH]);
}

/** An entry others waited for is done: each parked entry is placed anew, oldest first. */
function release(pr: number, p: number, t: number): void {
  let slot = M[pr + PARKED];
  M[pr + PARKED] = 0;
  while (slot !== 0) {
    const next = M[slot + A_NEXT];
    const op = M[slot + FLAGS] & 1;
    M[pr + N_PARKED + op]--;
    place(pr, p, slot, op, t);
    slot = next;
  }
}

// ---- page timeout: banks with an open row, least recently used first ---------------------------------------------------------

function usedNow(pr: number, br: number, t: number): void {
  M[br + BANK_LAST] = t;
  if (M[pr + NEWEST_OPEN] === br) return;
  forgetOpen(pr, br);
  if (M[br + OPEN] < 0) return;
  const last = M[pr + NEWEST_OPEN];
  M[br + OPEN_PREV] = last;
  M[br + OPEN_NEXT] = 0;
  if (last === 0) M[pr + OLDEST_OPEN] = br;
  else M[last + OPEN_NEXT] = br;
  M[pr + NEWEST_OPEN] = br;
}

function forgetOpen(pr: number, br: number): void {
  const previous = M[br + OPEN_PREV];
  const next = M[br + OPEN_NEXT];
  if (previous === 0 && M[pr + OLDEST_OPEN] !== br) return; // not in the list
  if (previous === 0) M[pr + OLDEST_OPEN] = next;
  else M[previous + OPEN_NEXT] = next;
  if (next === 0) M[pr + NEWEST_OPEN] = previous;
  else M[next + OPEN_PREV] = previous;
  M[br + OPEN_PREV] = 0;
  M[br + OPEN_NEXT] = 0;
}

/** When the least recently used open row may be closed; FAR when none. A bank that still has hits waiting is passed over. */
function timeoutTime(pr: number, floor: number): number {
  for (let br = M[pr + OLDEST_OPEN]; br !== 0; br = M[br + OPEN_NEXT]) {
    if (M[br + KIND] === 1 || M[br + KIND] === 2 || M[br + BLOCKED] !== 0) continue;
    let e = M[br + BANK_LAST] + K[PAGE_TIMEOUT];
    if (M[br + PRE_READY] > e) e = M[br + PRE_READY];
    if (M[pr + PPD_READY] > e) e = M[pr + PPD_READY];
    timeoutBank = br;
    return e > floor ? e : floor;
  }
  return FAR;
}
let timeoutBank = 0;

// ---- refresh ---------------------------------------------------------------------------------------------------------------

/** The time at which the refresh bookkeeping next has something to see to. */
function setTick(pr: number): void {
  let tick = FAR;
  const idle = isEmpty(pr);
  for (let u = 0; u < K[REF_UNITS]; u++) {
    if (M[pr + DUE + u] < tick) tick = M[pr + DUE + u];
    if (M[pr + WANTED + u] === 1) continue;
    if (K[REFRESH_MODE] === 1) {
      const gap = M[pr + LAST_REF + u] + K[GAP_LIMIT];
      if (gap < tick) tick = gap;
      if (idle && M[pr + OWED + u] > -K[PULL_IN]) {
        const ahead = (M[pr + LAST_COLUMN] === UNSET ? 0 : M[pr + LAST_COLUMN]) + K[RFC_ALL];
        if (ahead < tick) tick = ahead;
      }
    }
  }
  M[pr + TICK] = tick;
}

/** Counts the refresh intervals that have begun by `t` and decides which units must or may refresh. */
function refreshTick(pr: number, t: number): void {
  const step = refreshStep();
  const idle = isEmpty(pr);
  for (let u = 0; u < K[REF_UNITS]; u++) {
    while (M[pr + DUE + u] <= t) {
      M[pr + DUE + u] += step;
      M[pr + OWED + u]++;
    }
    if (M[pr + WANTED + u] === 1) continue;
    const owed = M[pr + OWED + u];
    if (K[REFRESH_MODE] === 1) {
      const last = M[pr + LAST_COLUMN] === UNSET ? 0 : M[pr + LAST_COLUMN];
      const ahead = idle && owed > -K[PULL_IN] && t >= last + K[RFC_ALL];
      const must = owed >= K[POSTPONE] || t >= M[pr + LAST_REF + u] + K[GAP_LIMIT];
      if (must || (idle && owed > 0) || ahead) wantAll(pr, u, t);
    } else if (owed > 0) {
      const limit = K[POSTPONE] > 1 ? (K[POSTPONE] - 1) * K[BANKS_PER_SID] : 1; // else in order, as soon as due
      wantBank(pr, u, t, owed >= limit);
    }
  }
  setTick(pr);
  setRefreshTime(pr, t);
}

function wantAll(pr: number, unit: number, t: number): void {
  M[pr + WANTED + unit] = 1;
  const p = pseudoOf(pr);
  const count = K[BANKS] / K[REF_UNITS];
  for (let b = unit * count; b < (unit + 1) * count; b++) {
    const br = bankRecord(p, b);
    M[br + BLOCKED] = 1;
    if (M[br + KIND] !== 0) classify(pr, br, t);
  }
}

/** Picks the bank of the set for a per-bank refresh: an idle closed one, an idle one, or when it must go any. */
function wantBank(pr: number, unit: number, t: number, must: boolean): void {
  const p = pseudoOf(pr);
  let chosen = 0;
  let rank = must ? 3 : 2;
  for (let i = 0; i < K[BANKS_PER_SID]; i++) {
    if (M[pr + DONE + unit] & (1 << i)) continue;
    const br = bankRecord(p, unit * K[BANKS_PER_SID] + i);
    const busy = M[br + HEAD] !== 0 || M[br + HEAD + 1] !== 0;
    const its = K[POSTPONE] < 2 ? 0 : busy ? 2 : M[br + OPEN] >= 0 ? 1 : 0; // without slack, in order
    if (its < rank) {
      rank = its;
      chosen = br;
    }
  }
  if (chosen === 0 || M[pr + REF_BANK] !== 0) return;
  M[pr + WANTED + unit] = 1;
  M[pr + REF_BANK] = chosen;
  M[chosen + BLOCKED] = 1;
  if (M[chosen + KIND] !== 0) classify(pr, chosen, t);
}

/** Finds when the next refresh command, or the precharge before it, may go. */
function setRefreshTime(pr: number, t: number): void {
  M[pr + REF_TIME] = FAR;
  for (let u = 0; u < K[REF_UNITS]; u++) {
    if (M[pr + WANTED + u] === 0) continue;
    let e = t;
    if (K[REFRESH_MODE] === 2) {
      const br = M[pr + REF_BANK];
      if (M[br + OPEN] >= 0) {
        e = Math.max(e, M[br + PRE_READY], M[pr + PPD_READY]);
      } else {
        e = Math.max(e, M[br + ACT_READY]);
        if (K[REF_IN_WINDOW] === 1) e = Math.max(e, M[pr + ACT_READY_G + M[br + GROUP]]);
        if (M[pr + REF_END] > UNSET) e = Math.max(e, M[pr + REF_END]); // here: tRREFD since the last REFpb
      }
    } else {
      const open = openBanks(pr, u);
      const first = bankRecord(pseudoOf(pr), (u * K[BANKS]) / K[REF_UNITS]);
      for (let br = first; br < first + (K[BANKS] / K[REF_UNITS]) * BR_WORDS; br += BR_WORDS) {
        // PREA also waits for the own precharges that have not begun: a closed bank's PRE_READY is when its last one could
        if (open > 0) e = Math.max(e, M[br + PRE_READY], M[pr + PPD_READY]);
        else e = Math.max(e, M[br + ACT_READY]);
      }
    }
    M[pr + REF_TIME] = e;
    M[pr + REF_UNIT] = u;
    return;
  }
}

function openBanks(pr: number, unit: number): number {
  const first = bankRecord(pseudoOf(pr), (unit * K[BANKS]) / K[REF_UNITS]);
  let open = 0;
  for (let br = first; br < first + (K[BANKS] / K[REF_UNITS]) * BR_WORDS; br += BR_WORDS) if (M[br + OPEN] >= 0) open++;
  return open;
}

function issueRefresh(pr: number, channel: number, t: number): void {
  const p = pseudoOf(pr);
  setRefreshTime(pr, t); // other banks' commands may have moved it
  if (M[pr + REF_TIME] > t) return;
  const unit = M[pr + REF_UNIT];
  if (K[REFRESH_MODE] === 2) {
    const br = M[pr + REF_BANK];
    if (M[br + OPEN] >= 0) precharge(pr, p, br, channel, t);
    else refreshBank(pr, p, br, unit, channel, t);
  } else if (openBanks(pr, unit) > 0) {
    prechargeAll(pr, p, unit, channel, t);
  } else {
    refreshAll(pr, p, unit, channel, t);
  }
  setRefreshTime(pr, t);
}

function prechargeAll(pr: number, p: number, unit: number, channel: number, t: number): void {
  const sid = K[REF_NAMES_SID] === 1 ? unit : -1;
  precharges[p]++;
  rowBus[channel] = t + K[PRE_HOLD];
  if (K[ONE_BUS] === 1) columnBus[channel] = t + K[PRE_HOLD];
  if (sink !== null) sink(t + ORIGIN[EPOCH], p, sid, -1, -1, -1, -1, COMMAND.PREA, -1);
  const first = bankRecord(p, (unit * K[BANKS]) / K[REF_UNITS]);
  for (let br = first; br < first + (K[BANKS] / K[REF_UNITS]) * BR_WORDS; br += BR_WORDS)
    if (M[br + OPEN] >= 0) closed(pr, br, t);
  M[pr + PPD_READY] = t + K[PRE_TO_PRE];
  M[pr + DIRTY + 2] = 1;
}

function refreshAll(pr: number, p: number, unit: number, channel: number, t: number): void {
  refreshesAll[p]++;
  rowBus[channel] = t + K[REF_HOLD];
  if (K[ONE_BUS] === 1) columnBus[channel] = t + K[REF_HOLD];
  if (sink !== null) sink(t + ORIGIN[EPOCH], p, K[REF_NAMES_SID] === 1 ? unit : -1, -1, -1, -1, -1, COMMAND.REFab, -1);
  const end = t + K[RFC_ALL];
  M[pr + OWED + unit]--;
  M[pr + LAST_REF + unit] = t;
  M[pr + WANTED + unit] = 0;
  const first = bankRecord(p, (unit * K[BANKS]) / K[REF_UNITS]);
  for (let br = first; br < first + (K[BANKS] / K[REF_UNITS]) * BR_WORDS; br += BR_WORDS) {
    M[br + ACT_READY] = end;
    M[br + BANK_REF_END] = end;
    M[br + BLOCKED] = 0;
    classify(pr, br, t);
  }
  refreshTick(pr, t);
}

function refreshBank(pr: number, p: number, br: number, unit: number, channel: number, t: number): void {
  refreshesBank[p]++;
  rowBus[channel] = t + K[REF_HOLD];
  if (K[ONE_BUS] === 1) columnBus[channel] = t + K[REF_HOLD];
  const group = M[br + GROUP];
  if (sink !== null) log(sink, t, p, br, -1, -1, COMMAND.REFpb, 0);
  M[pr + OWED + unit]--;
  M[pr + LAST_REF + unit] = t;
  M[pr + WANTED + unit] = 0;
  M[pr + REF_BANK] = 0;
  M[pr + DONE + unit] |= 1 << (M[br + BANK_INDEX] - unit * K[BANKS_PER_SID]);
  const full = K[BANKS_PER_SID] === 32 ? -1 : (1 << K[BANKS_PER_SID]) - 1;
  if (M[pr + DONE + unit] === full) M[pr + DONE + unit] = 0;
  M[br + ACT_READY] = t + K[RFC_BANK];
  M[br + BANK_REF_END] = t + K[RFC_BANK];
  M[br + BLOCKED] = 0;
  M[pr + REF_END] = t + K[RREFD];
  if (K[REF_IN_WINDOW] === 1) countInWindow(pr, group, t);
  for (let g = 0; g < K[GROUPS]; g++) {
    if (t + K[RREFD] > M[pr + ACT_READY_G + g]) M[pr + ACT_READY_G + g] = t + K[RREFD];
  }
  M[pr + DIRTY + 3] = 1;
  classify(pr, br, t);
  refreshTick(pr, t);
}

/** The queues ran empty at `t`: refreshes owed go now, and after a while some may be done ahead. */
function becameIdle(pr: number, t: number): void {
  if (K[REFRESH_MODE] === 0) return;
  for (let u = 0; u < K[REF_UNITS]; u++) {
    if (M[pr + OWED + u] > 0) {
      refreshTick(pr, t);
      return;
    }
  }
  setTick(pr);
}

// ---- the main loop ---------------------------------------------------------------------------------------------------------

/**
 * Finds the next event of a pseudo-channel with the command buses free from the floors on: 1 arrival, 2 refresh bookkeeping,
 * 3 refresh command, 4 column command, 5 PRE, 6 ACT, 7 page timeout; of one time the lower, of PRE and ACT the older request's.
 */
function findNext(pr: number, now: number, columnFloor: number, rowFloor: number): void {
  let best = FAR;
  let event = 9;
  const inbox = M[pr + IN_HEAD];
  if (inbox !== 0) {
    best = M[inbox + ARRIVED];
    event = 1;
  }
  if (M[pr + TICK] < best) {
    best = M[pr + TICK] > now ? M[pr + TICK] : now;
    event = 2;
  }
  if (M[pr + REF_TIME] < best) {
    const e = M[pr + REF_TIME] > rowFloor ? M[pr + REF_TIME] : rowFloor;
    if (e < best) {
      best = e;
      event = 3;
    }
  }
  if (M[pr + N + 1] > 0) {
    if (M[pr + DIRTY + 1] === 1 || M[pr + TIME + 1] < columnFloor) chooseColumn(pr, columnFloor);
    const e = M[pr + TIME + 1];
    if (e < best) {
      best = e;
      event = 4;
    }
  }
  let row = FAR;
  let rowEvent = 5;
  if (M[pr + N + 2] > 0) {
    if (M[pr + DIRTY + 2] === 1 || M[pr + TIME + 2] < rowFloor) choosePrecharge(pr, rowFloor);
    row = M[pr + TIME + 2];
  }
  if (M[pr + N + 3] > 0) {
    if (M[pr + DIRTY + 3] === 1 || M[pr + TIME + 3] < rowFloor) chooseActivate(pr, rowFloor);
    const e = M[pr + TIME + 3];
    if (e < row || (e === row && M[pr + BEST_AGE + 3] < M[pr + BEST_AGE + 2])) {
      row = e;
      rowEvent = 6;
    }
  }
  if (row < best) {
    best = row;
    event = rowEvent;
  }
  if (K[PAGE] === 2 && M[pr + OLDEST_OPEN] !== 0) {
    const e = timeoutTime(pr, rowFloor);
    if (e < best) {
      best = e;
      event = 7;
    }
  }
  M[pr + NEXT_AT] = best;
  M[pr + NEXT_EVENT] = event;
  M[pr + STALE] = 0;
}

/**
 * Runs one channel, event by event, until `until`. Of one time the event that findNext() puts first goes first; between
 * pseudo-channels the one that did not issue a column command last. What one pseudo-channel does can move another's next event
 * only through the command buses, so that is found anew only when a bus is no longer free in time for it. Unless `settle`, it
 * stops as soon as nothing is queued, so that an idle channel costs nothing; its refreshes then wait for the next call. Returns
 * whether anything is still queued.
 */
function runChannel(channel: number, end: number, settle: boolean): boolean {
  const until = end | 0; // an integer for the compiler too, or every time in here becomes a double
  const firstP = channel * K[PCS];
  for (let i = 0; i < K[PCS]; i++) M[PR_WORDS * (firstP + i + 1) + STALE] = 1;
  let now = channelNow[channel];
  for (;;) {
    if (queued[channel] === 0 && !settle) {
      channelNow[channel] = now;
      return false;
    }
    let best = until;
    let event = 9;
    let who = 0;
    const columnFloor = ((columnBus[channel] > now ? columnBus[channel] : now) + 1) & ~1;
    const rowFloor = rowBus[channel] > now ? rowBus[channel] : now;
    for (let i = 0, j = lastPc[channel]; i < K[PCS]; i++) {
      j = j + 1 >= K[PCS] ? 0 : j + 1;
      const pr = PR_WORDS * (firstP + j + 1);
      const was = M[pr + NEXT_EVENT];
      if (M[pr + STALE] === 1 || (was >= 3 && M[pr + NEXT_AT] < (was === 4 ? columnFloor : rowFloor)))
        findNext(pr, now, columnFloor, rowFloor);
      const e = M[pr + NEXT_AT];
      if (e > best) continue;
      const kind = M[pr + NEXT_EVENT];
      // PRE and ACT are of one rank
      if (e < best || (e < until && kind < event && (kind !== 5 || event !== 6))) {
        best = e;
        event = kind;
        who = pr;
      }
    }
    if (event === 9) {
      channelNow[channel] = until > now ? until : now;
      return queued[channel] > 0;
    }
    now = best;
    M[who + STALE] = 1;
    if (event === 4) {
      lastPc[channel] = pseudoOf(who) - firstP;
      issueColumn(who, channel, now);
    } else if (event === 6) {
      issueActivate(who, channel, now);
    } else if (event === 5) {
      issuePrecharge(who, channel, now);
    } else if (event === 1) {
      admit(who, now);
    } else if (event === 2) {
      refreshTick(who, now);
    } else if (event === 3) {
      issueRefresh(who, channel, now);
    } else {
      timeoutTime(who, rowFloor);
      const br = timeoutBank;
      precharge(who, pseudoOf(who), br, channel, now);
      if (M[br + KIND] !== 0) classify(who, br, now);
    }
  }
}

/** Runs every channel that has work up to `until` (absolute half clocks). */
export function runChannels(until: number): void {
  let kept = 0;
  for (let i = 0; i < active; i++) {
    const channel = activeList[i];
    if (runChannel(channel, until - ORIGIN[EPOCH], false)) activeList[kept++] = channel;
    else isActive[channel] = 0;
  }
  active = kept;
}

export function channelsBusy(): boolean {
  return active > 0;
}

/** When the last write burst ends, absolute half clocks. */
export function lastWriteEndHalf(): number {
  return ORIGIN[WRITE_END];
}

/** End of the last burst on any data bus, absolute half clocks. */
export function lastBurstEndHalf(): number {
  let end = 0;
  for (let p = 0; p < K[CHANNELS] * K[PCS]; p++) end = Math.max(end, M[PR_WORDS * (p + 1) + DATA_END] + ORIGIN[EPOCH]);
  return end;
}

/** Moves the ORIGIN[EPOCH] so that times near `half` (absolute half clocks, nothing earlier is still to come) fit in 32 bits. */
export function keepInRange(half: number): void {
  while (half - ORIGIN[EPOCH] > 3 << 28) {
    const shift = 1 << 29;
    for (let channel = 0; channel < K[CHANNELS]; channel++) runChannel(channel, shift, true);
    for (let channel = 0; channel < K[CHANNELS]; channel++) {
      channelNow[channel] -= shift;
      columnBus[channel] = Math.max(columnBus[channel] - shift, UNSET + 1);
      rowBus[channel] = Math.max(rowBus[channel] - shift, UNSET + 1);
      for (let p = channel * K[PCS]; p < (channel + 1) * K[PCS]; p++) shiftTimes(p, shift);
    }
    ORIGIN[EPOCH] += shift;
  }
}

function shiftTimes(p: number, shift: number): void {
  const pr = PR_WORDS * (p + 1);
  const lost = UNSET + 1 - (M[pr + DATA_END] - shift);
  if (lost > 0) idleCarry[p] += lost;
  const later = (at: number): void => {
    if (M[at] !== UNSET && M[at] !== FAR) M[at] = Math.max(M[at] - shift, UNSET + 1);
  };
  for (const field of [
    TIME + 1,
    TIME + 2,
    TIME + 3,
    LAST_OF,
    LAST_OF + 1,
    PPD_READY,
    DATA_END,
    SINCE,
    REF_END,
    TICK,
    REF_TIME,
    LAST_COLUMN,
    OCC_AT,
  ]) {
    later(pr + field);
  }
  for (let u = 0; u < K[REF_UNITS]; u++) {
    later(pr + DUE + u);
    later(pr + LAST_REF + u);
  }
  for (let i = COL_READY; i < LAST_WRITE + 32; i++) later(pr + i);
  for (let i = 0; i < 16; i++) later(pr + RECENT + i);
  for (let kind = 1; kind <= 3; kind++) {
    const from = pr + LIST + (kind << LIST_SHIFT);
    for (let entry = from; entry < from + 4 * M[pr + N + kind]; entry += 4) later(entry + E_READY);
  }
  for (let b = 0; b < K[BANKS]; b++) {
    const br = bankRecord(p, b);
    for (const field of [
      ACT_READY,
      PRE_READY,
      BANK_COL_READY,
      BANK_COL_READY + 1,
      ACT_WANTED,
      ACT_WINDOW,
      BANK_REF_END,
      BANK_LAST,
    ]) {
      later(br + field);
    }
    countBank(p, b);
  }
  for (let i = 0; i < K[DEPTH]; i++) {
    const slot = K[SLOT_BASE] + SLOT_WORDS * (p * K[DEPTH] + i);
    for (const field of [ARRIVED, FIRST, FIRST_COLUMN]) later(slot + field);
  }
}

/** Moves a bank's counts to where they cannot wrap: between two re-bases there are fewer than 2^29 half clocks, and commands. */
function countBank(p: number, b: number): void {
  const br = bankRecord(p, b);
  for (let i = 0; i < 3; i++) {
    bankCounts[(p * K[BANKS] + b) * 3 + i] += M[br + BANK_ATOMS + i];
    M[br + BANK_ATOMS + i] = 0;
  }
}

/** Brings every channel, idle ones with their refreshes too, to `end` absolute half clocks. */
export function settleChannels(end: number): void {
  keepInRange(end);
  for (let channel = 0; channel < K[CHANNELS]; channel++) runChannel(channel, end - ORIGIN[EPOCH], true);
}

/** Ends the accounts at `end` absolute half clocks (a whole clock): the tail of each data bus is charged. */
export function closeAccounts(end: number, lastWork: number): void {
  for (let p = 0; p < K[CHANNELS] * K[PCS]; p++) {
    const pr = PR_WORDS * (p + 1);
    const t = end - ORIGIN[EPOCH];
    integrate(pr, p, t);
    if (K[ATTRIBUTION] === 0) continue;
    const dataEnd = (M[pr + DATA_END] + ORIGIN[EPOCH] - idleCarry[p]) / 2;
    const tail = end / 2 - dataEnd;
    if (tail > 0) chargeTail(p, dataEnd, tail, Math.max(0, Math.floor(lastWork / 2 - dataEnd)));
  }
}

export interface ChannelCounters {
  readonly reads: Float64Array;
  readonly writes: Float64Array;
  readonly activates: Float64Array;
  readonly precharges: Float64Array;
  readonly refreshesAll: Float64Array;
  readonly refreshesBank: Float64Array;
  readonly rowHits: Float64Array;
  readonly rowMisses: Float64Array;
  readonly rowConflicts: Float64Array;
  readonly forwarded: Float64Array;
  readonly occupancy: Float64Array; // entry x half clocks, p * 2 + op
  readonly residence: Float64Array; // half clocks, p * 2 + op
  readonly deepest: Int32Array; // p * 2 + op
  readonly queued: number; // entries left in any queue
  readonly bankAtoms: Float64Array; // p * banks + bank: column commands
  readonly bankActivates: Float64Array;
  readonly bankConflicts: Float64Array;
}

/** Copies of the counters of the run so far. */
export function channelCounters(): ChannelCounters {
  const total = K[CHANNELS] * K[PCS];
  let left = 0;
  for (let p = 0; p < total; p++) for (let b = 0; b < K[BANKS]; b++) countBank(p, b);
  const ofBanks = (i: number): Float64Array<ArrayBuffer> =>
    Float64Array.from({ length: total * K[BANKS] }, (_, bank) => bankCounts[bank * 3 + i]);
  for (let i = 0; i < 2 * total; i++) left += entries[i];
  return {
    reads: reads.slice(0, total),
    writes: writes.slice(0, total),
    activates: activates.slice(0, total),
    precharges: precharges.slice(0, total),
    refreshesAll: refreshesAll.slice(0, total),
    refreshesBank: refreshesBank.slice(0, total),
    rowHits: rowHits.slice(0, total),
    rowMisses: rowMisses.slice(0, total),
    rowConflicts: rowConflicts.slice(0, total),
    forwarded: forwarded.slice(0, total),
    occupancy: occupancy.slice(0, 2 * total),
    residence: residence.slice(0, 2 * total),
    deepest: deepest.slice(0, 2 * total),
    queued: left,
    bankAtoms: ofBanks(0),
    bankActivates: ofBanks(1),
    bankConflicts: ofBanks(2),
  };
}
