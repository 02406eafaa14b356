/**
 * study: many runs, and what they say together.
 *
 * In: jobs (a package, overrides, a trace). Out: the Result of each, and tables and verdicts made of them.
 * Its one decision: a run beside another has a thread of its own with its own engine; which thread, and in which order, never
 * shows in what comes out.
 * Not modelled: nothing is simulated here; a study only asks for runs and compares them.
 */

export { checkQuestions } from './cheapest.js';
export { dealt, dearestFirst, type Shard, traceCost } from './cost.js';
export { type GateInput, gate } from './gate.js';
export { LIMITS, type Limit } from './limits.js';
export { type Plan, parsePlan, withQuestions } from './plan.js';
export { planJsonSchema } from './plan-schema.js';
export { type Point, pointsOf } from './points.js';
export { defaultWorkers, type Job, type Outcome, type PoolOptions, runAll, runPoints } from './pool.js';
export {
  difference,
  headerOf,
  type Lines,
  type PointRecord,
  readLines,
  recordOf,
  type SweepHeader,
  worthAnotherTry,
} from './record.js';
export { parseShard, slurmShard } from './shard-of.js';
export { tableOf } from './table.js';
export { DEFAULT_TOLERANCES, gateJsonSchema, parseTolerances, type Tolerances } from './tolerances.js';
export { tryValues } from './try-values.js';
export { type Lifted, limitsNamed, type Pair, type WhatIf, type WhatIfOptions, whatIf } from './whatif.js';
