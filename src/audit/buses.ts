import type { MemoryGroup } from '../config/package.js';
import { ACT, KIND_COUNT, PRE, RD, REFAB, REFPB, WR } from './commands.js';
import { Events } from './events.js';
import type { Findings } from './findings.js';
import { ruleNumber } from './rule-names.js';
import type { Limits } from './separations.js';
import type { Shape } from './shape.js';

const CLOCK_EDGE = ruleNumber('clock edge');

/**
 * Command buses: row and column commands have one each where the device has two, else they share one; either way the channel's
 * pseudo-channels share them. A command holds its bus for the time the device says, from its own first clock edge.
 */
export class CommandBuses {
  private readonly held: Events; // two slots a channel (row, column), `since` is when the bus is free again
  private readonly hold = new Float64Array(KIND_COUNT); // half clocks, by kind
  private readonly bus = new Uint8Array(KIND_COUNT); // 0 or 1, by kind
  private readonly rule = new Uint8Array(KIND_COUNT); // by kind
  private readonly wholeClocks = new Uint8Array(KIND_COUNT); // by kind: 1 where commands begin on whole clocks only

  constructor(
    shape: Shape,
    { buses }: MemoryGroup,
    limits: Limits,
    private readonly findings: Findings,
  ) {
    this.held = new Events(2 * shape.channels);
    for (const [kind, hold, column] of [
      [ACT, limits.act, false],
      [PRE, limits.pre, false],
      [REFAB, limits.ref, false],
      [REFPB, limits.ref, false],
      [RD, limits.column, true],
      [WR, limits.column, true],
    ] as const) {
      this.hold[kind] = hold;
      this.bus[kind] = buses.separate && column ? 1 : 0;
      this.rule[kind] = ruleNumber(buses.separate ? (column ? 'column bus' : 'row bus') : 'command bus');
      this.wholeClocks[kind] = column ? 1 : 0;
    }
  }

  check(channel: number, kind: number, halfCk: number): void {
    const slot = 2 * channel + this.bus[kind];
    if (halfCk < this.held.since[slot]) {
      this.findings.tooSoon(this.rule[kind], this.held, slot, this.held.since[slot]);
    }
    if (this.wholeClocks[kind] === 1 && halfCk % 2 !== 0) {
      this.findings.wrong(CLOCK_EDGE, null, 0, 'column commands begin on whole clocks');
    }
  }

  put(channel: number, kind: number, halfCk: number, line: number, what: number): void {
    const slot = 2 * channel + this.bus[kind];
    const free = halfCk + this.hold[kind];
    if (free >= this.held.since[slot]) this.held.put(slot, free, halfCk, line, what);
  }
}

const DATA_BUS = ruleNumber('data bus');
const SHORTEST_RING = 64; // bursts; more than needed, for logs whose column commands come in heaps

/**
 * Data buses: one burst at a time per pseudo-channel. A write's data may come before that of an earlier read, so the last bursts
 * are kept in a ring long enough for all that can still matter when commands are a clock apart, as the column bus makes them.
 */
export class DataBuses {
  private readonly bursts: Events; // `ring` slots a pseudo-channel, `since` is when the data begin
  private readonly ring: number; // a power of two
  private readonly next: Int32Array; // by pseudo-channel: bursts so far, modulo the ring
  private readonly reach: number; // half clocks from a command to the end of its burst, the longer of RD and WR

  constructor(
    shape: Shape,
    private readonly limits: Limits,
    private readonly findings: Findings,
  ) {
    this.reach = Math.max(limits.readData, limits.writeData) + limits.burst;
    this.ring = Math.max(SHORTEST_RING, 2 ** Math.ceil(Math.log2(this.reach / 2 + 2)));
    this.bursts = new Events(this.ring * shape.pseudoChannels);
    this.next = new Int32Array(shape.pseudoChannels);
  }

  check(p: number, kind: number, halfCk: number): void {
    const { since, issued } = this.bursts;
    const { burst } = this.limits;
    const latency = kind === RD ? this.limits.readData : this.limits.writeData;
    const begin = halfCk + latency;
    const base = p * this.ring;
    for (let back = 1; back <= this.ring; back++) {
      const slot = base + ((this.next[p] - back) & (this.ring - 1));
      if (since[slot] === -Infinity || issued[slot] + this.reach <= begin) break; // this one and all before it are over
      if (Math.abs(begin - since[slot]) < burst) {
        this.findings.tooSoon(DATA_BUS, this.bursts, slot, since[slot] + burst - latency);
      }
    }
  }

  put(p: number, kind: number, halfCk: number, line: number, what: number): void {
    const latency = kind === RD ? this.limits.readData : this.limits.writeData;
    this.bursts.put(p * this.ring + this.next[p], halfCk + latency, halfCk, line, what);
    this.next[p] = (this.next[p] + 1) & (this.ring - 1);
  }
}
