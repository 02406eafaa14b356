/** A plan with everything around it: its points, the files it names and what they hold, where its results go. */
import { createHash } from 'node:crypto';
import { createReadStream, readFileSync, statSync } from 'node:fs';
import { basename, dirname, isAbsolute, join } from 'node:path';
import { loadPackage, type Package } from '../config/index.js';
import { InputError } from '../errors.js';
import { openTrace, VERSION } from '../index.js';
import {
  checkQuestions,
  headerOf,
  type Job,
  type Plan,
  type Point,
  parsePlan,
  pointsOf,
  type SweepHeader,
  traceCost,
  tryValues,
  withQuestions,
} from '../study/index.js';
import type { Session } from './session.js';
import { systemError } from './system-error.js';
import { usefulBytes } from './trace.js';

export interface PlannedSweep {
  readonly plan: Plan;
  readonly points: readonly Point[];
  readonly costs: readonly number[]; // by point, in atoms
  readonly bytes: readonly number[]; // useful bytes by point, Infinity where not known
  readonly header: SweepHeader;
  jobOf(point: Point): Job;
}

export interface Asked {
  readonly pareto: readonly string[];
  readonly cost: string | undefined;
  readonly need: readonly string[];
}

/** Reads a plan and all it names. Throws InputError, SystemError. */
export async function planned(file: string, asked: Asked, session: Session): Promise<PlannedSweep> {
  const plan = withQuestions(parsePlan(readPlan(file), file), asked);
  const beside = (name: string): string => (isAbsolute(name) ? name : join(dirname(file), name));
  const points = pointsOf(plan);
  checkQuestions(plan, points[0]);

  const packages = new Map<string, Package>();
  for (const name of plan.packages) packages.set(name, loadPackage(beside(name), plan.overrides));
  tryValues(plan, points, (point) => loadPackage(beside(point.package), point.overrides));

  // traces are opened once for their cost, and read once for their hash
  const traces = new Map<string, { readonly cost: number; readonly bytes: number; readonly hash: string }>();
  for (const name of plan.traces) {
    const path = beside(name);
    const trace = await session.unlessInterrupted(openTrace(path));
    const hash = await session.unlessInterrupted(hashOf(path));
    const zipped = path.endsWith('.gz') ? 4 : 1; // about what gzip makes of rows
    const cost = traceCost(trace, zipped * statSync(path).size);
    traces.set(name, { cost, bytes: usefulBytes(trace), hash });
  }
  const of = (point: Point) => traces.get(point.trace) as NonNullable<ReturnType<typeof traces.get>>;
  return {
    plan,
    points,
    costs: points.map((point) => of(point).cost),
    bytes: points.map((point) => of(point).bytes),
    header: headerOf(
      plan,
      points.length,
      VERSION,
      Object.fromEntries([...packages].map(([name, { hash }]) => [name, hash])),
      Object.fromEntries([...traces].map(([name, { hash }]) => [name, hash])),
    ),
    jobOf: (point) => ({
      package: beside(point.package),
      overrides: point.overrides,
      trace: beside(point.trace),
      run: { replay: plan.replay, seed: point.seed, untilPs: plan.untilPs },
    }),
  };
}

/** Where a sweep's results go when nothing else is said: a folder of the plan's name, here. */
export function folderOf(plan: string, out: string | undefined): string {
  return out ?? `${basename(plan).replace(/\.ya?ml$/, '')}.sweep`;
}

function readPlan(file: string): string {
  try {
    return readFileSync(file, 'utf8');
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    const found = code === 'ENOENT' || code === 'ENOTDIR' ? 'no such file' : code === 'EISDIR' ? 'a directory' : '';
    if (found === '') throw systemError(`${file}: cannot be read`, error);
    throw new InputError({ where: { file }, found, expected: 'a sweep plan (YAML)' });
  }
}

async function hashOf(file: string): Promise<string> {
  const hash = createHash('sha256');
  try {
    for await (const piece of createReadStream(file)) hash.update(piece as Buffer);
  } catch (error) {
    throw systemError(`${file}: cannot be read`, error);
  }
  return hash.digest('hex');
}
