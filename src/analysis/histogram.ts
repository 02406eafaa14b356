/**
 * A log-linear histogram of non-negative doubles: every power of two is cut into 128 buckets of equal width, so a bucket is at
 * most 1/128 = 0.79 % as wide as the values in it; whole numbers below 256 have a bucket each. Count, sum, minimum and maximum
 * are exact. A percentile is the largest whole number of its bucket, so for whole numbers (ps) it is never too small and at most
 * 0.79 % too large.
 */

const SUB_BITS = 7; // 128 buckets a power of two
const SHIFT = 20 - SUB_BITS; // of the high word of a double: sign, 11 bits of exponent, 20 of mantissa
const BIAS = (1023 << SUB_BITS) - 1; // bucket 0 holds [0, 1), bucket 1 begins at 1.0
const EXPONENTS = 54; // 1 … 2^53 and up
const BUCKETS = EXPONENTS * (1 << SUB_BITS) + 1;
const LAST = BUCKETS - 1;

/** Offset of the word with sign, exponent and upper mantissa inside a double. */
const HIGH = new Uint8Array(new Float64Array([1]).buffer)[7] === 0x3f ? 1 : 0;

export class Histogram {
  count = 0;
  sum = 0; // exact for whole numbers while it is below 2^53
  min = Number.POSITIVE_INFINITY; // Infinity while empty
  max = Number.NEGATIVE_INFINITY; // -Infinity while empty
  private readonly recent = new Uint32Array(BUCKETS); // half the memory of `counts`, so it stays in cache
  private sinceSpill = 0; // values in `recent`: below 2^32, so that no bucket can wrap
  private readonly counts = new Float64Array(BUCKETS);

  /**
   * Adds the values of a column that stand at `rows[0 … count - 1]`. A negative value shows in `min` and lies in the first bucket;
   * one that is not a number shows in `sum`.
   */
  add(values: Float64Array, rows: Int32Array, count: number): void {
    if (this.sinceSpill + count >= 2 ** 32) this.spill();
    const { recent } = this;
    const words = new Int32Array(values.buffer, values.byteOffset, 2 * values.length);
    let sum = 0;
    let { min, max } = this;
    for (let i = 0; i < count; i++) {
      const row = rows[i];
      const value = values[row];
      sum += value;
      if (value < min) min = value;
      if (value > max) max = value;
      // the bucket is read off the bits: exponent and the top of the mantissa
      let bucket = (words[2 * row + HIGH] >> SHIFT) - BIAS;
      if (bucket < 0) bucket = 0;
      if (bucket > LAST) bucket = LAST;
      recent[bucket]++;
    }
    this.sinceSpill += count;
    this.count += count;
    this.sum += sum;
    this.min = min;
    this.max = max;
  }

  private spill(): void {
    for (let bucket = 0; bucket < BUCKETS; bucket++) this.counts[bucket] += this.recent[bucket];
    this.recent.fill(0);
    this.sinceSpill = 0;
  }

  /** Adds all that another histogram holds. */
  merge(other: Histogram): void {
    for (let bucket = 0; bucket < BUCKETS; bucket++) this.counts[bucket] += other.counts[bucket] + other.recent[bucket];
    this.count += other.count;
    this.sum += other.sum;
    this.min = Math.min(this.min, other.min);
    this.max = Math.max(this.max, other.max);
  }

  /**
   * The counts in wider buckets, COARSE_PER_OCTAVE to every power of two: bucket i holds the values in
   * [coarseEdge(i), coarseEdge(i + 1)). Cut after the last one that holds any.
   */
  coarse(): number[] {
    this.spill();
    const counts: number[] = [];
    for (let bucket = 0; bucket < BUCKETS; bucket++) {
      if (this.counts[bucket] === 0) continue;
      const to = bucket === 0 ? 0 : 1 + Math.floor((bucket - 1) / PER_COARSE);
      while (counts.length <= to) counts.push(0);
      counts[to] += this.counts[bucket];
    }
    return counts;
  }

  /** Mean of the values; 0 while empty. */
  get mean(): number {
    return this.count === 0 ? 0 : this.sum / this.count;
  }

  /**
   * The least value that at least `fraction` (0 … 1) of the values do not exceed, to the upper end of its bucket; 0
   * while empty.
   */
  percentile(fraction: number): number {
    if (this.count === 0) return 0;
    const rank = Math.max(1, Math.ceil(fraction * this.count));
    if (rank >= this.count) return this.max;
    this.spill();
    let seen = 0;
    let bucket = 0;
    while (bucket < LAST && seen + this.counts[bucket] < rank) seen += this.counts[bucket++];
    return Math.min(this.max, Math.max(this.min, upperEnd(bucket)));
  }
}

/** Buckets of coarse() a power of two. */
const COARSE_PER_OCTAVE = 8;
const PER_COARSE = (1 << SUB_BITS) / COARSE_PER_OCTAVE;

/** Lower edge of bucket `i` of coarse(): 0, 1, 1.125, 1.25 … 2, 2.25 … */
export function coarseEdge(i: number): number {
  return i === 0 ? 0 : edgeOf((i - 1) * PER_COARSE);
}

/** Largest whole number in a bucket, or its upper edge when it holds none. Bucket b covers [edge(b - 1), edge(b)). */
function upperEnd(bucket: number): number {
  if (bucket === 0) return 0;
  if (bucket === LAST) return Number.POSITIVE_INFINITY;
  const edge = edgeOf(bucket);
  const whole = Math.ceil(edge) - 1;
  return whole >= edgeOf(bucket - 1) ? whole : edge;
}

function edgeOf(bucket: number): number {
  const sub = 1 << SUB_BITS;
  return 2 ** (bucket >> SUB_BITS) * (1 + (bucket & (sub - 1)) / sub);
}
