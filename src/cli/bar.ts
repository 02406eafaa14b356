/** A bar on standard error with a line of text: only where someone looks at it, and only for what takes longer than two seconds. */
import bars from 'cli-progress';

export const QUIET_MS = 2000; // shorter work needs no progress
const SCALE = 1000; // steps of the bar

export class Bar {
  private readonly startMs = performance.now();
  private bar: bars.SingleBar | null = null;

  constructor(
    private readonly stream: NodeJS.WriteStream,
    private readonly colour: boolean,
  ) {}

  /** Null where standard error is not a terminal. */
  static on(stream: NodeJS.WriteStream, env: NodeJS.ProcessEnv): Bar | null {
    const { NO_COLOR, TERM } = env;
    if (stream.isTTY !== true || TERM === 'dumb') return null;
    return new Bar(stream, !NO_COLOR);
  }

  /** Shows `done`, a fraction of the whole (0 when it is not known), and what `text` says after so many seconds. */
  show(done: number, text: (seconds: number) => string): void {
    const ms = performance.now() - this.startMs;
    if (ms < QUIET_MS) return;
    const line = { text: text(ms / 1000) };
    if (this.bar !== null) {
      this.bar.update(Math.floor(done * SCALE), line);
      return;
    }
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
    this.bar.start(SCALE, Math.floor(done * SCALE), line);
  }

  /** Takes the bar off the screen. */
  stop(): void {
    this.bar?.stop();
    this.bar = null;
  }
}

/** A number of seconds, in words. */
export function duration(seconds: number): string {
  if (seconds < 60) return `${seconds} s`;
  const minutes = Math.floor(seconds / 60);
  return minutes < 60 ? `${minutes} min ${seconds % 60} s` : `${Math.floor(minutes / 60)} h ${minutes % 60} min`;
}

function paint(text: string, colour: boolean): string {
  return colour ? `\u001b[36m${text}\u001b[0m` : text;
}
