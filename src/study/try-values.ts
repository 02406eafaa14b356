/** Looks for slips in a plan before hours are spent on it. */
import { InputError } from '../errors.js';
import type { Plan } from './plan.js';
import type { Point } from './points.js';

const TRIES = 12; // points tried for one value: it may need the right company

/**
 * Every value of every axis must be taken by the package of at least one of the points that have it; one that never is, is a slip,
 * and is thrown as InputError at its place in the plan. A point that fails while its values work elsewhere is for the sweep to
 * record. `load` loads a point's package and throws what is wrong with it.
 */
export function tryValues(plan: Plan, points: readonly Point[], load: (point: Point) => void): void {
  const tried = new Map<string, InputError | null>(); // package and overrides -> what is wrong
  const problemOf = (point: Point): InputError | null => {
    const key = JSON.stringify([point.package, point.overrides]);
    const known = tried.get(key);
    if (known !== undefined) return known;
    let problem: InputError | null = null;
    try {
      load(point);
    } catch (error) {
      if (!(error instanceof InputError)) throw error;
      problem = error;
    }
    tried.set(key, problem);
    return problem;
  };
  for (const [a, axis] of plan.axes.entries()) {
    for (const value of axis.values) {
      const having = points.filter((point) => point.values[a] === value && point.seed === plan.seeds[0]);
      const step = Math.max(1, Math.floor(having.length / TRIES));
      let problem: InputError | null = null;
      for (let i = 0; i < having.length; i += step) {
        problem = problemOf(having[i]);
        if (problem === null) break;
      }
      if (problem === null) continue;
      const { where, found, expected, hint } = problem;
      const inside = where.path === undefined ? '' : `${where.path}: `;
      const place = /^--set /.test(where.file) ? `${where.file.slice('--set '.length)}: ` : '';
      throw new InputError({
        where: value.where,
        found: `a value no point's package takes (${place}${inside}found ${found})`,
        expected,
        hint,
      });
    }
  }
  // without axes there is still the package itself
  if (plan.axes.length === 0) for (const point of points) load(point);
}
