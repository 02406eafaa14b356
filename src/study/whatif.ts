import type { Result } from '../analysis/index.js';
import { InputError, nearest } from '../errors.js';
import { loadPackage } from '../index.js';
import { LIMITS, type Limit } from './limits.js';
import { defaultWorkers, type Job, type PoolOptions, runPoints } from './pool.js';

/** One re-run: the limits that were lifted in it, and what came of that. */
export interface Lifted {
  readonly limits: readonly string[]; // keys of Limit
  readonly label: string;
  readonly overrides: readonly string[]; // what to --set to get the same
  readonly makespan_ps: number;
  readonly saved_ps: number; // below 0 where it takes longer
  readonly saved_ratio: number; // of the run as it is
  readonly achieved_bytes_per_s: number;
  readonly binds: string; // what binds then, as in a verdict
  readonly checks_ok: boolean;
}

/** Two limits of which lifting both saves more than lifting each. */
export interface Pair extends Lifted {
  readonly together_ps: number; // saved beyond the sum of what each saves alone
}

export interface WhatIf {
  readonly partial: boolean; // interrupted: some runs are missing
  readonly makespan_ps: number; // as it is
  readonly data_ps: number; // the moved bytes at the DRAM peak: no run of this package moves them sooner
  readonly binds: string;
  readonly sentence: string; // verdict of the run as it is
  readonly lifted: readonly Lifted[]; // one limit each, most saved first
  readonly everything: Lifted | null;
  readonly pairs: readonly Pair[]; // most gained together first; empty unless asked for
  readonly idle: readonly string[]; // labels of limits that this package does not have
}

export interface WhatIfOptions extends Pick<PoolOptions, 'workers' | 'signal'> {
  readonly pairs: boolean;
  readonly only: readonly string[]; // keys of the limits to try; empty: all
  /** Called once the run as it is has been done: how many more there are, and how long they will take. */
  readonly onPlan?: (runs: number, threads: number, aboutMs: number) => void;
  /** Called now and then with how far the run as it is has come. */
  readonly onProgress?: PoolOptions['onProgress'];
  /** Called when a re-run is done: how many so far. */
  readonly onRun?: (done: number) => void;
}

/** The limits named by `keys`, all when there are none. Throws InputError. */
export function limitsNamed(keys: readonly string[]): Limit[] {
  const known = LIMITS.map(({ key }) => key);
  for (const key of keys) {
    if (known.includes(key)) continue;
    const like = nearest(key, known);
    throw new InputError({
      where: { file: '--limits' },
      found: `'${key}'`,
      expected: `limits out of ${known.join(', ')}`,
      hint: like === undefined ? undefined : `Did you mean '${like}'?`,
    });
  }
  // in their own order, which decides where two set one key
  return LIMITS.filter(({ key }) => keys.length === 0 || keys.includes(key));
}

interface Asked extends Pick<PoolOptions, 'workers' | 'signal' | 'onProgress'> {
  readonly onDone?: () => void;
}

/** Results in the order of the jobs, null where it was stopped before. Throws what a job failed with, and stops the others then. */
async function results(jobs: readonly Job[], { onDone, ...asked }: Asked): Promise<(Result | null)[]> {
  const found = new Array<Result | null>(jobs.length).fill(null);
  await runPoints(jobs, {
    ...asked,
    onResult: (outcome, index) => {
      if (!outcome.ok) throw outcome.error;
      found[index] = outcome.result;
      onDone?.();
    },
  });
  return found;
}

interface Trial {
  readonly limits: readonly Limit[];
  readonly overrides: readonly string[];
}

/**
 * Simulates a job as it is, then with one limit lifted at a time, with all of them, and if asked with every two. Each is a run of its
 * own of the package with keys overridden. A limit whose overrides leave the package as it is does not bind and is not run.
 */
export async function whatIf(job: Job, options: WhatIfOptions): Promise<WhatIf> {
  const { workers = defaultWorkers(), signal } = options;
  const given = job.overrides ?? [];
  const pkg = loadPackage(job.package, given);
  const hashOf = (overrides: readonly string[]): string => loadPackage(job.package, [...given, ...overrides]).hash;
  const trials = limitsNamed(options.only).map(
    (limit): Trial => ({ limits: [limit], overrides: limit.overrides(pkg) }),
  );
  const real = trials.filter(({ overrides }) => hashOf(overrides) !== pkg.hash);
  const idle = trials.filter((trial) => !real.includes(trial)).map(({ limits: [limit] }) => limit.label);

  // the run as it is also says how long a run takes
  const began = performance.now();
  const [base] = await results([job], { workers: 1, signal, onProgress: options.onProgress });
  if (base === null) return nothing(idle);
  const pairs = options.pairs ? real.flatMap((a, i) => real.slice(i + 1).map((b) => joined([a, b]))) : [];
  const runs = [...real, ...(real.length > 1 ? [joined(real)] : []), ...pairs];
  const threads = Math.max(1, Math.min(workers, runs.length));
  options.onPlan?.(runs.length, threads, (performance.now() - began) * Math.ceil(runs.length / threads));

  let done = 0;
  const found = await results(
    runs.map(({ overrides }) => ({ ...job, overrides: [...given, ...overrides] })),
    { workers: threads, signal, onDone: () => options.onRun?.(++done) },
  );
  const rows = runs.map((trial, i) => {
    const result = found[i];
    return result === null ? null : lifted(trial, result, base);
  });
  const singles = rows.slice(0, real.length).filter((row) => row !== null);
  const alone = new Map(singles.map((row) => [row.limits[0], row.saved_ps]));
  return {
    partial: base.partial || rows.includes(null),
    makespan_ps: base.makespan_ps,
    data_ps: (base.bandwidth.moved_bytes / base.bandwidth.peak_bytes_per_s) * 1e12,
    binds: base.verdict.binds,
    sentence: base.verdict.sentence,
    lifted: [...singles].sort((a, b) => b.saved_ps - a.saved_ps),
    everything: real.length > 1 ? rows[real.length] : (singles[0] ?? null),
    pairs: rows
      .slice(real.length + 1)
      .filter((row) => row !== null)
      .map((row) => ({
        ...row,
        together_ps: row.saved_ps - (alone.get(row.limits[0]) ?? 0) - (alone.get(row.limits[1]) ?? 0),
      }))
      .sort((a, b) => b.together_ps - a.together_ps),
    idle,
  };
}

function joined(trials: readonly Trial[]): Trial {
  return {
    limits: trials.flatMap(({ limits }) => limits),
    overrides: trials.flatMap(({ overrides }) => overrides),
  };
}

function lifted({ limits, overrides }: Trial, result: Result, base: Result): Lifted {
  const saved = base.makespan_ps - result.makespan_ps;
  return {
    limits: limits.map(({ key }) => key),
    label: limits.map(({ label }) => label).join(' and '),
    overrides,
    makespan_ps: result.makespan_ps,
    saved_ps: saved,
    saved_ratio: base.makespan_ps > 0 ? saved / base.makespan_ps : 0,
    achieved_bytes_per_s: result.bandwidth.achieved_bytes_per_s,
    binds: result.verdict.binds,
    checks_ok: result.checks.every(({ ok }) => ok),
  };
}

function nothing(idle: readonly string[]): WhatIf {
  const empty = { makespan_ps: 0, data_ps: 0, binds: 'nothing', sentence: 'Interrupted before anything was run.' };
  return { partial: true, ...empty, lifted: [], everything: null, pairs: [], idle };
}
