/**
 * analysis: what a run means.
 *
 * In: a Recording, the sample blocks of the run (through the collector Delays), the package and the trace. Out: a Result, the
 * versioned document every reporter and script reads.
 * Its one decision: every figure is derived once, here, from whole counts, and reporters only print; two ways to the same quantity
 * are compared (checks.ts) before anyone sees either.
 * Not modelled: energy, and bounds of a trace that has not been run.
 */
export { type Bounds, boundsOf } from './bounds.js';
export { Delays } from './delays.js';
export { Histogram } from './histogram.js';
export { type Loss, type LossName, type Standing, standings } from './losses.js';
export { LINE, type ProfileResult, profile } from './profile/index.js';
export { buildResult, type Origin } from './result.js';
export * from './result-schema.js';
