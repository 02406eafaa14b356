/** How far a figure may move before a gate says so: sane defaults, and what the user's file lays over them. */
import { z } from 'zod';
import { parseTree } from '../config/parse-tree.js';
import { locate, type Path } from '../config/tree.js';
import { keysAt, validateAs } from '../config/validate.js';
import { InputError, type Where } from '../errors.js';
import { parseQuantity } from '../units.js';
import { betterDirection, figureProblem, kindOf } from './figures.js';

/** up, down: more or less is better; none: a change is said and does not fail; fixed: any change is for the worse. */
export type Better = 'up' | 'down' | 'none' | 'fixed';

/** The two sides may differ by the greater of both. */
export interface Tolerance {
  readonly relative: number; // of the baseline, 0.01 is one per cent
  readonly absolute: number; // in the figure's base unit
  readonly better: Better;
}

export interface Tolerances {
  readonly run: ReadonlyMap<string, Tolerance>; // figures of the whole run
  readonly kernel: ReadonlyMap<string, Tolerance>; // figures of every kernel
  readonly named: ReadonlyMap<string, ReadonlyMap<string, Tolerance | null>>; // kernel -> figure; null: ignored
}

const tolerance = z
  .union(
    [
      z.literal('ignore'),
      z.strictObject({
        relative: z.union([z.string(), z.number()]).optional().meta({ description: 'a share, for example 1 %' }),
        absolute: z.union([z.string(), z.number()]).optional().meta({ description: 'a quantity in the figure’s unit' }),
        better: z.enum(['up', 'down', 'none', 'fixed']).optional().meta({
          description: 'up, down; none: a change is said and does not fail; fixed: any change fails',
        }),
      }),
    ],
    { error: "a map of relative, absolute and better, or 'ignore'" },
  )
  .meta({ description: 'how far a figure may move' });
const tolerances = z.record(z.string(), tolerance);
type Given = z.infer<typeof tolerances>;

export const gateFile = z.strictObject({
  penstock_gate: z.literal(1).meta({ description: 'version of the format' }),
  figures: tolerances.default({}).meta({ description: 'figures of the run, by their path in the result document' }),
  kernels: tolerances.default({}).meta({ description: 'figures of every kernel, for example duration_ps' }),
  kernel: z
    .record(z.string(), tolerances)
    .default({})
    .meta({ description: 'kernels that are judged otherwise: name, then figures' }),
});

/** JSON Schema of the tolerance file, for editors. */
export function gateJsonSchema(): object {
  return { title: 'penstock gate tolerances', ...z.toJSONSchema(gateFile, { io: 'input' }) };
}

// Equal inputs give equal results, so nothing here allows for noise: what is allowed is what nobody would act on.
// Percentiles come from buckets up to 0.79 % wide, so less than two of those says nothing.
const RUN: Readonly<Record<string, Tolerance>> = {
  makespan_ps: { relative: 0.005, absolute: 0, better: 'down' },
  'bandwidth.achieved_bytes_per_s': { relative: 0.005, absolute: 0, better: 'up' },
  'bandwidth.moved_bytes': { relative: 0.001, absolute: 0, better: 'down' },
  'bandwidth.useful_bytes': { relative: 0, absolute: 0, better: 'fixed' }, // other work is no comparison
  'compute.utilization': { relative: 0.005, absolute: 0.001, better: 'up' },
  'read_latency.mean_ps': { relative: 0.01, absolute: 1000, better: 'down' },
  'read_latency.p99_ps': { relative: 0.02, absolute: 1000, better: 'down' },
  'dram.row_hit_ratio': { relative: 0.01, absolute: 0.002, better: 'up' },
  'dram.activates': { relative: 0.01, absolute: 0, better: 'none' },
  'dram.refreshes': { relative: 0.01, absolute: 0, better: 'none' },
};
const KERNEL: Readonly<Record<string, Tolerance>> = {
  duration_ps: { relative: 0.005, absolute: 1000, better: 'down' },
  moved_bytes: { relative: 0.001, absolute: 0, better: 'down' },
  useful_bytes: { relative: 0, absolute: 0, better: 'fixed' },
  flops: { relative: 0, absolute: 0, better: 'fixed' },
  mean_read_latency_ps: { relative: 0.02, absolute: 1000, better: 'down' },
};

export const DEFAULT_TOLERANCES: Tolerances = {
  run: new Map(Object.entries(RUN)),
  kernel: new Map(Object.entries(KERNEL)),
  named: new Map(),
};

/** Understands the text of a tolerance file, laid over the defaults. Throws InputError with file, line and column. */
export function parseTolerances(text: string, file: string): Tolerances {
  const tree = parseTree(text, file, {
    file: 'a file of tolerances',
    map: `tolerances: a map with the keys ${keysAt([], gateFile).join(', ')}`,
  });
  const given = validateAs(tree, gateFile);
  const place = (path: Path): Where => locate(tree, path);
  const run = laid(DEFAULT_TOLERANCES.run, given.figures, '', (key) => place(['figures', ...key]));
  const kernel = laid(DEFAULT_TOLERANCES.kernel, given.kernels, 'kernels.0.', (key) => place(['kernels', ...key]));
  const named = Object.entries(given.kernel).map(
    ([name, own]) => [name, laid(kernel, own, 'kernels.0.', (key) => place(['kernel', name, ...key]))] as const,
  );
  return {
    run: kept(run),
    kernel: kept(kernel),
    named: new Map(named.map(([name, all]) => [name, all])),
  };
}

type Laid = Map<string, Tolerance | null>;

function kept(all: Laid): Map<string, Tolerance> {
  return new Map([...all].filter((entry): entry is [string, Tolerance] => entry[1] !== null));
}

function laid(
  base: ReadonlyMap<string, Tolerance | null>,
  given: Given,
  prefix: string,
  place: (key: string[]) => Where,
): Laid {
  const all: Laid = new Map(base);
  for (const [figure, own] of Object.entries(given)) {
    const problem = figureProblem(prefix + figure);
    if (problem !== null) {
      const expected = problem.replaceAll(prefix, '');
      throw new InputError({ where: place([figure]), found: `'${figure}'`, expected });
    }
    if (own === 'ignore') {
      all.set(figure, null);
      continue;
    }
    const below = base.get(figure) ?? undefined;
    const better = own.better ?? below?.better ?? betterDirection(figure);
    if (better === null) {
      throw new InputError({
        where: place([figure]),
        found: 'a figure without a better direction',
        expected: 'better: up, down, none or fixed',
      });
    }
    // a limit that is given stands alone: what the default had beside it would widen it
    const fresh = own.relative !== undefined || own.absolute !== undefined;
    all.set(figure, {
      relative: fresh ? relative(own.relative, place([figure, 'relative'])) : (below?.relative ?? 0),
      absolute: fresh ? absolute(own.absolute, figure, place([figure, 'absolute'])) : (below?.absolute ?? 0),
      better,
    });
  }
  return all;
}

function relative(given: string | number | undefined, where: Where): number {
  if (given === undefined) return 0;
  const match = /^(\d+\.?\d*|\.\d+)\s*%$/.exec(String(given).trim());
  if (match !== null) return Number((Number(match[1]) / 100).toPrecision(15));
  throw new InputError({ where, found: `'${given}'`, expected: 'a share in per cent, for example 1 %' });
}

function absolute(given: string | number | undefined, figure: string, where: Where): number {
  if (given === undefined) return 0;
  const kind = kindOf(figure);
  const quantity = parseQuantity(String(given));
  if (quantity !== null && quantity.kind === kind && quantity.value >= 0) return quantity.value;
  const expected = kind === 'number' ? 'a number, 0 or more' : `a ${kind} with its unit, 0 or more`;
  throw new InputError({ where, found: `'${given}'`, expected });
}
