/**
 * Queue credits on their way back to the compute dies. A channel frees a slot; the credit lands at the die's clock edge at or
 * after its arrival. Counts, not entries, are kept per edge, so the order in which channels were run cannot show.
 */

let ring = new Int16Array(0); // ring[(edge & mask) * lanes + lane]: credits that land at that edge; a lane is p * 2 + op
let pairs = new Int32Array(0); // the same memory, a pseudo-channel's two lanes at a time
let landed = new Int32Array(0); // per (edge & mask): whether anything lands, as a count
let mask = 0;
let lanes = 0;
let clockPs = new Float64Array(0); // per die
let dieOf: Int32Array = new Int32Array(0); // per pseudo-channel
let delayPs: Float64Array = new Float64Array(0); // per pseudo-channel: egress and flight
let halfPs = 0;
let pending = new Float64Array(0); // per die: credits under way
let ringsPerDie = 0;

/** `aheadPs`: the longest time from a slot's freeing to its landing plus one window. */
export function resetCredits(
  dieClockPs: readonly number[],
  dieOfPseudoChannel: Int32Array,
  delayOfPseudoChannel: Float64Array,
  halfClockPs: number,
  aheadPs: number,
): void {
  clockPs = Float64Array.from(dieClockPs);
  dieOf = dieOfPseudoChannel;
  delayPs = delayOfPseudoChannel;
  halfPs = halfClockPs;
  lanes = dieOfPseudoChannel.length * 2;
  const edges = Math.ceil(aheadPs / Math.min(...dieClockPs)) + 4;
  ringsPerDie = 2 ** Math.ceil(Math.log2(edges));
  mask = ringsPerDie - 1;
  ring = new Int16Array(ringsPerDie * lanes);
  pairs = new Int32Array(ring.buffer);
  landed = new Int32Array(ringsPerDie * dieClockPs.length);
  pending = new Float64Array(dieClockPs.length);
}

/** A queue slot of pseudo-channel `p` (op 0 read, 1 write) was freed at `half` half clocks. */
export function creditFreed(p: number, op: number, half: number): void {
  const die = dieOf[p];
  const edge = edgeAtOrAfter(die, half * halfPs + delayPs[p]);
  ring[(edge & mask) * lanes + p * 2 + op]++;
  landed[die * ringsPerDie + (edge & mask)]++;
  pending[die]++;
}

/** Index of the first clock edge of a die at or after a time; edge k is at ceil(k x period). */
export function edgeAtOrAfter(die: number, ps: number): number {
  const period = clockPs[die];
  let k = Math.ceil(ps / period - 1e-9);
  while (edgePs(die, k) < ps) k++;
  return k;
}

export function edgePs(die: number, edge: number): number {
  return Math.ceil(edge * clockPs[die] - 1e-6);
}

/** First edge from `edge` on at which a credit lands on the die; Infinity when none is under way. */
export function nextCreditEdge(die: number, edge: number): number {
  if (pending[die] === 0) return Number.POSITIVE_INFINITY;
  const from = die * ringsPerDie;
  let k = edge;
  while (landed[from + (k & mask)] === 0) k++;
  return k;
}

/** Takes the credits of pseudo-channel `p` that land on this edge: reads in the low 16 bits, writes above. */
export function takePair(edge: number, p: number): number {
  const at = ((edge & mask) * lanes) / 2 + p;
  const pair = pairs[at];
  if (pair !== 0) pairs[at] = 0;
  return pair;
}

/** Number of credits that land on the die at this edge; they count as taken. */
export function takeEdge(die: number, edge: number): number {
  const at = die * ringsPerDie + (edge & mask);
  const count = landed[at];
  landed[at] = 0;
  pending[die] -= count;
  return count;
}
