/** Fronts, prices, means, effects and slices, against hand arithmetic and naive readings on random sweeps. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { candidates } from '../../src/study/cheapest.js';
import { dealt } from '../../src/study/cost.js';
import { effectOf } from '../../src/study/effects.js';
import { frontOf } from '../../src/study/front.js';
import { parsePlan, withQuestions } from '../../src/study/plan.js';
import { parseShard, slurmShard } from '../../src/study/shard-of.js';
import { type Configuration, meanOf } from '../../src/study/summary.js';

const UP = 'bandwidth.achieved_bytes_per_s';
const DOWN = 'makespan_ps';
const GOALS = [
  { figure: UP, better: 'up' },
  { figure: DOWN, better: 'down' },
] as const;

const configuration = (index: number, up: number, down: number, more: Partial<Configuration> = {}): Configuration => ({
  index,
  package: 'a.yaml',
  trace: 't.csv',
  parameters: {},
  runs: [],
  failed: 0,
  figures: new Map([
    [UP, { mean: up, half: null }],
    [DOWN, { mean: down, half: null }],
  ]),
  binds: '',
  ...more,
});

describe('the Pareto front', () => {
  test('by hand: the dominated, the failed and those without a figure are not on it; equal ones are', () => {
    const all = [
      configuration(0, 10, 5),
      configuration(1, 9, 5), // less for the same time
      configuration(2, 8, 4),
      configuration(3, 8, 4), // the same again
      configuration(4, 7, 4), // less again
      configuration(5, 99, 1, { failed: 1 }),
      configuration(6, 99, 1, { figures: new Map() }),
      configuration(7, 1, 9, { trace: 'u.csv' }), // alone on its trace
    ];
    expect([...frontOf(all, GOALS)].sort()).toEqual([0, 2, 3, 7]);
    expect(frontOf(all, []).size).toBe(0);
  });

  test('agrees with a naive reading of its definition', () => {
    const small = fc.integer({ min: 0, max: 6 });
    fc.assert(
      fc.property(fc.array(fc.tuple(small, small, fc.boolean()), { maxLength: 30 }), (pairs) => {
        const all = pairs.map(([up, down, other], i) => configuration(i, up, down, { trace: other ? 'u' : 't' }));
        const naive = all.filter(
          (one) =>
            !all.some((other) => {
              if (other.trace !== one.trace) return false;
              const [u, v] = [pairs[other.index], pairs[one.index]];
              return u[0] >= v[0] && u[1] <= v[1] && (u[0] > v[0] || u[1] < v[1]);
            }),
        );
        expect([...frontOf(all, GOALS)].sort((a, b) => a - b)).toEqual(naive.map(({ index }) => index));
      }),
    );
  });
});

describe('the cheapest package', () => {
  const plan = withQuestions(
    parsePlan(
      'penstock_sweep: 1\npackage: a.yaml\ntrace: [t, u]\naxes: { q: { set: x, values: [1, 2, 3] } }\n',
      'p.yaml',
    ),
    { need: [`${UP} >= 5 B/s`], cost: '10 * q' },
  );
  const at = (q: number, trace: string, up: number, failed = 0) =>
    configuration(q * 10 + (trace === 't' ? 0 : 1), up, 1, { trace, parameters: { q }, failed });

  test('must reach the need on every trace, and not fail on any', () => {
    const found = candidates(plan, [
      at(1, 't', 9),
      at(1, 'u', 4),
      at(2, 't', 5),
      at(2, 'u', 5),
      at(3, 't', 9),
      at(3, 'u', 9),
    ]);
    expect(found.map(({ cost, meets }) => [cost, meets])).toEqual([
      [10, false],
      [20, true], // 5 is enough
      [30, true],
    ]);
    expect(candidates(plan, [at(2, 't', 9), at(2, 'u', 9, 1)])[0].meets).toBe(false);
  });

  test('a figure that is missing meets nothing', () => {
    expect(candidates(plan, [{ ...at(1, 't', 9), figures: new Map() }])[0].meets).toBe(false);
  });
});

test('means of repeats: Student, 95 %', () => {
  // 1, 2, 3: variance 1, t with two degrees of freedom 4.303, over the root of 3
  expect(meanOf([1, 2, 3])).toEqual({ mean: 2, half: expect.closeTo(4.303 / Math.sqrt(3), 9) });
  expect(meanOf([5])).toEqual({ mean: 5, half: null });
  expect(meanOf([4, 4, 4, 4])).toEqual({ mean: 4, half: 0 });
});

test('the effect of an axis: means of its values, their swing, and the slope of the logarithms', () => {
  const all = [1, 2, 4].flatMap((q, i) =>
    [0, 1].map((other) => configuration(2 * i + other, 100 * q ** 0.5, 1, { parameters: { q, other } })),
  );
  const effect = effectOf('q', [1, 2, 4], [1, 2, 4], all, UP);
  expect(effect?.levels.map(({ mean, count }) => [mean, count])).toEqual([
    [100, 2],
    [100 * Math.SQRT2, 2],
    [200, 2],
  ]);
  expect(effect?.swing).toBeCloseTo(100 / ((300 + 100 * Math.SQRT2) / 3), 12);
  expect(effect?.elasticity).toBeCloseTo(0.5, 12);
  expect(effectOf('other', [0, 1], [0, 1], all, UP)).toMatchObject({ swing: 0, elasticity: null });
  expect(effectOf('q', [1], [1], all, UP)).toBeNull();
});

test('slices are disjoint, whole, and never worse than 4/3 of the best possible', () => {
  fc.assert(
    fc.property(
      fc.array(fc.integer({ min: 1, max: 50 }), { minLength: 1, maxLength: 40 }),
      fc.integer({ min: 1, max: 9 }),
      (costs, n) => {
        const slices = dealt(costs, n);
        expect(slices).toHaveLength(n);
        expect(slices.flat().sort((a, b) => a - b)).toEqual([...costs.keys()]);
        const sums = slices.map((slice) => slice.reduce((sum, i) => sum + costs[i], 0));
        const total = costs.reduce((sum, cost) => sum + cost, 0);
        const sorted = [...costs].sort((a, b) => b - a);
        // no split is better than the mean, the dearest, or the two that must share
        const best = Math.max(total / n, sorted[0], n < sorted.length ? sorted[n - 1] + sorted[n] : 0);
        expect(Math.max(...sums)).toBeLessThanOrEqual(best * (4 / 3) + 1e-9);
      },
    ),
  );
});

describe('which slice', () => {
  test('k/n', () => {
    expect(parseShard('3/8')).toEqual({ k: 3, n: 8 });
    for (const text of ['0/8', '9/8', '3', '3/0', 'a/b', '-1/2', '1.5/2'])
      expect(() => parseShard(text)).toThrow(`--shard: found '${text}'; expected k/n with k from 1 to n`);
  });

  const env = (id: number, min: number, max: number, count = max - min + 1) => ({
    SLURM_ARRAY_TASK_ID: String(id),
    SLURM_ARRAY_TASK_COUNT: String(count),
    SLURM_ARRAY_TASK_MIN: String(min),
    SLURM_ARRAY_TASK_MAX: String(max),
  });
  test('of a Slurm array from 0 or 1, without gaps; nothing else can be told', () => {
    expect(slurmShard({})).toBeNull();
    expect(slurmShard(env(0, 0, 3))).toEqual({ k: 1, n: 4 });
    expect(slurmShard(env(4, 1, 4))).toEqual({ k: 4, n: 4 });
    for (const odd of [env(3, 3, 3), env(2, 0, 6, 4), { SLURM_ARRAY_TASK_ID: '2' }])
      expect(() => slurmShard(odd)).toThrow(/SLURM_ARRAY_TASK_ID: found task \d of an array/);
  });
});
