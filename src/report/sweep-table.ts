/** A sweep as its reports see it: runs, the configurations they make, and the answers to what was asked. */
import type { QuantityKind } from '../units.js';

type Parameter = string | number | boolean;

export interface SweepFigure {
  readonly name: string;
  readonly kind: QuantityKind;
  readonly share: boolean; // shown in per cent
}

export interface SweepRun {
  readonly point: number;
  readonly configuration: number;
  readonly parameters: readonly Parameter[]; // by SweepTable.parameters
  readonly seed: string;
  readonly error: string | null; // why it failed; null when it is done
  readonly verdict: string;
  readonly binds: string;
  readonly figures: readonly (number | null)[]; // by SweepTable.figures
}

export interface SweepConfiguration {
  readonly index: number;
  readonly parameters: readonly Parameter[];
  readonly runs: number;
  readonly failed: number;
  readonly error: string | null; // of its first run that failed
  readonly binds: string;
  readonly figures: readonly ({ readonly mean: number; readonly half: number | null } | null)[];
  readonly front: boolean;
  readonly cost: number | null;
  readonly meets: boolean | null; // null when nothing was asked
}

export interface SweepEffect {
  readonly axis: string;
  readonly figure: string;
  readonly levels: readonly { readonly label: string; readonly mean: number; readonly count: number }[];
  readonly swing: number;
  readonly elasticity: number | null;
}

export interface SweepTable {
  readonly name: string;
  readonly program: string; // version
  readonly points: number; // of the whole plan
  readonly parameters: readonly string[]; // package, trace, then the axes
  readonly varying: readonly string[]; // those with more than one value
  readonly figures: readonly SweepFigure[];
  readonly runs: readonly SweepRun[];
  readonly configurations: readonly SweepConfiguration[];
  readonly goals: readonly { readonly figure: string; readonly better: 'up' | 'down' }[];
  readonly needs: readonly string[];
  readonly cost: string | null;
  /** Configurations of the cheapest package that meets every need, one a trace; empty when none does; null when nothing was asked. */
  readonly cheapest: readonly number[] | null;
  readonly effects: readonly SweepEffect[]; // strongest first, on the first goal or the achieved bandwidth
}
