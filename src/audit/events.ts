/**
 * The last command of each sort, kept by slot: what a slot stands for (a bank and a kind, a bus, a place in a window) is its
 * owner's business. All times are half clocks.
 */
export class Events {
  readonly since: Float64Array; // when separations begin to count; -Infinity: nothing yet
  readonly issued: Float64Array; // when the command was given; an own precharge begins later than its command
  readonly line: Float64Array; // line of the log
  readonly what: Int32Array; // command and place within the channel, as `Shape.what` packs them

  constructor(slots: number) {
    this.since = new Float64Array(slots).fill(-Infinity);
    this.issued = new Float64Array(slots);
    this.line = new Float64Array(slots);
    this.what = new Int32Array(slots);
  }

  put(slot: number, since: number, issued: number, line: number, what: number): void {
    this.since[slot] = since;
    this.issued[slot] = issued;
    this.line[slot] = line;
    this.what[slot] = what;
  }
}
