import type { Organisation, TimingName } from '../package.js';

/** A value and where it comes from: a standard, a paper, "from memory", or "common practice, no source". */
export interface Sourced<T> {
  readonly value: T;
  readonly source: string;
}

/** What a device brings to a package; a package file may override any of it. Quantities are written as in package files. */
export interface DevicePreset {
  readonly name: string;
  readonly title: string; // for people
  readonly notes: readonly string[]; // what is known and what is representative
  readonly clock: Sourced<string>; // frequency of the DRAM clock (ck)
  readonly organisation: { readonly [K in Exclude<keyof Organisation, 'stacks'>]: Sourced<number> };
  readonly timings: Readonly<Record<TimingName, Sourced<string>>>;
  readonly buses: Sourced<{
    readonly separate: boolean;
    readonly actHalfCk: number;
    readonly preHalfCk: number;
    readonly refHalfCk: number;
    readonly columnHalfCk: number;
  }>;
  readonly activateWindowScope: Sourced<'pseudo_channel' | 'sid'>;
  readonly refreshScope: Sourced<'pseudo_channel' | 'sid'>;
  readonly postpone: Sourced<number>; // refreshes that may be owed
  readonly pullIn: Sourced<number>; // refreshes that may be done ahead
  readonly refpbInActivateWindow: Sourced<boolean>;
}
