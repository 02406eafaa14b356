/**
 * What a sweep leaves behind, point by point: a header that says which sweep it is, then one line of JSON for each run. Lines hold
 * nothing of when, where or by whom a point was run, so equal sweeps give equal lines.
 */
import type { Result } from '../analysis/index.js';
import { InputError } from '../errors.js';
import { figureOf } from './figures.js';
import type { Plan } from './plan.js';
import type { Point } from './points.js';
import type { Outcome } from './pool-job.js';

export const SWEEP_FORMAT = 'penstock-sweep';

/** Which sweep lines belong to: whatever changes a run, or what is kept of it, changes the header. */
export interface SweepHeader {
  readonly format: typeof SWEEP_FORMAT;
  readonly version: 1;
  readonly program: string; // version of the program
  readonly name: string;
  readonly points: number;
  readonly replay: string;
  readonly until_ps: number | null;
  readonly seeds: readonly string[];
  readonly overrides: readonly string[];
  readonly axes: readonly { readonly name: string; readonly values: readonly (string | number | boolean)[] }[];
  readonly where: readonly string[];
  readonly packages: Readonly<Record<string, string>>; // name in the plan -> hash of the package without overrides
  readonly traces: Readonly<Record<string, string>>; // name in the plan -> sha256 of the file
  readonly figures: readonly string[];
}

/** One run and what became of it. */
export interface PointRecord {
  readonly point: number;
  readonly configuration: number;
  readonly package: string;
  readonly trace: string;
  readonly parameters: Readonly<Record<string, string | number | boolean>>; // axis -> value as the plan has it
  readonly overrides: readonly string[];
  readonly seed: string;
  readonly status: 'done' | 'failed';
  readonly error?: { readonly kind: 'InputError' | 'CheckError' | 'SystemError' | 'Error'; readonly message: string };
  readonly package_hash?: string;
  readonly verdict?: string;
  readonly binds?: string;
  readonly figures?: Readonly<Record<string, number | null>>;
}

export function headerOf(
  plan: Plan,
  points: number,
  program: string,
  packages: Readonly<Record<string, string>>,
  traces: Readonly<Record<string, string>>,
): SweepHeader {
  return {
    format: SWEEP_FORMAT,
    version: 1,
    program,
    name: plan.name,
    points,
    replay: plan.replay,
    until_ps: Number.isFinite(plan.untilPs) ? plan.untilPs : null,
    seeds: plan.seeds,
    overrides: plan.overrides,
    axes: plan.axes.map(({ name, values }) => ({ name, values: values.map(({ label }) => label) })),
    where: plan.conditions.map(({ text }) => text),
    packages,
    traces,
    figures: plan.figures,
  };
}

/** The line of a point. A result whose own checks failed is a failure: its figures must not be used. */
export function recordOf(plan: Plan, point: Point, outcome: Outcome): PointRecord {
  const who = {
    point: point.index,
    configuration: point.configuration,
    package: point.package,
    trace: point.trace,
    parameters: Object.fromEntries(plan.axes.map(({ name }, i) => [name, point.values[i].label])),
    overrides: point.overrides,
    seed: point.seed,
  };
  if (!outcome.ok) {
    const { name, message } = outcome.error;
    const kind = name === 'InputError' || name === 'CheckError' || name === 'SystemError' ? name : 'Error';
    return { ...who, status: 'failed', error: { kind, message: firstLine(message) } };
  }
  const { result } = outcome;
  const failed = result.checks.filter(({ ok }) => !ok);
  if (failed.length > 0) {
    const message = `the result must not be used: ${failed.map(({ name }) => name).join(', ')} failed`;
    return { ...who, status: 'failed', error: { kind: 'CheckError', message } };
  }
  return { ...who, status: 'done', ...kept(plan, result) };
}

function kept(plan: Plan, result: Result): Pick<PointRecord, 'package_hash' | 'verdict' | 'binds' | 'figures'> {
  return {
    package_hash: result.provenance.package_hash,
    verdict: result.verdict.sentence,
    binds: result.verdict.binds,
    figures: Object.fromEntries(plan.figures.map((name) => [name, figureOf(result, name)])),
  };
}

const firstLine = (message: string): string => message.split('\n')[0];

/** What is read of one file of lines: whole lines only, the torn end of a killed writer is left out. */
export interface Lines {
  readonly header: string;
  readonly records: ReadonlyMap<number, string>; // point -> its line
}

/**
 * Reads the lines of a file. Null when not even the header is whole. Throws InputError with file and line when it is no such file,
 * or when a line in its middle is damaged.
 */
export function readLines(text: string, file: string): Lines | null {
  const end = text.lastIndexOf('\n');
  if (end < 0) return null;
  const [header, ...lines] = text.slice(0, end).split('\n');
  if (!header.startsWith(`{"format":"${SWEEP_FORMAT}"`)) {
    throw new InputError({ where: { file, line: 1 }, found: 'another kind of file', expected: 'points of a sweep' });
  }
  const records = new Map<number, string>();
  for (const [i, line] of lines.entries()) {
    const point = pointOf(line);
    if (point === null) {
      throw new InputError({
        where: { file, line: i + 2 },
        found: 'a damaged line',
        expected: 'a point of a sweep',
        hint: 'The file was changed by something else; remove it, and its points are run again',
      });
    }
    records.set(point, line);
  }
  return { header, records };
}

function pointOf(line: string): number | null {
  try {
    const { point, status } = JSON.parse(line) as Partial<PointRecord>;
    return Number.isInteger(point) && (status === 'done' || status === 'failed') ? (point as number) : null;
  } catch {
    return null;
  }
}

/** Whether a failure may go away by itself: what the system refused, unlike what is wrong with a package. */
export function worthAnotherTry(line: string): boolean {
  const { status, error } = JSON.parse(line) as PointRecord;
  return status === 'failed' && error?.kind === 'SystemError';
}

/** Says in which part two headers differ, in words for the user. */
export function difference(one: SweepHeader, other: SweepHeader): string {
  const said: Readonly<Partial<Record<keyof SweepHeader, string>>> = {
    program: `the version of penstock (${one.program} there, ${other.program} here)`,
    packages: 'a package file',
    traces: 'a trace file',
    figures: 'the figures to keep',
    seeds: 'the seeds',
  };
  const keys = Object.keys(other) as (keyof SweepHeader)[];
  const differs = keys.filter((key) => JSON.stringify(one[key]) !== JSON.stringify(other[key]));
  const words = differs.filter((key) => key !== 'points').map((key) => said[key] ?? `'${key}' of the plan`);
  return words.length > 0 ? words.join(', ') : 'the plan';
}
