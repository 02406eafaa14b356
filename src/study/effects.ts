import type { Configuration, Mean } from './summary.js';

/** What one axis does to one figure. */
export interface Effect {
  readonly axis: string;
  readonly figure: string;
  readonly levels: readonly { readonly label: string; readonly mean: number; readonly count: number }[];
  readonly swing: number; // from the least mean of a level to the greatest, over the mean of all; 0 for a mean of 0
  readonly elasticity: number | null; // per cent of the figure for a per cent of the axis; null unless both are numbers above 0
}

/**
 * The main effect of an axis: the figure's mean at each of its values over all that goes with it. Read together with the others:
 * where conditions leave holes in the grid, axes share their effects.
 */
export function effectOf(
  axis: string,
  labels: readonly (string | number | boolean)[],
  numbers: readonly (number | null)[],
  configurations: readonly Configuration[],
  figure: string,
): Effect | null {
  const at = (one: Configuration): string | number | boolean =>
    axis === 'package' ? one.package : axis === 'trace' ? one.trace : one.parameters[axis];
  const levels = labels.map((label, i) => {
    const values = configurations
      .filter((one) => one.failed === 0 && at(one) === label && one.figures.has(figure))
      .map((one) => (one.figures.get(figure) as Mean).mean);
    const mean = values.reduce((sum, value) => sum + value, 0) / Math.max(1, values.length);
    return { label: String(label), mean, count: values.length, x: numbers[i] };
  });
  const there = levels.filter(({ count }) => count > 0);
  if (there.length < 2) return null;
  const means = there.map(({ mean }) => mean);
  const overall = means.reduce((sum, value) => sum + value, 0) / means.length;
  const swing = overall === 0 ? 0 : (Math.max(...means) - Math.min(...means)) / Math.abs(overall);
  return {
    axis,
    figure,
    levels: there.map(({ label, mean, count }) => ({ label, mean, count })),
    swing,
    elasticity: slope(there.map(({ x, mean }) => [x, mean])),
  };
}

/** Least-squares slope of ln y over ln x. */
function slope(points: readonly (readonly [number | null, number])[]): number | null {
  if (points.some(([x, y]) => x === null || x <= 0 || y <= 0)) return null;
  const logs = points.map(([x, y]) => [Math.log(x as number), Math.log(y)]);
  const mean = (i: number): number => logs.reduce((sum, log) => sum + log[i], 0) / logs.length;
  const [mx, my] = [mean(0), mean(1)];
  const sxx = logs.reduce((sum, [x]) => sum + (x - mx) ** 2, 0);
  return sxx === 0 ? null : logs.reduce((sum, [x, y]) => sum + (x - mx) * (y - my), 0) / sxx;
}
