/** Progress of work that goes over the rows of a trace: on standard error, where someone looks at it, after two seconds. */
import { formatCount } from '../units.js';
import { duration, QUIET_MS } from './bar.js';

const EVERY_MS = 200;

export class RowProgress {
  private readonly startMs = performance.now();
  private lastMs = 0;
  private shown = false;

  constructor(
    private readonly stream: NodeJS.WriteStream,
    private readonly fraction: () => number,
  ) {}

  /** Null where standard error is not a terminal. */
  static on(stream: NodeJS.WriteStream, fraction: () => number): RowProgress | null {
    const { TERM } = process.env;
    return stream.isTTY === true && TERM !== 'dumb' ? new RowProgress(stream, fraction) : null;
  }

  /** `rows` so far. */
  show(rows: number): void {
    const now = performance.now();
    if (now - this.startMs < QUIET_MS || now - this.lastMs < EVERY_MS) return;
    this.lastMs = now;
    this.shown = true;
    this.stream.write(`\r${describeRows(rows, this.fraction(), (now - this.startMs) / 1000)}\u001b[K`);
  }

  /** Takes the line off the screen. */
  stop(): void {
    if (this.shown) this.stream.write('\r\u001b[K');
    this.shown = false;
  }
}

/** One line: how far, how fast, how long still. `done` is NaN where the whole is not known. */
export function describeRows(rows: number, done: number, seconds: number): string {
  const rate = `${formatCount(rows)} rows, ${formatCount(Math.round(rows / seconds))} rows/s`;
  if (!(done > 0)) return rate;
  return `${Math.floor(100 * done)} %, ${rate}, ${duration(Math.ceil((seconds * (1 - done)) / done))} left`;
}
