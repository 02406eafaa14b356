import type { SweepConfiguration, SweepTable } from '../report/index.js';
import { candidates } from './cheapest.js';
import { type Effect, effectOf } from './effects.js';
import { isShare, kindOf } from './figures.js';
import { frontOf } from './front.js';
import type { Plan } from './plan.js';
import type { PointRecord } from './record.js';
import { type Configuration, configurationsOf } from './summary.js';

const USUAL_FIGURE = 'bandwidth.achieved_bytes_per_s'; // what effects are on when no goal is given

/** The records of a sweep, in point order, as what its reports print. `points` is how many the whole plan has. */
export function tableOf(plan: Plan, records: readonly PointRecord[], program: string, points: number): SweepTable {
  const configurations = configurationsOf(plan, records);
  const parameters = ['package', 'trace', ...plan.axes.map(({ name }) => name)];
  const sizes = [plan.packages.length, plan.traces.length, ...plan.axes.map(({ values }) => values.length)];
  const named = (of: Configuration | PointRecord) => [of.package, of.trace, ...Object.values(of.parameters)];
  const front = frontOf(configurations, plan.pareto);
  const asked = plan.needs.length > 0;
  const priced = asked || plan.cost !== null ? candidates(plan, configurations) : [];
  const answers = new Map(
    priced.flatMap(({ configurations: own, cost, meets }) => own.map((one) => [one.index, { cost, meets }] as const)),
  );
  const best = priced.find(({ meets, cost }) => meets && !Number.isNaN(cost));
  return {
    name: plan.name,
    program,
    points,
    parameters,
    varying: parameters.filter((_, i) => sizes[i] > 1),
    figures: plan.figures.map((name) => ({ name, kind: kindOf(name), share: isShare(name) })),
    runs: records.map((record) => ({
      point: record.point,
      configuration: record.configuration,
      parameters: named(record),
      seed: record.seed,
      error: record.error?.message ?? null,
      verdict: record.verdict ?? '',
      binds: record.binds ?? '',
      figures: plan.figures.map((name) => record.figures?.[name] ?? null),
    })),
    configurations: configurations.map(
      (one): SweepConfiguration => ({
        index: one.index,
        parameters: named(one),
        runs: one.runs.length,
        failed: one.failed,
        error: one.runs.find(({ error }) => error !== undefined)?.error?.message ?? null,
        binds: one.binds,
        figures: plan.figures.map((name) => one.figures.get(name) ?? null),
        front: front.has(one.index),
        cost: finite(answers.get(one.index)?.cost),
        meets: asked ? (answers.get(one.index)?.meets ?? false) : null,
      }),
    ),
    goals: plan.pareto,
    needs: plan.needs.map(({ text }) => text),
    cost: plan.cost?.text ?? null,
    cheapest: asked ? (best?.configurations.map(({ index }) => index) ?? []) : null,
    effects: effectsOf(plan, configurations, plan.pareto[0]?.figure ?? USUAL_FIGURE),
  };
}

const finite = (value: number | undefined): number | null =>
  value === undefined || !Number.isFinite(value) ? null : value;

function effectsOf(plan: Plan, configurations: readonly Configuration[], figure: string): Effect[] {
  const axes = [
    ...(['package', 'trace'] as const).map((name) => ({
      name,
      labels: plan[`${name}s`],
      numbers: plan[`${name}s`].map(() => null),
    })),
    ...plan.axes.map(({ name, values, numeric }) => ({
      name,
      labels: values.map(({ label }) => label),
      numbers: values.map(({ value }) => (numeric && typeof value !== 'string' ? value.value : null)),
    })),
  ];
  return axes
    .map(({ name, labels, numbers }) => effectOf(name, labels, numbers, configurations, figure))
    .filter((effect) => effect !== null)
    .sort((a, b) => b.swing - a.swing);
}
