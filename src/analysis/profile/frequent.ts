/**
 * The most frequent values of a stream in fixed memory (Space-Saving: Metwally, Agrawal and El Abbadi, 2005): a value that comes
 * more than n / capacity times is among those kept, and no count is too high by more than n / capacity.
 */
export class Frequent {
  private readonly counts = new Map<number, number>();
  private least = 0; // no count is below it
  total = 0;

  constructor(private readonly capacity: number) {}

  add(value: number): void {
    this.total++;
    const count = this.counts.get(value);
    if (count !== undefined) this.counts.set(value, count + 1);
    else if (this.counts.size < this.capacity) this.counts.set(value, this.least + 1);
    else {
      // makes room for half as many again at once, so that looking for the least costs little
      const sorted = [...this.counts.values()].sort((a, b) => a - b);
      this.least = sorted[sorted.length >> 1];
      for (const [other, n] of this.counts) if (n <= this.least) this.counts.delete(other);
      this.counts.set(value, this.least + 1);
    }
  }

  /** How much too high a count may be. */
  get error(): number {
    return this.least;
  }

  /** The most frequent values, most first; of equal ones the smaller. */
  top(most: number): { readonly value: number; readonly count: number }[] {
    return [...this.counts]
      .map(([value, count]) => ({ value, count }))
      .sort((a, b) => b.count - a.count || a.value - b.value)
      .slice(0, most);
  }
}
