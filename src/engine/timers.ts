import { Heap } from 'heap-js';

interface Timer {
  readonly ps: number;
  readonly context: number; // who is to be woken
}

/** Alarms of the compute dies: ends of tile compute, recorded arrivals, think times. Ties go to the lower context. */
export class Timers {
  private readonly heaps: Heap<Timer>[];

  constructor(dies: number) {
    this.heaps = Array.from({ length: dies }, () => new Heap<Timer>((a, b) => a.ps - b.ps || a.context - b.context));
  }

  set(die: number, ps: number, context: number): void {
    this.heaps[die].push({ ps, context });
  }

  /** Time of the die's next alarm, Infinity when there is none. */
  next(die: number): number {
    return this.heaps[die].peek()?.ps ?? Number.POSITIVE_INFINITY;
  }

  /** Takes the next alarm due at or before `now` and returns its context; -1 when there is none. */
  take(die: number, now: number): number {
    const heap = this.heaps[die];
    const first = heap.peek();
    if (first === undefined || first.ps > now) return -1;
    heap.pop();
    return first.context;
  }
}
