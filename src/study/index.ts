/**
 * study: many runs, and what they say together.
 *
 * In: jobs (a package, overrides, a trace). Out: the Result of each, and tables and verdicts made of them.
 * Its one decision: a run beside another has a thread of its own with its own engine; which thread, and in which order, never
 * shows in what comes out.
 * Not modelled: nothing is simulated here; a study only asks for runs and compares them.
 */
export { defaultWorkers, type Job, type Outcome, type PoolOptions, runAll, runPoints } from './pool.js';
