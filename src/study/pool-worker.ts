/** A worker of the pool: one engine instance of its own, one run after the other. */
import { parentPort } from 'node:worker_threads';
import { loadPackage, openTrace, simulate } from '../index.js';
import { type Answer, type Job, sentError } from './pool-job.js';

const PROGRESS_MS = 250; // between two reports of one run

const port = parentPort;
if (port === null) throw new Error('a pool worker runs in a thread of a pool');
const answer = (message: Answer): void => port.postMessage(message);

async function work(job: Job): Promise<void> {
  try {
    const pkg = loadPackage(job.package, job.overrides ?? []);
    const trace = await openTrace(job.trace, { package: pkg, ...job.traceOptions });
    let last = performance.now();
    const result = await simulate(pkg, trace, {
      ...job.run,
      overrides: job.overrides ?? [],
      onProgress: (progress) => {
        if (performance.now() - last < PROGRESS_MS) return;
        last = performance.now();
        answer({ type: 'progress', progress: { ...progress } });
      },
    });
    answer({ type: 'result', result });
  } catch (error) {
    answer({ type: 'error', error: sentError(error) });
  }
}

port.on('message', (job: Job) => void work(job));
