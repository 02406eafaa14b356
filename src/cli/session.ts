/** What a command needs of the world around it: where to say things, how wide and how colourful, and when to stop. */
import { systemError } from './system-error.js';

/** Thrown where an interrupt came before there was anything to report. */
export class Interrupted extends Error {
  override readonly name = 'Interrupted';
}

export class Session {
  /** What the process ends with when nothing is thrown; see the exit codes in the README. */
  exitCode = 0;
  /** Aborted by the first interrupt; a command then stops soon and says what it has. */
  readonly signal: AbortSignal;
  /** Colour in what goes to standard output. */
  readonly colour: boolean;
  /** Columns of the reports. */
  readonly width: number;
  private closed = false; // the reader of standard output has gone
  private failure: unknown = null; // what standard output last threw

  constructor(signal: AbortSignal) {
    this.signal = signal;
    const { stdout } = process;
    const { NO_COLOR, TERM } = process.env;
    this.colour = stdout.isTTY === true && !NO_COLOR && TERM !== 'dumb';
    this.width = Math.max(40, Math.min(100, stdout.columns || 100));
    stdout.on('error', (error: NodeJS.ErrnoException) => {
      if (error.code === 'EPIPE') this.closed = true;
      else this.failure = systemError('standard output: cannot be written', error);
    });
    // nothing can be said about standard error that would reach anyone
    process.stderr.on('error', () => {});
  }

  /** False once nobody reads standard output any more: what only serves it need not be done. */
  get heard(): boolean {
    return !this.closed;
  }

  /** Writes to standard output and waits until it is taken. A reader that has gone away is no error. Throws SystemError. */
  async print(text: string): Promise<void> {
    if (!this.closed && text !== '') {
      await new Promise<void>((resolve) => process.stdout.write(text, () => resolve()));
      await new Promise(setImmediate); // lets the error event come before it is looked for
    }
    if (this.failure !== null) throw this.failure;
  }

  /** Writes a line to standard error. */
  warn(text: string): void {
    process.stderr.write(`${text}\n`);
  }

  /** Waits for `work`, but no longer than until an interrupt. Throws Interrupted. */
  async unlessInterrupted<T>(work: Promise<T>): Promise<T> {
    const { signal } = this;
    let stop = (): void => {};
    const interrupted = new Promise<never>((_, reject) => {
      stop = () => reject(new Interrupted('interrupted before there was anything to report'));
      signal.addEventListener('abort', stop, { once: true });
      if (signal.aborted) stop();
    });
    return Promise.race([work, interrupted]).finally(() => signal.removeEventListener('abort', stop));
  }

  /** Lets signals and output be handled in the middle of work that never waits; true when the work should stop. */
  async breathe(): Promise<boolean> {
    await new Promise(setImmediate);
    return this.signal.aborted;
  }
}
