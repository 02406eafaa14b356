import { z } from 'zod';

/** The plan file as one definition: it validates, types what plan.ts reads, and says what each key is for. */

const words = (text: string) =>
  z
    .union([z.string().min(1), z.array(z.string().min(1)).min(1)], { error: `${text}, or a list of them` })
    .meta({ description: text });

const scalar = z.union([z.string(), z.number(), z.boolean()], { error: 'text, a number, true or false' });
const overrides = z
  .record(z.string().min(1), z.unknown())
  .meta({ description: 'overrides of a package: path: value, as --set takes them' });

const axis = z
  .strictObject({
    set: words('path of a package key, for example memory.0.controller.read_queue').optional(),
    values: z
      .union([z.array(scalar).min(1), z.record(z.string().min(1), overrides)], {
        error: 'a list of values for the path in set, or a map of names, each with overrides of its own',
      })
      .meta({ description: 'values of this axis, in the order they are shown in' }),
  })
  .meta({ description: 'one thing that varies' });

export const planFile = z.strictObject({
  penstock_sweep: z.literal(1).meta({ description: 'version of the plan format' }),
  name: z.string().min(1).optional().meta({ description: 'what the sweep is called; default: the file’s name' }),
  package: words('package file, beside the plan'),
  trace: words('trace file, beside the plan'),
  set: overrides.default({}),
  axes: z.record(z.string(), axis).default({}).meta({ description: 'what varies, by name; all combinations are run' }),
  where: words('a condition that a combination must meet, for example rate >= 12 GT/s or queue <= 32').optional(),
  replay: z.enum(['closed', 'open', 'paced']).default('closed').meta({ description: 'how traces are replayed' }),
  until: z.string().optional().meta({ description: 'simulated time at which each run stops, for example 20 us' }),
  seeds: z
    .union([z.int().min(1).max(1000), z.array(z.union([z.string().min(1), z.int()])).min(1)], {
      error: 'a number of repeats, 1 to 1000, or a list of seeds',
    })
    .default(1)
    .meta({ description: 'repeats with seeds 1, 2, 3 …, or the seeds themselves' }),
  figures: z
    .array(z.string().min(1))
    .default([])
    .meta({ description: 'figures of the result document to keep besides the usual ones' }),
  pareto: z
    .record(z.string(), z.enum(['up', 'down']))
    .optional()
    .meta({ description: 'figures of the Pareto front, each with the direction that is better' }),
  cost: z.string().optional().meta({ description: 'what a package costs: an expression over axes and figures' }),
  need: words('a condition on figures, for example bandwidth.achieved_bytes_per_s >= 3 TB/s').optional(),
});

export type PlanFile = z.infer<typeof planFile>;

/** JSON Schema of the plan file, for editors. */
export function planJsonSchema(): object {
  return { title: 'penstock sweep plan', ...z.toJSONSchema(planFile, { io: 'input' }) };
}
