import type { Link, Package } from '../config/package.js';
import type { AddressMap } from '../model/address-map.js';
import { FlitServer } from '../model/flit-server.js';
import { memoryOf, type System } from '../model/system.js';
import { MOST_KERNELS } from '../trace/access.js';
import { READ, WRITE } from '../trace/batch.js';
import { kernelBegins } from './attribution.js';
import { sendToChannel } from './channel.js';
import { edgeAtOrAfter, edgePs, nextCreditEdge, takeEdge, takePair } from './credits.js';
import { ACKNOWLEDGEMENT, FORWARDED } from './egress.js';
import { STACK_CLASSES } from './recording.js';
import type { Requests } from './request-records.js';
import * as at from './request-records.js';
import type { Samples } from './samples.js';
import type { Timers } from './timers.js';
import type { Runnable, Work } from './work.js';

const FOR_DOWN_LINK = STACK_CLASSES.indexOf('starved_down_link');
const FOR_UP_LINK = STACK_CLASSES.indexOf('starved_up_link');
const FOR_CREDITS = STACK_CLASSES.indexOf('starved_queue_credits');
const FOR_WINDOW = STACK_CLASSES.indexOf('starved_window');
const FOR_IMBALANCE = STACK_CLASSES.indexOf('starved_imbalance');

/**
 * Engines, windows, links and credits: all that happens on the compute dies, clock edge by clock edge. At an edge, in this
 * order: answers that have arrived (links in order of stack), credits that have landed (by pseudo-channel), alarms (by time and
 * context), then each engine issues (by number). A die with nothing to do skips to the next edge at which it has.
 */
export class FrontEnd {
  issued = 0; // requests
  answered = 0;
  bytesAsked = 0;
  bytesAnswered = 0;
  atomsSent = 0;
  atomsForwarded = 0;
  lastAnswerPs = 0;
  lastSendPs = 0;
  readonly windowPs: Float64Array; // per engine: integral of outstanding requests
  residencePs = 0; // sum of (answered - issued)
  readonly down: FlitServer[]; // per stack
  readonly up: FlitServer[];

  private readonly links: readonly Link[];
  private readonly halfPs: number;
  private readonly atomBytes: number;
  private readonly ingressPs: number;
  private readonly egressPs: number;
  private readonly pcsPerStack: number;
  private readonly stacksOfDie: number[][];
  private readonly firstEngine: Int32Array; // per die, one more at the end
  private readonly window: Int32Array; // per engine
  private readonly issuePerClock: Int32Array; // per die
  private readonly requestBytes: Int32Array; // per die
  private readonly clockPs: Float64Array; // per die
  private nowPs = 0; // of the last edge handled, of any die
  private readonly due: Float64Array; // per die: edge at which it next has something to do
  private readonly dueCountsFrom: Float64Array; // per die: first edge not handled yet
  private readonly outstanding: Int32Array; // per engine
  private readonly windowSince: Float64Array; // per engine: integral is up to date until then
  private readonly nextSlotPs: Float64Array; // per engine: earliest issue by the issue rate
  private readonly hot: Uint8Array; // per engine: the answer that last freed its full window had waited for a busy queue
  private readonly credits: Int32Array; // p * 2 + op
  private readonly begun = new Uint8Array(MOST_KERNELS); // by kernel: 1 once a request of it was issued
  private readonly landing: Float64Array; // per stack: free landing bytes
  private readonly freeHandles: Int32Array;
  private freeCount: number;
  private readonly doubles: Float64Array; // request records
  private readonly ints: Int32Array;
  // queues of handles: heads and tails, -1 when empty
  private readonly creditHead: Int32Array; // p * 2 + op
  private readonly creditTail: Int32Array;
  private readonly landHead: Int32Array; // per stack
  private readonly landTail: Int32Array;
  private readonly upHead: Int32Array; // per stack: answers under way, in order of arrival
  private readonly upTail: Int32Array;

  constructor(
    pkg: Package,
    private readonly system: System,
    private readonly map: AddressMap,
    private readonly work: Work,
    private readonly timers: Timers,
    private readonly runnable: Runnable,
    private readonly samples: Samples,
    requests: Requests,
    handles: number,
    private readonly openLoop: boolean,
  ) {
    const memory = memoryOf(pkg);
    const { dies, links } = pkg;
    this.links = links;
    this.halfPs = memory.clockPs / 2;
    this.atomBytes = system.atomBytes;
    this.ingressPs = memory.baseDie.ingressPs;
    this.egressPs = memory.baseDie.egressPs;
    this.pcsPerStack = system.channels * system.pseudoChannels;
    this.down = links.map((link) => new FlitServer(link.flitPs, link.flitBytes - link.flitOverheadBytes));
    this.up = links.map((link) => new FlitServer(link.flitPs, link.flitBytes - link.flitOverheadBytes));
    this.stacksOfDie = dies.map((_, d) => links.filter((link) => link.die === d).map((link) => link.stack));
    const starts = [0];
    for (const die of dies) starts.push(starts[starts.length - 1] + die.engines);
    this.firstEngine = Int32Array.from(starts);
    const engines = starts[dies.length];
    this.window = new Int32Array(engines);
    dies.forEach((die, d) => {
      this.window.fill(die.window, starts[d], starts[d + 1]);
    });
    this.issuePerClock = Int32Array.from(dies, (die) => die.issuePerClock);
    this.requestBytes = Int32Array.from(dies, (die) => die.requestBytes);
    this.clockPs = Float64Array.from(dies, (die) => die.clockPs);
    this.due = new Float64Array(dies.length);
    this.dueCountsFrom = new Float64Array(dies.length);
    this.outstanding = new Int32Array(engines);
    this.windowPs = new Float64Array(engines);
    this.windowSince = new Float64Array(engines);
    this.nextSlotPs = new Float64Array(engines);
    this.hot = new Uint8Array(engines);
    this.credits = new Int32Array(system.total * 2);
    for (let p = 0; p < system.total; p++) {
      this.credits[p * 2] = memory.controller.readQueue;
      this.credits[p * 2 + 1] = memory.controller.writeQueue;
    }
    this.landing = Float64Array.from(links, (link) => link.landingBytes);
    this.freeHandles = new Int32Array(handles).map((_, i) => handles - 1 - i);
    this.freeCount = handles;
    ({ doubles: this.doubles, ints: this.ints } = requests);
    const queues = (count: number): Int32Array<ArrayBuffer> => new Int32Array(count).fill(-1);
    [this.creditHead, this.creditTail] = [queues(system.total * 2), queues(system.total * 2)];
    [this.landHead, this.landTail] = [queues(links.length), queues(links.length)];
    [this.upHead, this.upTail] = [queues(links.length), queues(links.length)];
  }

  /** Requests issued and not answered. */
  get inFlight(): number {
    return this.issued - this.answered;
  }

  /** Time of the next edge at which any die has something to do; Infinity when none will. */
  nextPs(): number {
    let first = Number.POSITIVE_INFINITY;
    for (let d = 0; d < this.due.length; d++) {
      this.due[d] = this.nextEdge(d);
      if (this.due[d] !== Number.POSITIVE_INFINITY) first = Math.min(first, edgePs(d, this.due[d]));
    }
    return first;
  }

  /** Handles every edge before `until` ps; false when the work must read on first. */
  advance(until: number): boolean {
    for (let d = 0; d < this.due.length; d++) this.due[d] = this.nextEdge(d);
    for (;;) {
      let die = -1;
      let now = until;
      for (let d = 0; d < this.due.length; d++) {
        if (this.due[d] === Number.POSITIVE_INFINITY) continue;
        const ps = edgePs(d, this.due[d]);
        if (ps < now) {
          now = ps;
          die = d;
        }
      }
      if (die < 0) {
        // what is found out later (a credit, an answer) is acted on later: no edge before `until` comes back
        for (let d = 0; d < this.due.length; d++) {
          const edge = edgeAtOrAfter(d, until);
          if (edge > this.dueCountsFrom[d]) this.dueCountsFrom[d] = edge;
        }
        return true;
      }
      if (!this.work.enough()) return false;
      this.edge(die, this.due[die], now);
      // another die's engine may have been woken by rows dealt to it
      for (let d = 0; d < this.due.length; d++) this.due[d] = this.nextEdge(d);
    }
  }

  private nextEdge(die: number): number {
    // a die that slept may be woken by another: never at an edge before that
    let from = this.dueCountsFrom[die];
    if (edgePs(die, from) < this.nowPs) from = edgeAtOrAfter(die, this.nowPs);
    for (let e = this.firstEngine[die]; e < this.firstEngine[die + 1]; e++)
      if (this.runnable.flags[e] === 1) return from;
    let ps = this.timers.next(die);
    for (const stack of this.stacksOfDie[die]) {
      const head = this.upHead[stack];
      if (head >= 0) ps = Math.min(ps, this.doubles[head * at.RECORD_DOUBLES + at.CREDIT_OR_DONE]);
    }
    const edge = ps === Number.POSITIVE_INFINITY ? ps : Math.max(from, edgeAtOrAfter(die, ps));
    return Math.min(edge, nextCreditEdge(die, from));
  }

  private edge(die: number, edge: number, now: number): void {
    this.nowPs = now;
    const stacks = this.stacksOfDie[die];
    // answers that have arrived
    for (const stack of stacks) {
      let handle = this.upHead[stack];
      while (handle >= 0 && this.doubles[handle * at.RECORD_DOUBLES + at.CREDIT_OR_DONE] <= now) {
        this.shift(this.upHead, this.upTail, stack);
        this.finish(handle, stack, now);
        handle = this.upHead[stack];
      }
    }
    // credits that have landed
    if (takeEdge(die, edge) > 0) {
      for (const stack of stacks) {
        const end = (stack + 1) * this.pcsPerStack;
        for (let p = stack * this.pcsPerStack; p < end; p++) {
          const pair = takePair(edge, p);
          if (pair === 0) continue;
          if (pair & 0xffff) this.creditsLanded(p * 2, pair & 0xffff, now);
          if (pair >>> 16) this.creditsLanded(p * 2 + 1, pair >>> 16, now);
        }
      }
    }
    // alarms
    for (let context = this.timers.take(die, now); context >= 0; context = this.timers.take(die, now)) {
      this.work.alarm(context, now);
    }
    // engines issue
    for (let engine = this.firstEngine[die]; engine < this.firstEngine[die + 1]; engine++) {
      if (this.runnable.flags[engine] === 1) this.issue(die, engine, now);
    }
    this.dueCountsFrom[die] = edge + 1;
  }

  /** Lets an engine issue what its window and issue rate allow; it sleeps when it cannot go on. */
  private issue(die: number, engine: number, now: number): void {
    for (let slots = this.issuePerClock[die]; slots > 0; slots--) {
      if ((this.outstanding[engine] >= this.window[engine] && !this.openLoop) || this.freeCount === 0) {
        // with every handle in flight the engine looks again at the next edge
        if (this.freeCount > 0) this.runnable.flags[engine] = 0;
        return;
      }
      this.runnable.flags[engine] = 0;
      if (!this.work.peek(engine, now)) return;
      this.runnable.flags[engine] = 1;
      this.request(die, engine, now);
    }
    this.nextSlotPs[engine] = now + Math.floor(this.clockPs[die]);
  }

  /** Issues the leading part of the peeked access that stays in one row of one bank. */
  private request(die: number, engine: number, now: number): void {
    const { work, map, system } = this;
    const { address } = work;
    const piece = map.pieceBytes;
    const offset = address % piece;
    let bytes = Math.min(work.bytes, piece - offset, this.requestBytes[die]);
    if (bytes > work.bytes) bytes = work.bytes;
    map.decode(die, address);
    const handle = this.freeHandles[--this.freeCount];
    const { doubles, ints } = this;
    const d = handle * at.RECORD_DOUBLES;
    const i = handle * at.RECORD_INTS;
    const first = Math.floor(offset / system.atomBytes);
    const atoms = Math.floor((offset + bytes - 1) / system.atomBytes) - first + 1;
    const { op } = work;
    ints[i + at.PLACE] = map.p;
    ints[i + at.KERNEL] = work.kernel;
    ints[i + at.ENGINE] = engine;
    ints[i + at.USEFUL] = bytes;
    ints[i + at.ATOMS] = atoms;
    ints[i + at.FLAGS] = op | (work.waitedFor << 8);
    ints[i + at.ROW] = map.row;
    ints[i + at.BANK_COLUMN] = (map.bank << 16) | map.column;
    const ready = work.readyPs > this.nextSlotPs[engine] || this.openLoop ? work.readyPs : this.nextSlotPs[engine];
    doubles[d + at.READY] = ready < now ? ready : now;
    doubles[d + at.ISSUE] = now;
    doubles[d + at.GATE_OR_UP_START] = work.waitedPs;
    doubles[d + at.NUMBER_OR_COMMAND] = this.issued++;
    this.bytesAsked += bytes;
    this.atomsSent += atoms;
    this.countWindow(engine, now);
    this.outstanding[engine]++;
    ints[i + at.TAG] = work.take(bytes, now);
    if (this.begun[work.kernel] === 0) {
      this.begun[work.kernel] = 1;
      kernelBegins(work.kernel, Math.floor(now / (2 * this.halfPs)));
    }
    const lane = map.p * 2 + op;
    if (this.credits[lane] > 0 && this.creditHead[lane] < 0) {
      this.credits[lane]--;
      this.hasCredit(handle, now);
    } else {
      ints[i + at.FLAGS] |= 2;
      this.append(this.creditHead, this.creditTail, lane, handle);
    }
  }

  private creditsLanded(lane: number, count: number, now: number): void {
    this.credits[lane] += count;
    while (this.credits[lane] > 0 && this.creditHead[lane] >= 0) {
      const handle = this.shift(this.creditHead, this.creditTail, lane);
      this.credits[lane]--;
      this.hasCredit(handle, now);
    }
  }

  /** A queue slot is reserved: a read also needs room for its data before it may be sent. */
  private hasCredit(handle: number, now: number): void {
    this.doubles[handle * at.RECORD_DOUBLES + at.CREDIT_OR_DONE] = now;
    const i = handle * at.RECORD_INTS;
    const stack = (this.ints[i + at.PLACE] / this.pcsPerStack) | 0;
    if ((this.ints[i + at.FLAGS] & 1) === WRITE) {
      this.send(handle, stack, now);
      return;
    }
    const need = this.ints[i + at.ATOMS] * this.atomBytes;
    if (this.landHead[stack] < 0 && this.landing[stack] >= need) {
      this.landing[stack] -= need;
      this.send(handle, stack, now);
    } else {
      this.append(this.landHead, this.landTail, stack, handle);
    }
  }

  private send(handle: number, stack: number, now: number): void {
    const { ints, doubles } = this;
    const i = handle * at.RECORD_INTS;
    const d = handle * at.RECORD_DOUBLES;
    const link = this.links[stack];
    const server = this.down[stack];
    const op = ints[i + at.FLAGS] & 1;
    const atoms = ints[i + at.ATOMS];
    server.send(now, link.requestHeaderBytes + (op === WRITE ? atoms * this.atomBytes : 0));
    doubles[d + at.START] = server.startedPs;
    this.lastSendPs = now;
    // the controller sees it at a whole DRAM clock
    const arrive = 2 * Math.ceil((server.sentPs + link.latencyPs + this.ingressPs) / (2 * this.halfPs) - 1e-9);
    const bankColumn = ints[i + at.BANK_COLUMN];
    sendToChannel(
      ints[i + at.PLACE],
      op,
      arrive,
      bankColumn >> 16,
      ints[i + at.ROW],
      bankColumn & 0xffff,
      atoms,
      handle,
      ints[i + at.KERNEL],
      this.cause(handle, now, server.startedPs),
      doubles[d + at.NUMBER_OR_COMMAND],
    );
  }

  /** Which upstream limit held the request back longest: charged when it finds its queue empty. */
  private cause(handle: number, now: number, started: number): number {
    const { ints, doubles } = this;
    const i = handle * at.RECORD_INTS;
    const d = handle * at.RECORD_DOUBLES;
    const issue = doubles[d + at.ISSUE];
    const credit = doubles[d + at.CREDIT_OR_DONE];
    let longest = doubles[d + at.GATE_OR_UP_START];
    let cause = ints[i + at.FLAGS] >> 8;
    const windowWait = issue - doubles[d + at.READY];
    if (windowWait > longest) {
      longest = windowWait;
      cause = this.hot[ints[i + at.ENGINE]] === 1 ? FOR_IMBALANCE : FOR_WINDOW;
    }
    if (credit - issue > longest) {
      longest = credit - issue;
      cause = FOR_CREDITS;
    }
    if (now - credit > longest) {
      longest = now - credit;
      cause = FOR_UP_LINK;
    }
    return started - now > longest ? FOR_DOWN_LINK : cause;
  }

  /** An answer leaves the base die: puts it on the up link. Called in the order of drainEgress. */
  readonly answer = (handle: number): void => {
    const i = handle * at.RECORD_INTS;
    const d = handle * at.RECORD_DOUBLES;
    const stack = (this.ints[i + at.PLACE] / this.pcsPerStack) | 0;
    const link = this.links[stack];
    const server = this.up[stack];
    const isAck = ((this.ints[i + at.FLAGS] >> 2) & 3) === ACKNOWLEDGEMENT;
    const bytes = isAck ? link.ackBytes : link.responseHeaderBytes + this.ints[i + at.ATOMS] * this.atomBytes;
    server.send(this.egressEnd(d), bytes);
    this.doubles[d + at.GATE_OR_UP_START] = server.startedPs;
    this.doubles[d + at.CREDIT_OR_DONE] = server.sentPs + link.latencyPs;
    this.append(this.upHead, this.upTail, stack, handle);
  };

  /** When an answer is in the egress buffer, ready for the link: a whole clock after its data, and the way through the die. */
  private egressEnd(d: number): number {
    return this.psOf(2 * Math.ceil(this.doubles[d + at.DATA_END] / 2)) + this.egressPs;
  }

  /** A request's answer is back at its engine. */
  private finish(handle: number, stack: number, now: number): void {
    const { ints, doubles } = this;
    const i = handle * at.RECORD_INTS;
    const d = handle * at.RECORD_DOUBLES;
    const flags = ints[i + at.FLAGS];
    const op = flags & 1;
    const engine = ints[i + at.ENGINE];
    const kernel = ints[i + at.KERNEL];
    const useful = ints[i + at.USEFUL];
    const atoms = ints[i + at.ATOMS];
    const issue = doubles[d + at.ISSUE];
    const forwarded = ((flags >> 2) & 3) === FORWARDED;
    this.sample(i, d, forwarded ? 2 : op, now);
    if (forwarded) this.atomsForwarded += atoms;

    const full = this.outstanding[engine] >= this.window[engine];
    this.countWindow(engine, now);
    this.outstanding[engine]--;
    this.residencePs += now - issue;
    if (full) this.hot[engine] = (flags >> 1) & 1;
    this.answered++;
    this.bytesAnswered += useful;
    this.lastAnswerPs = now;
    const record = this.work.kernels[kernel];
    record.requests++;
    if (op === READ) record.readBytes += useful;
    else record.writeBytes += useful;
    if (now > record.endPs) record.endPs = now;
    this.runnable.wake(engine);
    this.freeHandles[this.freeCount++] = handle;
    const tag = ints[i + at.TAG];
    if (op === READ) this.landed(stack, atoms * this.atomBytes, now);
    this.work.returned(tag, op, now);
  }

  /** Writes the finished request's stages into the sample block. */
  private sample(i: number, d: number, op: number, now: number): void {
    const { ints, doubles, samples } = this;
    const { block, stages } = samples;
    const row = block.count;
    const issue = doubles[d + at.ISSUE];
    const start = doubles[d + at.START];
    const arrive = this.psOf(doubles[d + at.ARRIVE]);
    const upReady = this.egressEnd(d);
    const end = upReady - this.egressPs;
    const upStart = doubles[d + at.GATE_OR_UP_START];
    const command = op === WRITE ? end : this.psOf(doubles[d + at.NUMBER_OR_COMMAND]);
    const column = op === WRITE ? end : this.psOf(doubles[d + at.FIRST_COLUMN]);
    block.kernel[row] = ints[i + at.KERNEL];
    block.op[row] = op;
    block.channel[row] = ints[i + at.PLACE];
    block.bytes[row] = ints[i + at.USEFUL];
    block.donePs[row] = now;
    stages.windowWait[row] = issue - doubles[d + at.READY];
    stages.downQueue[row] = start - issue;
    stages.downTransit[row] = arrive - start;
    stages.controllerQueue[row] = command - arrive;
    stages.bankPreparation[row] = column - command;
    stages.dataTransfer[row] = end - column;
    stages.upQueue[row] = upStart - upReady;
    stages.upTransit[row] = now - upStart + this.egressPs;
    samples.added();
  }

  /** Read data has left the landing buffer: reads that waited for room are sent. */
  private landed(stack: number, bytes: number, now: number): void {
    this.landing[stack] += bytes;
    for (let handle = this.landHead[stack]; handle >= 0; handle = this.landHead[stack]) {
      const need = this.ints[handle * at.RECORD_INTS + at.ATOMS] * this.atomBytes;
      if (this.landing[stack] < need) return;
      this.shift(this.landHead, this.landTail, stack);
      this.landing[stack] -= need;
      this.send(handle, stack, now);
    }
  }

  private countWindow(engine: number, now: number): void {
    this.windowPs[engine] += this.outstanding[engine] * (now - this.windowSince[engine]);
    this.windowSince[engine] = now;
  }

  /** Brings the window integrals to the end of the run. */
  close(end: number): void {
    for (let engine = 0; engine < this.window.length; engine++) this.countWindow(engine, end);
    this.samples.flush();
  }

  private psOf(half: number): number {
    return Math.ceil(half * this.halfPs - 1e-6);
  }

  private append(heads: Int32Array, tails: Int32Array, queue: number, handle: number): void {
    this.ints[handle * at.RECORD_INTS + at.NEXT] = -1;
    if (heads[queue] < 0) heads[queue] = handle;
    else this.ints[tails[queue] * at.RECORD_INTS + at.NEXT] = handle;
    tails[queue] = handle;
  }

  private shift(heads: Int32Array, tails: Int32Array, queue: number): number {
    const handle = heads[queue];
    heads[queue] = this.ints[handle * at.RECORD_INTS + at.NEXT];
    if (heads[queue] < 0) tails[queue] = -1;
    return handle;
  }
}
