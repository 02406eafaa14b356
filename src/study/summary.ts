/** Runs to configurations: repeats that differ only in their seed are averaged. */
import type { Plan } from './plan.js';
import type { PointRecord } from './record.js';

/** A figure over the repeats of one configuration. */
export interface Mean {
  readonly mean: number;
  readonly half: number | null; // half width of the 95 % confidence interval; null with one run
}

/** All runs that differ only in their seed. */
export interface Configuration {
  readonly index: number;
  readonly package: string;
  readonly trace: string;
  readonly parameters: PointRecord['parameters'];
  readonly runs: readonly PointRecord[];
  readonly failed: number; // of its runs
  readonly figures: ReadonlyMap<string, Mean>; // those that every run has
  readonly binds: string; // of the first run that is done
}

/** Two-sided 95 % points of Student's t by degrees of freedom, from memory of the usual table; beyond 30 the normal one is near. */
const T95 = [
  12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.365, 2.306, 2.262, 2.228, 2.201, 2.179, 2.16, 2.145, 2.131, 2.12, 2.11,
  2.101, 2.093, 2.086, 2.08, 2.074, 2.069, 2.064, 2.06, 2.056, 2.052, 2.048, 2.045, 2.042,
];

export function configurationsOf(plan: Plan, records: readonly PointRecord[]): Configuration[] {
  const groups = new Map<number, PointRecord[]>();
  for (const record of records) {
    const group = groups.get(record.configuration);
    if (group === undefined) groups.set(record.configuration, [record]);
    else group.push(record);
  }
  return [...groups].map(([index, runs]) => {
    const done = runs.filter(({ status }) => status === 'done');
    const figures = new Map<string, Mean>();
    for (const name of plan.figures) {
      const values = done.map((run) => run.figures?.[name] ?? null).filter((value) => value !== null);
      if (values.length > 0 && values.length === done.length) figures.set(name, meanOf(values));
    }
    const [{ package: pkg, trace, parameters }] = runs;
    const failed = runs.length - done.length;
    return { index, package: pkg, trace, parameters, runs, failed, figures, binds: done[0]?.binds ?? '' };
  });
}

export function meanOf(values: readonly number[]): Mean {
  const n = values.length;
  const mean = values.reduce((sum, value) => sum + value, 0) / n;
  if (n < 2) return { mean, half: null };
  const variance = values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / (n - 1);
  return { mean, half: (T95[n - 2] ?? 1.96) * Math.sqrt(variance / n) };
}
