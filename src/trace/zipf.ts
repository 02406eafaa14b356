/**
 * Zipf-distributed ranks: P(rank k) = k^-s / H, k = 1 … items, drawn by rejection-inversion at a cost that does not grow with
 * the number of items (W. Hörmann and G. Derflinger, "Rejection-inversion to generate variates from monotone discrete
 * distributions", ACM TOMACS 6(3), 1996).
 *
 * In short: the area under x^-s from 1/2 to items + 1/2 is inverted at a uniform point and rounded to a whole rank; the point is
 * kept when it falls in the part of that rank's unit interval whose area is exactly the rank's probability. The part on the left
 * is cut off by two constants: `start` takes it from rank 1, where it would be largest, and `safe` accepts most points unseen.
 */
import type { RandomStream } from '../random.js';

export class ZipfRanks {
  private items = 0;
  private s = 0;
  private start = 0; // area(3/2) - 1: below it nothing is drawn
  private width = 0; // area(items + 1/2) - start
  private safe = 0; // a point at most this far left of its rank is always kept

  /** Points the sampler at a law: `items` ranks (at least 1), exponent `s` above 0. Cheap when nothing changed. */
  reset(items: number, s: number): void {
    if (items === this.items && s === this.s) return;
    this.items = items;
    this.s = s;
    this.start = area(1.5, s) - 1;
    this.width = area(items + 0.5, s) - this.start;
    this.safe = 2 - inverseArea(area(2.5, s) - 2 ** -s, s);
  }

  /** The next rank, 1 … items. */
  draw(random: RandomStream): number {
    const { items, s, start, width, safe } = this;
    for (;;) {
      const point = start + random.double() * width;
      const x = inverseArea(point, s);
      let rank = Math.floor(x + 0.5);
      if (rank < 1) rank = 1;
      else if (rank > items) rank = items;
      if (rank - x <= safe || point >= area(rank + 0.5, s) - rank ** -s) return rank;
    }
  }
}

/** Integral of t^-s from 1 to x: (x^(1-s) - 1) / (1 - s), and log x for s = 1, in a form that is exact near s = 1 as well. */
function area(x: number, s: number): number {
  const log = Math.log(x);
  const t = (1 - s) * log;
  return t > -1e-9 && t < 1e-9 ? log * (1 + t / 2) : (Math.expm1(t) / t) * log;
}

/** The x whose area is a. */
function inverseArea(a: number, s: number): number {
  const t = (1 - s) * a;
  if (t > -1e-9 && t < 1e-9) return Math.exp(a * (1 - t / 2));
  // rounding can push t a hair past -1, where the logarithm ends
  return Math.exp((Math.log1p(Math.max(t, -1)) / t) * a);
}
