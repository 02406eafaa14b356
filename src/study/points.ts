/** The runs a plan asks for, in an order that depends on the plan alone. */
import { InputError } from '../errors.js';
import type { Value } from './expression.js';
import type { AxisValue, Plan } from './plan.js';

const MOST_POINTS = 1_000_000; // beyond it a plan is a slip: at a second each it would run for eleven days

/** One run: a combination of values, with a seed. */
export interface Point {
  readonly index: number; // place in the plan's order, from 0
  readonly configuration: number; // runs that differ only in the seed share one
  readonly package: string; // as the plan writes it
  readonly trace: string;
  readonly values: readonly AxisValue[]; // one an axis
  readonly overrides: readonly string[];
  readonly seed: string;
}

/** All points of a plan: packages, traces and axes, the last axis varying fastest, then seeds. Throws InputError when none is left. */
export function pointsOf(plan: Plan): Point[] {
  const points: Point[] = [];
  let configuration = 0;
  for (const pkg of plan.packages) {
    for (const trace of plan.traces) {
      for (const values of combinations(plan)) {
        const named = valuesByName(plan, pkg, trace, values);
        if (!plan.conditions.every((condition) => condition.evaluate(named) !== 0)) continue;
        const overrides = [...plan.overrides, ...values.flatMap((value) => value.overrides)];
        for (const seed of plan.seeds) {
          points.push({ index: points.length, configuration, package: pkg, trace, values, overrides, seed });
        }
        configuration++;
        if (points.length > MOST_POINTS) throw tooMany(plan);
      }
    }
  }
  if (points.length > 0) return points;
  throw new InputError({
    where: plan.place(['where']),
    found: 'conditions that no combination meets',
    expected: 'at least one point',
  });
}

/** What expressions may ask of a combination. */
export function valuesByName(
  plan: Plan,
  pkg: string,
  trace: string,
  values: readonly AxisValue[],
): (name: string) => Value | undefined {
  return (name) => {
    if (name === 'package') return pkg;
    if (name === 'trace') return trace;
    return values[plan.axes.findIndex((axis) => axis.name === name)]?.value;
  };
}

function* combinations({ axes }: Plan): Generator<readonly AxisValue[]> {
  const at = axes.map(() => 0);
  for (;;) {
    yield at.map((i, a) => axes[a].values[i]);
    let a = axes.length - 1;
    while (a >= 0 && ++at[a] === axes[a].values.length) at[a--] = 0;
    if (a < 0) return;
  }
}

function tooMany(plan: Plan): InputError {
  return new InputError({
    where: plan.place(['axes']),
    found: `more than ${MOST_POINTS} points`,
    expected: 'fewer values, or conditions under where',
  });
}
