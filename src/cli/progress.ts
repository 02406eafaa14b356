/** Progress on standard error: only where someone looks at it, and only for what takes longer than two seconds. */
import bars from 'cli-progress';
import type { Progress } from '../engine/index.js';
import { formatCount, formatTime } from '../units.js';

export const QUIET_MS = 2000; // shorter work needs no progress
const SCALE = 1000; // steps of the bar

/** What is known of the whole when a run begins; Infinity where it is not known. */
export interface Whole {
  readonly bytes: number; // useful bytes of the trace
  readonly untilPs: number; // where --until stops it
}

/** Shows how far a run is. Give `show` to the engine and call `stop` before anything else is printed. */
export class ProgressBar {
  private readonly startMs = performance.now();
  private bar: bars.SingleBar | null = null;

  constructor(
    private readonly whole: Whole,
    private readonly stream: NodeJS.WriteStream,
    private readonly colour: boolean,
  ) {}

  /** Null where standard error is not a terminal. */
  static on(stream: NodeJS.WriteStream, whole: Whole, env: NodeJS.ProcessEnv): ProgressBar | null {
    const { NO_COLOR, TERM } = env;
    if (stream.isTTY !== true || TERM === 'dumb') return null;
    return new ProgressBar(whole, stream, !NO_COLOR);
  }

  readonly show = (progress: Progress): void => {
    const seconds = (performance.now() - this.startMs) / 1000;
    if (seconds * 1000 < QUIET_MS) return;
    const done = Math.min(1, Math.max(progress.bytes / this.whole.bytes, progress.simulatedPs / this.whole.untilPs));
    const text = describe(progress, done, seconds);
    if (this.bar === null) {
      this.bar = new bars.SingleBar({
        format: (options, params, payload) =>
          done > 0 || params.value > 0
            ? `${paint(bars.Format.BarFormat(params.progress, options), this.colour)} ${payload.text}`
            : payload.text,
        barsize: 24,
        barCompleteString: '='.repeat(24),
        barIncompleteString: '-'.repeat(24),
        stream: this.stream,
        fps: 5,
        clearOnComplete: true,
        hideCursor: true,
        gracefulExit: false, // interrupts are main's
        emptyOnZero: true,
      });
      this.bar.start(SCALE, Math.floor(done * SCALE), { text });
    } else this.bar.update(Math.floor(done * SCALE), { text });
  };

  /** Takes the bar off the screen. */
  stop(): void {
    this.bar?.stop();
    this.bar = null;
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

export function duration(seconds: number): string {
  if (seconds < 60) return `${seconds} s`;
  const minutes = Math.floor(seconds / 60);
  return minutes < 60 ? `${minutes} min ${seconds % 60} s` : `${Math.floor(minutes / 60)} h ${minutes % 60} min`;
}

function paint(text: string, colour: boolean): string {
  return colour ? `\u001b[36m${text}\u001b[0m` : text;
}
