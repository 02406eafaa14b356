/** What the sweep commands share. */
import type { PointRecord } from '../study/index.js';
import { BAD_INPUT, CHECKS_FAILED, SYSTEM_FAILED } from './failure.js';

export const PLAN = {
  plan: { type: 'string', demandOption: true, describe: 'sweep plan (YAML)' },
} as const;

export const QUESTIONS = {
  pareto: {
    type: 'string',
    array: true,
    requiresArg: true,
    default: [] as string[],
    defaultDescription: 'as in the plan',
    describe: 'a figure of the Pareto front, figure:up or figure:down; may be given again',
  },
  need: {
    type: 'string',
    array: true,
    requiresArg: true,
    default: [] as string[],
    defaultDescription: 'as in the plan',
    describe: 'what a package must reach; the cheapest that does is named; may be given again',
  },
  cost: { type: 'string', requiresArg: true, describe: 'what a package costs, an expression over axes and figures' },
} as const;

export const OUT = {
  out: {
    type: 'string',
    requiresArg: true,
    defaultDescription: 'the plan’s name with .sweep',
    describe: 'folder of the results; what is done there is not run again',
  },
} as const;

/** What a sweep ends with: points that failed are not passed over in silence, the gravest reason decides. */
export function codeOf(records: readonly PointRecord[]): number {
  const kinds = new Set(records.map(({ error }) => error?.kind));
  if (kinds.has('CheckError') || kinds.has('Error')) return CHECKS_FAILED;
  if (kinds.has('SystemError')) return SYSTEM_FAILED;
  return kinds.has('InputError') ? BAD_INPUT : 0;
}
