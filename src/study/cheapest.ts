import { InputError } from '../errors.js';
import type { Value } from './expression.js';
import { kindOf } from './figures.js';
import type { Plan } from './plan.js';
import { type Point, valuesByName } from './points.js';
import type { Configuration } from './summary.js';

/** A package of the sweep: an axis setting with its runs on every trace. */
export interface Candidate {
  readonly configurations: readonly Configuration[]; // one a trace
  readonly cost: number;
  readonly meets: boolean; // every need, on every trace
}

/**
 * Every package with its cost, cheapest first (equal costs in the plan's order). A package must meet the needs on each trace; its
 * cost is the greatest it has on any. Throws InputError when nothing says what a package costs.
 */
export function candidates(plan: Plan, configurations: readonly Configuration[]): Candidate[] {
  const { cost, needs } = plan;
  if (cost === null) throw noCost(plan);
  const groups = new Map<string, Configuration[]>();
  for (const configuration of configurations) {
    const key = JSON.stringify([configuration.package, configuration.parameters]);
    groups.set(key, [...(groups.get(key) ?? []), configuration]);
  }
  const found = [...groups.values()].map((group) => {
    const whole = group.every(({ failed }) => failed === 0);
    const meets = whole && needs.every((need) => group.every((one) => need.evaluate(named(plan, one)) === 1));
    const costs = group.map((one) => cost.evaluate(named(plan, one)));
    return { configurations: group, cost: Math.max(...costs), meets };
  });
  return found.sort((a, b) => {
    if (Number.isNaN(a.cost) || Number.isNaN(b.cost))
      return Number(Number.isNaN(a.cost)) - Number(Number.isNaN(b.cost));
    return a.cost - b.cost || a.configurations[0].index - b.configurations[0].index;
  });
}

/** What costs and needs may ask of a configuration: its axes and its figures. */
function named(plan: Plan, configuration: Configuration): (name: string) => Value | undefined {
  return (name) => {
    if (name === 'package') return configuration.package;
    if (name === 'trace') return configuration.trace;
    const axis = plan.axes.find((one) => one.name === name);
    if (axis !== undefined) {
      return axis.values.find(({ label }) => label === configuration.parameters[name])?.value;
    }
    const figure = configuration.figures.get(name);
    return figure === undefined ? undefined : { value: figure.mean, kind: kindOf(name) };
  };
}

/** Tries needs and cost on one point, before anything is run: that each compares and adds like with like, and that there is a cost. */
export function checkQuestions(plan: Plan, point: Point): void {
  if (plan.needs.length > 0 && plan.cost === null) throw noCost(plan);
  const own = valuesByName(plan, point.package, point.trace, point.values);
  const values = (name: string): Value => own(name) ?? { value: 1, kind: kindOf(name) };
  for (const question of [...plan.needs, ...(plan.cost === null ? [] : [plan.cost])]) question.evaluate(values);
}

function noCost(plan: Plan): InputError {
  return new InputError({
    where: plan.needs[0].where,
    found: 'a need, but nothing that says what a package costs',
    expected: "cost in the plan, or --cost, for example --cost '6 * stacks' or --cost package.capacity_bytes",
  });
}
