/**
 * Runs side by side. The engine keeps its hot state in its module (see DEVELOPERS.md), so each run that goes beside another needs
 * a thread of its own; threads are kept from job to job, since a warm engine runs about twice as fast as a cold one.
 */
import { availableParallelism } from 'node:os';
import { Worker } from 'node:worker_threads';
import type { Progress } from '../engine/index.js';
import { SystemError } from '../errors.js';
import { type Answer, type Job, type Outcome, receivedError } from './pool-job.js';

export type { Job, Outcome } from './pool-job.js';

export interface PoolOptions {
  /** Threads; by default as many as the machine has cores for us. Never more than there are jobs. */
  readonly workers?: number | undefined;
  /**
   * Called with each outcome as it comes, in no order, one at a time: the next call waits for the promise of this one. What it
   * throws ends the whole run.
   */
  readonly onResult: (outcome: Outcome, index: number) => void | Promise<void>;
  /** Called now and then with how far a job is. */
  readonly onProgress?: ((progress: Progress, index: number) => void) | undefined;
  /** Ends the run: jobs under way are dropped, and no more calls are made. */
  readonly signal?: AbortSignal | null | undefined;
}

const WORKER = new URL('./pool-worker.js', import.meta.url);

/** How many runs this machine takes side by side. */
export function defaultWorkers(): number {
  return availableParallelism();
}

/**
 * Runs every job, in the order given as threads come free, and calls `onResult` for each. Resolves when all are done, or soon
 * after `signal` is aborted; rejects with what `onResult` threw. A job that fails is an outcome and does not end the others,
 * not even when it takes its thread down.
 */
export async function runPoints(jobs: readonly Job[], options: PoolOptions): Promise<void> {
  const { onResult, onProgress, signal } = options;
  const threads = new Set<Worker>();
  let next = 0;
  let stopped = signal?.aborted ?? false;
  let told = Promise.resolve(); // the calls of onResult, one behind the other

  /** One lane takes job after job on one thread, and on a new one when that dies. */
  const lane = async (): Promise<void> => {
    let thread: Worker | null = null;
    while (!stopped && next < jobs.length) {
      const index = next++;
      thread ??= started();
      const outcome = await answered(thread, jobs[index], (progress) => onProgress?.(progress, index));
      if (stopped || outcome === null) return;
      if (outcome.dead) {
        threads.delete(thread);
        thread = null;
      }
      told = told.then(() => (stopped ? undefined : onResult(outcome.outcome, index)));
      await told;
    }
  };
  const started = (): Worker => {
    const thread = new Worker(WORKER);
    thread.setMaxListeners(0);
    threads.add(thread);
    return thread;
  };
  const stop = async (): Promise<void> => {
    stopped = true;
    await Promise.all([...threads].map((thread) => thread.terminate()));
  };
  const onAbort = (): void => void stop();
  signal?.addEventListener('abort', onAbort, { once: true });
  try {
    const lanes = Math.max(1, Math.min(options.workers ?? defaultWorkers(), jobs.length));
    await Promise.all(Array.from({ length: lanes }, lane));
  } finally {
    signal?.removeEventListener('abort', onAbort);
    await stop();
  }
}

/** `runPoints` for those who want all results at once: outcomes in the order of the jobs; undefined where it was stopped before. */
export async function runAll(
  jobs: readonly Job[],
  options: Omit<PoolOptions, 'onResult'> = {},
): Promise<(Outcome | undefined)[]> {
  const outcomes: (Outcome | undefined)[] = new Array(jobs.length).fill(undefined);
  await runPoints(jobs, {
    ...options,
    onResult: (outcome, index) => {
      outcomes[index] = outcome;
    },
  });
  return outcomes;
}

/** What a thread says to a job; null when the thread was ended from outside. */
function answered(
  thread: Worker,
  job: Job,
  onProgress: (progress: Progress) => void,
): Promise<{ readonly outcome: Outcome; readonly dead: boolean } | null> {
  return new Promise((resolve) => {
    const done = (outcome: Outcome | null, dead: boolean): void => {
      thread.off('message', onMessage).off('error', onError).off('exit', onExit);
      resolve(outcome === null ? null : { outcome, dead });
    };
    const onMessage = (answer: Answer): void => {
      if (answer.type === 'progress') onProgress(answer.progress);
      if (answer.type === 'result') done({ ok: true, result: answer.result }, false);
      if (answer.type === 'error') done({ ok: false, error: receivedError(answer.error) }, false);
    };
    // the thread itself broke: out of memory, or a defect outside the run
    const onError = (error: NodeJS.ErrnoException): void => {
      const outOfMemory = error.code === 'ERR_WORKER_OUT_OF_MEMORY';
      done(
        { ok: false, error: outOfMemory ? new SystemError('the run needs more memory than there is') : error },
        true,
      );
    };
    const onExit = (): void => done(null, true);
    thread.on('message', onMessage).on('error', onError).on('exit', onExit);
    thread.postMessage(job);
  });
}
