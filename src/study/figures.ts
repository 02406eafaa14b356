/**
 * Figures of a run by name, as sweeps and gates ask for them: a path into the result document (`bandwidth.achieved_bytes_per_s`,
 * `kernels.transpose.duration_ps`, with kernels, stacks and links by name or number), or a derived one of the list below.
 */
import { type Result, resultJsonSchema } from '../analysis/index.js';
import { capacityBytes } from '../config/index.js';
import { STACK_CLASSES } from '../engine/index.js';
import { nearest } from '../errors.js';
import type { QuantityKind } from '../units.js';

/** Figures that follow from others of the result, or from the package alone. */
const DERIVED: Readonly<Record<string, (result: Result) => number>> = {
  'bandwidth.bound_ratio': ({ bandwidth: b }) =>
    b.bound_bytes_per_s > 0 ? b.achieved_bytes_per_s / b.bound_bytes_per_s : 0,
  'dram.row_hit_ratio': ({ dram }) => {
    const all = dram.row_hits + dram.row_misses + dram.row_conflicts;
    return all > 0 ? dram.row_hits / all : 0;
  },
  ...Object.fromEntries(
    STACK_CLASSES.map((name) => [
      `bandwidth_share.${name}`,
      ({ bandwidth_stack: s }: Result) => (s.total > 0 ? s[name] / s.total : 0),
    ]),
  ),
  'package.capacity_bytes': (result) => capacityBytes(result.package),
  'package.stacks': ({ package: pkg }) => pkg.links.length,
  'package.engines': ({ package: pkg }) => pkg.dies.reduce((sum, die) => sum + die.engines, 0),
};

/** What every sweep keeps of each run. */
const USUAL = [
  'makespan_ps',
  'bandwidth.achieved_bytes_per_s',
  'bandwidth.useful_bytes_per_s',
  'bandwidth.read_bytes_per_s',
  'bandwidth.write_bytes_per_s',
  'bandwidth.peak_bytes_per_s',
  'bandwidth.bound_bytes_per_s',
  'bandwidth.bound_ratio',
  'compute.utilization',
  'read_latency.mean_ps',
  'read_latency.p50_ps',
  'read_latency.p99_ps',
  'read_latency.max_ps',
  'queues.read.mean_entries',
  'queues.write.mean_entries',
  'dram.row_hit_ratio',
  'dram.activates',
  'dram.refreshes',
  'package.capacity_bytes',
  'package.stacks',
  ...STACK_CLASSES.map((name) => `bandwidth_share.${name}`),
];

interface SchemaNode {
  readonly type?: string;
  readonly anyOf?: readonly SchemaNode[];
  readonly properties?: Readonly<Record<string, SchemaNode>>;
  readonly items?: SchemaNode;
}

let schema: SchemaNode | undefined;
const resultSchema = (): SchemaNode => {
  schema ??= resultJsonSchema() as SchemaNode;
  return schema;
};

/** The usual figures with those asked for behind them; figures of a part the result does not have yet are left out. */
export function figureNames(more: readonly string[]): string[] {
  return [...new Set([...USUAL, ...energyFigures(), ...more])];
}

/** Single numbers of the energy section: `energy.pj_per_bit` and its like. */
function energyFigures(): string[] {
  const { energy } = resultSchema().properties ?? {};
  return Object.entries(energy?.properties ?? {})
    .filter(([, { type }]) => type === 'number')
    .map(([name]) => `energy.${name}`);
}

/** What is wrong with a figure's name, with the names that would do; null when it is one. */
export function figureProblem(name: string): string | null {
  if (name in DERIVED) return null;
  let at: SchemaNode | undefined = resultSchema();
  const steps = name.split('.');
  for (const [depth, step] of steps.entries()) {
    if (at.items !== undefined) {
      at = at.items; // by name or number: which there are, only a run knows
      continue;
    }
    const below: SchemaNode | undefined = at.properties?.[step];
    if (below === undefined || !Object.hasOwn(at.properties ?? {}, step)) {
      const head = steps.slice(0, depth).join('.');
      const names = Object.keys(at.properties ?? {}).map((key) => (head === '' ? key : `${head}.${key}`));
      const all = [...names, ...Object.keys(DERIVED), ...USUAL];
      const like = nearest(name, all) ?? nearest(steps.slice(0, depth + 1).join('.'), names);
      return like === undefined ? `a figure of the result document, for example ${USUAL[1]}` : `'${like}'`;
    }
    at = below;
  }
  const type = at.type ?? at.anyOf?.find((option) => option.type !== 'null')?.type;
  if (type === 'number' || type === 'integer') return null;
  const below = Object.keys(at.properties ?? at.items?.properties ?? {});
  if (below.length === 0) return `a figure that is a number, not ${type ?? 'a part'}`;
  return `one number of ${name}: ${below.join(', ')}${at.items === undefined ? '' : `, as in ${name}.0.${below[0]}`}`;
}

/** The value of a figure; null where this run has none (a kernel that never began, a name that is not in its trace). */
export function figureOf(result: Result, name: string): number | null {
  const derived = DERIVED[name];
  if (derived !== undefined) return finite(derived(result));
  let at: unknown = result;
  const steps = name.split('.');
  for (let depth = 0; depth < steps.length; depth++) {
    if (typeof at !== 'object' || at === null) return null;
    if (Array.isArray(at)) {
      const [item, used] = itemOf(at, steps, depth);
      at = item;
      depth += used - 1;
    } else at = Object.hasOwn(at, steps[depth]) ? (at as Record<string, unknown>)[steps[depth]] : undefined;
  }
  return typeof at === 'number' ? finite(at) : null;
}

/** An item by its number, or by its name, which may have points in it. */
function itemOf(items: readonly unknown[], steps: readonly string[], depth: number): [item: unknown, used: number] {
  for (let used = steps.length - depth - 1; used >= 1; used--) {
    const name = steps.slice(depth, depth + used).join('.');
    const item = items.find((candidate) => (candidate as { name?: unknown } | null)?.name === name);
    if (item !== undefined) return [item, used];
  }
  return [/^\d+$/.test(steps[depth]) ? items[Number(steps[depth])] : undefined, 1];
}

const finite = (value: number): number | null => (Number.isFinite(value) ? value : null);

/** What a figure is a quantity of: names end in their unit. */
export function kindOf(name: string): QuantityKind {
  if (/_bytes_per_s$/.test(name)) return 'bandwidth';
  if (/_flops_per_s$/.test(name)) return 'compute rate';
  if (/_ps$/.test(name)) return 'time';
  if (/(^|[._])bytes$/.test(name)) return 'size';
  if (/pj_per_bit$/.test(name)) return 'energy per bit';
  if (/_pj$/.test(name)) return 'energy';
  if (/_w$/.test(name)) return 'power';
  if (/_mm$/.test(name)) return 'length';
  return 'number';
}

/** Whether a figure is a share of one, shown in per cent. */
export function isShare(name: string): boolean {
  return /(^|[._])(ratio|utilization)$|^bandwidth_share\./.test(name);
}

/** Which way is better: bandwidth up, time down. Null where neither is plain from the name. */
export function betterDirection(name: string): 'up' | 'down' | null {
  if (/(achieved|useful|read|write|attained)_(bytes|flops)_per_s$/.test(name)) return 'up';
  if (/(bound_ratio|roofline_ratio|row_hit_ratio|utilization)$/.test(name)) return 'up';
  if (/^bandwidth_share\.(read|write)_data$/.test(name)) return 'up';
  if (/_ps$|pj_per_bit$|_pj$|_w$|_mm$/.test(name)) return 'down';
  return null;
}
