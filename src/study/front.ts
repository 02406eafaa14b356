import type { Goal } from './plan.js';
import type { Configuration, Mean } from './summary.js';

/**
 * The Pareto front: configurations that no other of the same trace equals or betters in every goal while bettering it in one. One
 * with a failed run, or without one of the figures, is not on it.
 */
export function frontOf(configurations: readonly Configuration[], goals: readonly Goal[]): Set<number> {
  const front = new Set<number>();
  if (goals.length === 0) return front;
  const scored = configurations
    .filter(({ failed, figures }) => failed === 0 && goals.every(({ figure }) => figures.has(figure)))
    .map((configuration) => ({
      ...configuration,
      // the more, the better
      score: goals.map(({ figure, better }) => {
        const { mean } = configuration.figures.get(figure) as Mean;
        return better === 'up' ? mean : -mean;
      }),
    }));
  const groups = grouped(scored);
  for (const group of groups.values()) {
    // sorted by the first goal, whoever beats a configuration stands before it or ties with it
    const sorted = [...group].sort((a, b) => compare(b.score, a.score) || a.index - b.index);
    const kept: typeof sorted = [];
    for (const one of sorted) {
      if (kept.some((other) => beats(other.score, one.score))) continue;
      kept.push(one);
      front.add(one.index);
    }
  }
  return front;
}

function grouped<T extends { trace: string }>(items: readonly T[]): Map<string, T[]> {
  const groups = new Map<string, T[]>();
  for (const item of items) groups.set(item.trace, [...(groups.get(item.trace) ?? []), item]);
  return groups;
}

function compare(a: readonly number[], b: readonly number[]): number {
  for (const [i, value] of a.entries()) if (value !== b[i]) return value - b[i];
  return 0;
}

function beats(one: readonly number[], other: readonly number[]): boolean {
  return one.every((value, i) => value >= other[i]) && one.some((value, i) => value > other[i]);
}
