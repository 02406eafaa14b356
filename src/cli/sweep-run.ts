/** Runs what is missing of a sweep, point by point onto the disk. */

import type { PointRecord } from '../study/index.js';
import { dearestFirst, recordOf, runPoints } from '../study/index.js';
import { Bar, duration } from './bar.js';
import type { Session } from './session.js';
import type { Journal } from './sweep-journal.js';
import type { PlannedSweep } from './sweep-plan.js';

/** Runs these points of a sweep, the dearest first, on `workers` threads; an interrupt ends it with what is done kept. */
export async function runMissing(
  sweep: PlannedSweep,
  journal: Journal,
  wanted: readonly number[],
  workers: number | undefined,
  session: Session,
): Promise<void> {
  const { plan, points, costs, bytes } = sweep;
  const order = dearestFirst(wanted.map((point) => costs[point])).map((i) => wanted[i]);
  const bar = Bar.on(process.stderr, process.env);
  const whole = order.reduce((sum, point) => sum + costs[point], 0);
  const parts = new Map<number, number>(); // cost done of the points under way
  let finished = 0; // cost
  let done = 0;
  let failed = 0;
  const show = (): void => {
    const part = Math.min(1, ([...parts.values()].reduce((sum, cost) => sum + cost, 0) + finished) / whole);
    bar?.show(part, (seconds) => {
      const left = part > 0 ? `, ${duration(Math.ceil((seconds * (1 - part)) / part))} left` : '';
      return `${done} of ${order.length} runs${failed > 0 ? `, ${failed} failed` : ''}${left}`;
    });
  };
  // the bar goes on while nothing is heard from the threads
  const tick = bar === null ? undefined : setInterval(show, 1000);
  try {
    await runPoints(
      order.map((point) => sweep.jobOf(points[point])),
      {
        workers,
        signal: session.signal,
        onProgress: (progress, i) => {
          parts.set(i, costs[order[i]] * Math.min(1, progress.bytes / bytes[order[i]]));
          show();
        },
        onResult: (outcome, i) => {
          const record: PointRecord = recordOf(plan, points[order[i]], outcome);
          journal.append(record);
          parts.delete(i);
          finished += costs[order[i]];
          done++;
          if (record.status === 'failed') failed++;
          show();
        },
      },
    );
  } finally {
    clearInterval(tick);
    bar?.stop();
  }
}
