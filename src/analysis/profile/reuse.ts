/**
 * Reuse distance: how many different lines are touched between two touches of one line. Lines are sampled by a hash of their number
 * (Waldspurger, Park, Garthwaite and Ahmad, FAST 2015): a distance among sampled lines, divided by the rate, is one among all. The
 * rate falls as lines become more than SAMPLED, so memory stays; the relative error of a share p of n samples is about
 * sqrt((1 - p) / (p n)).
 */
import { hash32 } from './footprint.js';

const SAMPLED = 8192; // lines followed at once
const TREE = 1 << 16; // touches kept in order before they are numbered anew
export const DISTANCE_BUCKETS = 40; // bucket k: distances of 2^k up to 2^(k+1) lines; 0 also holds distance 0

export class ReuseDistance {
  /** Touches by distance, each weighted by the inverse of the rate it was sampled at. */
  readonly buckets = new Float64Array(DISTANCE_BUCKETS);
  cold = 0; // first touches, weighted likewise
  samples = 0;
  private touches = 0;
  private threshold = 2 ** 32; // lines with a smaller hash are followed
  private readonly last = new Map<number, number>(); // line -> number of its last touch
  private readonly tree = new Int32Array(TREE + 1); // Fenwick tree: 1 at the last touch of each line
  private clock = 0;

  add(line: number): void {
    this.touches++;
    const hash = hash32(line, 0x1b873593) >>> 0;
    if (hash >= this.threshold) return;
    const weight = 2 ** 32 / this.threshold;
    this.samples++;
    if (this.clock === TREE) this.renumber();
    const before = this.last.get(line);
    if (before === undefined) this.cold += weight;
    else {
      const distance = (this.upTo(this.clock) - this.upTo(before)) * weight;
      this.buckets[distance < 2 ? 0 : Math.min(DISTANCE_BUCKETS - 1, Math.floor(Math.log2(distance)))] += weight;
      this.put(before, -1);
    }
    this.put(++this.clock, 1);
    this.last.set(line, this.clock);
    while (this.last.size > SAMPLED) this.halve();
  }

  /**
   * Touches by distance, corrected for what the sample missed or met too often: mostly lines that are touched again at once, so the
   * difference to the true number of touches goes to the shortest distances (the adjustment of the same paper).
   */
  adjusted(): Float64Array {
    const out = this.buckets.slice();
    const counted = this.cold + out.reduce((a, b) => a + b, 0);
    out[0] = Math.max(0, out[0] + this.touches - counted);
    return out;
  }

  private upTo(at: number): number {
    let sum = 0;
    for (let i = at; i > 0; i -= i & -i) sum += this.tree[i];
    return sum;
  }

  private put(at: number, by: number): void {
    for (let i = at; i <= TREE; i += i & -i) this.tree[i] += by;
  }

  /** Follows half as many lines from now on. */
  private halve(): void {
    this.threshold /= 2;
    for (const [line, at] of this.last) {
      if (hash32(line, 0x1b873593) >>> 0 < this.threshold) continue;
      this.put(at, -1);
      this.last.delete(line);
    }
  }

  /** Numbers the last touches 1, 2, … again, in their order. */
  private renumber(): void {
    const lines = [...this.last].sort((a, b) => a[1] - b[1]);
    this.tree.fill(0);
    this.clock = 0;
    for (const [line] of lines) {
      this.put(++this.clock, 1);
      this.last.set(line, this.clock);
    }
  }
}
