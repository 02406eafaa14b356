/** A comparison of results with a baseline as its reports see it. */
import type { StackClass } from '../engine/recording.js';
import type { QuantityKind } from '../units.js';

/**
 * better, worse: beyond the tolerance in a figure that has a better direction; changed: beyond it in one that has none; missing: in
 * the baseline but not here, which fails as worse does; new: here but not in the baseline.
 */
export type GateVerdict = 'better' | 'same' | 'worse' | 'changed' | 'missing' | 'new';

export interface GateRow {
  readonly kernel: string | null; // null: of the whole run
  readonly figure: string;
  readonly kind: QuantityKind;
  readonly share: boolean; // shown in per cent
  readonly verdict: GateVerdict;
  readonly baseline: number | null;
  readonly candidate: number | null;
  readonly change: number | null; // candidate over baseline less one; null where the baseline is 0 or a side is missing
  readonly allowed: number; // how far apart they may be, in the figure's unit
}

/** Where the time of a kernel, or of the run, went more or less than before. */
export interface GateCause {
  readonly kernel: string | null;
  readonly verdict: 'better' | 'worse';
  readonly class: StackClass; // of the bandwidth stack, the one that moved most in the verdict's direction
  readonly moved_ps: number; // how far, mean of the pseudo-channels; negative: less than before
  readonly total_ps: number; // how far all classes together
}

export interface GateComparison {
  readonly candidate: string; // file
  readonly verdict: 'better' | 'same' | 'worse' | 'changed';
  /** What is not the same about the runs themselves: package, trace, options, version. */
  readonly differences: readonly string[];
  readonly rows: readonly GateRow[];
  readonly causes: readonly GateCause[];
}

export interface GateTable {
  readonly format: 'penstock-gate';
  readonly version: 1;
  readonly verdict: 'better' | 'same' | 'worse' | 'changed'; // the worst of all candidates
  readonly baseline: string; // file
  readonly comparisons: readonly GateComparison[];
}

/** Does this verdict fail the gate? */
export function fails(verdict: GateVerdict): boolean {
  return verdict === 'worse' || verdict === 'missing';
}
