/** Progress of one run on standard error. */
import type { Progress } from '../engine/index.js';
import { formatCount, formatTime } from '../units.js';
import { Bar, duration } from './bar.js';

/** What is known of the whole when a run begins; Infinity where it is not known. */
export interface Whole {
  readonly bytes: number; // useful bytes of the trace
  readonly untilPs: number; // where --until stops it
}

/** Shows how far a run is. Give `show` to the engine and call `stop` before anything else is printed. */
export class ProgressBar {
  private constructor(
    private readonly whole: Whole,
    private readonly bar: Bar,
  ) {}

  /** Null where standard error is not a terminal. */
  static on(stream: NodeJS.WriteStream, whole: Whole, env: NodeJS.ProcessEnv): ProgressBar | null {
    const bar = Bar.on(stream, env);
    return bar === null ? null : new ProgressBar(whole, bar);
  }

  readonly show = (progress: Progress): void => {
    const done = Math.min(1, Math.max(progress.bytes / this.whole.bytes, progress.simulatedPs / this.whole.untilPs));
    this.bar.show(done, (seconds) => describe(progress, done, seconds));
  };

  /** Takes the bar off the screen. */
  stop(): void {
    this.bar.stop();
  }
}

/** One line: how far, how fast, how long still. `done` is the fraction of the whole, 0 where the whole is not known. */
export function describe({ requests, simulatedPs }: Progress, done: number, seconds: number): string {
  const rate = `${formatCount(Math.round(requests / seconds))} requests/s`;
  const simulated = `${formatTime(simulatedPs)} simulated`;
  if (done <= 0) return `${formatCount(requests)} requests, ${rate}, ${simulated}`;
  const left = Math.ceil((seconds * (1 - done)) / done);
  return `${Math.floor(100 * done)} %, ${rate}, ${simulated}, ${duration(left)} left`;
}
