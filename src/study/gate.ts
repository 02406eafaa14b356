/** Is a result as good as the one that was agreed on? Figure by figure, with what moved where it is not. */
import type { Result } from '../analysis/index.js';
import { STACK_CLASSES } from '../engine/index.js';
import type { GateCause, GateComparison, GateRow, GateTable, GateVerdict } from '../report/index.js';
import { differencesOf } from './differences.js';
import { figureOf, isShare, kindOf } from './figures.js';
import type { Tolerance, Tolerances } from './tolerances.js';

export interface GateInput {
  readonly file: string;
  readonly result: Result;
}

export function gate(baseline: GateInput, candidates: readonly GateInput[], tolerances: Tolerances): GateTable {
  const comparisons = candidates.map((candidate) => compare(baseline.result, candidate, tolerances));
  return {
    format: 'penstock-gate',
    version: 1,
    verdict: overall(comparisons.map(({ verdict }) => verdict)),
    baseline: baseline.file,
    comparisons,
  };
}

function compare(baseline: Result, { file, result }: GateInput, tolerances: Tolerances): GateComparison {
  const rows: GateRow[] = [];
  if (baseline.partial !== result.partial) rows.push(partialRow(baseline, result));
  for (const [figure, tolerance] of tolerances.run) {
    rows.push(rowOf(null, figure, figureOf(baseline, figure), figureOf(result, figure), tolerance));
  }
  const causes = [causeOf(null, baseline, result, baseline.makespan_ps, result.makespan_ps)];
  for (const [label, before, after] of pairs(baseline, result)) {
    if (before === undefined || after === undefined) {
      // a kernel that is gone would otherwise pass in silence
      rows.push(presence(label, before === undefined));
      continue;
    }
    const name = baseline.kernels[before].name;
    const own = new Map<string, Tolerance | null>([...tolerances.kernel, ...(tolerances.named.get(name) ?? [])]);
    for (const [figure, tolerance] of own) {
      if (tolerance === null) continue;
      const of = (from: Result, kernel: number): number | null => figureOf(from, `kernels.${kernel}.${figure}`);
      rows.push(rowOf(label, figure, of(baseline, before), of(result, after), tolerance));
    }
    const [one, other] = [baseline.kernels[before], result.kernels[after]];
    causes.push(causeOf(label, baseline, result, one.duration_ps, other.duration_ps, before, after));
  }
  const worse = new Map<string | null, 'better' | 'worse'>();
  for (const { kernel, verdict } of rows) {
    if (verdict === 'worse' || (verdict === 'better' && !worse.has(kernel))) worse.set(kernel, verdict);
  }
  const named = causes.filter((cause) => cause !== null);
  return {
    candidate: file,
    verdict: overall(rows.map(({ verdict }) => verdict)),
    differences: differencesOf(baseline, result),
    rows,
    causes: named.filter(({ kernel }) => worse.has(kernel)),
  };
}

function overall(verdicts: readonly GateVerdict[]): GateTable['verdict'] {
  if (verdicts.some((verdict) => verdict === 'worse' || verdict === 'missing')) return 'worse';
  if (verdicts.includes('better')) return 'better';
  return verdicts.some((verdict) => verdict === 'changed' || verdict === 'new') ? 'changed' : 'same';
}

function rowOf(
  kernel: string | null,
  figure: string,
  baseline: number | null,
  candidate: number | null,
  tolerance: Tolerance,
): GateRow {
  const allowed = baseline === null ? 0 : Math.max(tolerance.absolute, tolerance.relative * Math.abs(baseline));
  return {
    kernel,
    figure,
    kind: kindOf(figure),
    share: isShare(figure),
    verdict: verdictOf(baseline, candidate, allowed, tolerance),
    baseline,
    candidate,
    change: baseline === null || candidate === null || baseline === 0 ? null : candidate / baseline - 1,
    allowed,
  };
}

/** A difference of exactly what is allowed is still the same. */
export function verdictOf(
  baseline: number | null,
  candidate: number | null,
  allowed: number,
  { better }: Pick<Tolerance, 'better'>,
): GateVerdict {
  if (baseline === null) return candidate === null ? 'same' : 'new';
  if (candidate === null) return 'missing';
  const change = candidate - baseline;
  if (Math.abs(change) <= allowed) return 'same';
  if (better === 'none') return 'changed';
  return better !== 'fixed' && change > 0 === (better === 'up') ? 'better' : 'worse';
}

/** A run that was cut short is not to be compared with a whole one. */
function partialRow(baseline: Result, result: Result): GateRow {
  const [before, after] = [baseline.partial, result.partial].map(Number);
  return rowOf(null, 'partial', before, after, { relative: 0, absolute: 0, better: 'fixed' });
}

function presence(kernel: string, isNew: boolean): GateRow {
  const [before, after] = isNew ? [null, 1] : [1, null];
  return rowOf(kernel, 'kernel', before, after, { relative: 0, absolute: 0, better: 'none' });
}

/** Kernels by name, and by turn where several have one name; those of the baseline first, in its order. */
function* pairs(
  baseline: Result,
  result: Result,
): Generator<[label: string, before: number | undefined, after: number | undefined]> {
  const at = places(result);
  for (const [label, before] of places(baseline)) {
    const after = at.get(label);
    yield [label, before, after];
    at.delete(label);
  }
  for (const [label, after] of at) yield [label, undefined, after];
}

function places({ kernels }: Result): Map<string, number> {
  const places = new Map<string, number>();
  for (const [i, { name }] of kernels.entries()) {
    let label = name;
    for (let turn = 2; places.has(label); turn++) label = `${name} (${turn})`;
    places.set(label, i);
  }
  return places;
}

/** The class of the bandwidth stack that moved most in the direction the time did, as mean time of a pseudo-channel. */
function causeOf(
  kernel: string | null,
  baseline: Result,
  result: Result,
  before: number,
  after: number,
  beforeKernel?: number,
  afterKernel?: number,
): GateCause | null {
  const one = stackPs(baseline, beforeKernel);
  const other = stackPs(result, afterKernel);
  if (one === null || other === null || before === after) return null;
  const sign = after > before ? 1 : -1;
  let most: GateCause['class'] = STACK_CLASSES[0];
  let total = 0;
  const moved = (name: GateCause['class']): number => other[name] - one[name];
  for (const name of STACK_CLASSES) {
    total += moved(name);
    if (sign * moved(name) > sign * moved(most)) most = name;
  }
  return {
    kernel,
    verdict: sign > 0 ? 'worse' : 'better',
    class: most,
    moved_ps: Math.round(moved(most)),
    total_ps: Math.round(total),
  };
}

type Stack = Readonly<Record<GateCause['class'], number>>;

/** The stack as mean time of a pseudo-channel, so that packages of other clocks and widths compare. */
function stackPs({ bandwidth, bandwidth_stack, kernels, package: pkg }: Result, kernel?: number): Stack | null {
  const stack = kernel === undefined ? bandwidth_stack : kernels[kernel].bandwidth_stack;
  const each = pkg.memory[0].clockPs / Math.max(1, bandwidth.pseudo_channels.length);
  if (stack.total === 0) return null;
  return Object.fromEntries(STACK_CLASSES.map((name) => [name, stack[name] * each])) as Stack;
}
