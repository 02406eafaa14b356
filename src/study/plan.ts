/** A plan file, understood: what varies, what is run, what is asked of it. */
import { parseTree } from '../config/parse-tree.js';
import { locate, type Path } from '../config/tree.js';
import { keysAt, validateAs } from '../config/validate.js';
import { InputError, type Where } from '../errors.js';
import { parseQuantity, parseTime } from '../units.js';
import { type Expression, oneOf, parseExpression, type Value } from './expression.js';
import { betterDirection, figureNames, figureProblem } from './figures.js';
import { type PlanFile, planFile } from './plan-schema.js';

export interface AxisValue {
  readonly label: string | number | boolean; // as written, or the value's name
  readonly value: Value; // in expressions
  readonly overrides: readonly string[]; // path=value
  readonly where: Where;
}

export interface Axis {
  readonly name: string;
  readonly values: readonly AxisValue[];
  readonly numeric: boolean; // every value is a number or a quantity of one kind
}

export interface Goal {
  readonly figure: string;
  readonly better: 'up' | 'down';
}

/** What is asked of the runs once they are there; it changes no run. */
export interface Questions {
  readonly pareto: readonly Goal[];
  readonly cost: Expression | null;
  readonly needs: readonly Expression[];
}

export interface Plan extends Questions {
  readonly file: string;
  readonly name: string;
  readonly packages: readonly string[]; // as written: beside the plan
  readonly traces: readonly string[];
  readonly overrides: readonly string[]; // of every point
  readonly axes: readonly Axis[];
  readonly conditions: readonly Expression[];
  readonly replay: 'closed' | 'open' | 'paced';
  readonly untilPs: number; // Infinity: to the end of the trace
  readonly seeds: readonly string[];
  readonly figures: readonly string[];
  place(path: Path): Where;
}

const RESERVED = ['package', 'trace', 'seed', 'and', 'or', 'not'];

/** Understands the text of a plan. Throws InputError with file, line and column. */
export function parsePlan(text: string, file: string): Plan {
  const tree = parseTree(text, file, {
    file: 'a sweep plan',
    map: `a sweep plan: a map with the keys ${keysAt([], planFile).slice(0, 4).join(', ')} …`,
  });
  const given = validateAs(tree, planFile);
  const place = (path: Path): Where => locate(tree, path);
  const axes = Object.entries(given.axes).map(([name, axis]) => understoodAxis(name, axis, place));
  const parameters = ['package', 'trace', ...axes.map(({ name }) => name)];
  for (const [i, figure] of given.figures.entries()) checkFigure(figure, place(['figures', i]));
  return {
    file,
    name: given.name ?? (file.split(/[\\/]/).pop() ?? file).replace(/\.ya?ml$/, ''),
    packages: distinct(given.package, 'package', place),
    traces: distinct(given.trace, 'trace', place),
    overrides: overridesOf(given.set),
    axes,
    conditions: listed(given.where).map((condition, i) =>
      parseExpression(condition, oneOf(parameters), place(typeof given.where === 'string' ? ['where'] : ['where', i])),
    ),
    replay: given.replay,
    untilPs: given.until === undefined ? Number.POSITIVE_INFINITY : until(given.until, place(['until'])),
    seeds: seedsOf(given.seeds, place),
    place,
    ...questions(given, axes, place),
    figures: figureNames(askedFigures(given, axes, place)),
  };
}

/** Questions as options of the command line give them; those that are not given stay the plan's. */
export function withQuestions(
  plan: Plan,
  asked: { readonly pareto?: readonly string[]; readonly cost?: string | undefined; readonly need?: readonly string[] },
): Plan {
  const { pareto = [], cost, need = [] } = asked;
  const goals = pareto.map((text) => goal(text, { file: '--pareto' }));
  const asExpression = (text: string, option: string): Expression =>
    parseExpression(text, nameProblem(plan.axes, plan.figures), { file: option });
  return {
    ...plan,
    pareto: goals.length > 0 ? goals : plan.pareto,
    cost: cost === undefined ? plan.cost : asExpression(cost, '--cost'),
    needs: need.length > 0 ? need.map((text) => asExpression(text, '--need')) : plan.needs,
  };
}

/** `figure:up` or `figure:down`; the direction may be left out where it is plain. */
function goal(text: string, where: Where): Goal {
  const [, figure, direction] = /^(.*?)(?::(up|down))?$/.exec(text) ?? [];
  checkFigure(figure, where);
  const better = direction ?? betterDirection(figure);
  if (better !== 'up' && better !== 'down') {
    throw new InputError({ where, found: `'${text}'`, expected: `${figure}:up or ${figure}:down` });
  }
  return { figure, better };
}

function checkFigure(figure: string, where: Where): void {
  const problem = figureProblem(figure);
  if (problem !== null) throw new InputError({ where, found: `'${figure}'`, expected: problem });
}

/** Names in costs and needs are axes or figures; what is kept is known once the plan is read. */
function nameProblem(axes: readonly Axis[], kept: readonly string[] | null): (name: string) => string | null {
  const names = ['package', 'trace', ...axes.map((axis) => axis.name)];
  return (name) => {
    if (names.includes(name) || kept?.includes(name)) return null;
    if (!name.includes('.') && name !== 'makespan_ps') {
      const problem = oneOf(names)(name);
      return problem?.startsWith('one of')
        ? `an axis (${names.join(', ')}) or a figure of the result document`
        : problem;
    }
    const problem = figureProblem(name);
    if (problem !== null || kept === null) return problem;
    return `a figure the sweep keeps; name ${name} under figures in the plan, and run again`;
  };
}

function questions(given: PlanFile, axes: readonly Axis[], place: (path: Path) => Where): Questions {
  const understood = (text: string, where: Where): Expression => parseExpression(text, nameProblem(axes, null), where);
  const pareto = Object.entries(given.pareto ?? {}).map(([figure, better]) => {
    checkFigure(figure, place(['pareto', figure]));
    return { figure, better };
  });
  return {
    pareto,
    cost: given.cost === undefined ? null : understood(given.cost, place(['cost'])),
    needs: listed(given.need).map((text, i) =>
      understood(text, place(typeof given.need === 'string' ? ['need'] : ['need', i])),
    ),
  };
}

/** Figures the plan names anywhere: a question can only be answered from what is kept. */
function askedFigures(given: PlanFile, axes: readonly Axis[], place: (path: Path) => Where): string[] {
  const { pareto, cost, needs } = questions(given, axes, place);
  const named = [...needs, ...(cost === null ? [] : [cost])].flatMap(({ names }) => names);
  return [
    ...given.figures,
    ...pareto.map(({ figure }) => figure),
    ...named.filter((name) => name.includes('.') && figureProblem(name) === null),
  ];
}

function understoodAxis(name: string, axis: PlanFile['axes'][string], place: (path: Path) => Where): Axis {
  const where = place(['axes', name]);
  if (!/^[A-Za-z_][\w-]*$/.test(name) || RESERVED.includes(name)) {
    throw new InputError({
      where,
      found: `an axis called '${name}'`,
      expected: `a name of letters, digits, _ and -, and none of ${RESERVED.join(', ')}`,
    });
  }
  const paths = listed(axis.set);
  const values: AxisValue[] = Array.isArray(axis.values)
    ? axis.values.map((value, i) => ({
        label: value,
        value: typeof value === 'number' ? { value, kind: 'number' } : readValue(String(value)),
        overrides: paths.map((path) => `${path}=${valueText(value)}`),
        where: place(['axes', name, 'values', i]),
      }))
    : Object.entries(axis.values).map(([label, set]) => ({
        label,
        value: readValue(label),
        overrides: overridesOf(set),
        where: place(['axes', name, 'values', label]),
      }));
  if (Array.isArray(axis.values) && paths.length === 0) {
    throw new InputError({
      where,
      found: 'values without a path',
      expected: 'set: the key that takes them, or values with names, each a map of overrides',
    });
  }
  if (!Array.isArray(axis.values) && paths.length > 0) {
    throw new InputError({
      where: place(['axes', name, 'set']),
      found: 'set beside values that have overrides of their own',
      expected: 'one of both',
    });
  }
  if (values.length === 0) throw new InputError({ where, found: 'no values', expected: 'one or more' });
  for (const [i, { label, where: at }] of values.entries()) {
    if (values.findIndex((other) => String(other.label) === String(label)) < i) {
      throw new InputError({ where: at, found: `value '${label}' twice`, expected: 'each value once' });
    }
  }
  const kinds = new Set(values.map(({ value }) => (typeof value === 'string' ? 'text' : value.kind)));
  return { name, values, numeric: kinds.size === 1 && !kinds.has('text') };
}

/** A value as expressions see it: a quantity where it reads as one, else text. */
function readValue(text: string): Value {
  return parseQuantity(text) ?? text;
}

function overridesOf(set: Readonly<Record<string, unknown>>): string[] {
  return Object.entries(set).map(([path, value]) => `${path}=${valueText(value)}`);
}

/** A value as YAML on one line; text that would read as something else is quoted. */
function valueText(value: unknown): string {
  if (typeof value !== 'string') return JSON.stringify(value ?? null);
  const other = !Number.isNaN(Number(value)) || /^(true|false|null|yes|no|on|off|~)$/i.test(value);
  return /^[A-Za-z0-9.][\w ./%+-]*$/.test(value) && !other ? value : JSON.stringify(value);
}

const listed = (words: string | readonly string[] | undefined): readonly string[] =>
  words === undefined ? [] : typeof words === 'string' ? [words] : words;

function distinct(words: string | readonly string[], key: string, place: (path: Path) => Where): readonly string[] {
  const list = listed(words);
  for (const [i, file] of list.entries()) {
    if (list.indexOf(file) < i) {
      throw new InputError({ where: place([key, i]), found: `'${file}' twice`, expected: 'each file once' });
    }
    if (file === '-') {
      const where = place(typeof words === 'string' ? [key] : [key, i]);
      throw new InputError({ where, found: 'standard input', expected: 'a file, which every run can read again' });
    }
  }
  return list;
}

function until(text: string, where: Where): number {
  const ps = parseTime(text, where);
  if (ps > 0) return ps;
  throw new InputError({ where, found: `'${text}'`, expected: 'a time greater than 0, for example 20 us' });
}

function seedsOf(seeds: PlanFile['seeds'], place: (path: Path) => Where): string[] {
  if (typeof seeds === 'number') return Array.from({ length: seeds }, (_, i) => String(i + 1));
  const list = seeds.map(String);
  for (const [i, seed] of list.entries()) {
    if (list.indexOf(seed) < i) {
      throw new InputError({ where: place(['seeds', i]), found: `seed ${seed} twice`, expected: 'each seed once' });
    }
  }
  return list;
}
