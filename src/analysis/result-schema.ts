import { z } from 'zod';
import type { Package } from '../config/package.js';
import { STACK_CLASSES, STAGES } from '../engine/recording.js';

/**
 * The result document: one definition gives its TypeScript type, its validation and its published JSON Schema. Names end in their
 * unit (`_ps`, `_bytes`, `_bytes_per_s`, `_ck`); ratios and utilizations are 0 … 1. It holds nothing of the clock on the wall.
 * A change that breaks a reader raises RESULT_VERSION; adding a key does not.
 */
export const RESULT_FORMAT = 'penstock-result';
export const RESULT_VERSION = 1;

const count = z.number().min(0);
const ps = z.number().min(0).describe('picoseconds of simulated time');
const bytes = z.number().min(0).describe('bytes');
const rate = z.number().min(0).describe('bytes per second of simulated time');
const ratio = z.number().min(0);
const known = <K extends string, V extends z.ZodType>(names: readonly K[], value: V) =>
  z.strictObject(Object.fromEntries(names.map((name) => [name, value])) as Record<K, V>);

const distribution = z
  .strictObject({ count, mean_ps: ps, p50_ps: ps, p90_ps: ps, p99_ps: ps, p999_ps: ps, max_ps: ps })
  .describe('percentiles are at most 0.79 % above the exact ones; count, mean and maximum are exact');

const occupancy = z.strictObject({
  mean_entries: z.number().min(0).describe('time-weighted, per pseudo-channel'),
  max_entries: z.number().min(0).describe('deepest of any pseudo-channel'),
});
const queues = z.strictObject({ read: occupancy, write: occupancy });

const traffic = {
  achieved_bytes_per_s: rate,
  read_bytes_per_s: rate,
  write_bytes_per_s: rate,
};

const stack = known([...STACK_CLASSES, 'total'], count);

const bandwidth = z.strictObject({
  achieved_bytes_per_s: rate.describe('moved bytes (whole atoms over the DRAM data buses) over the makespan'),
  useful_bytes_per_s: rate.describe('bytes asked for and answered over the makespan'),
  read_bytes_per_s: rate,
  write_bytes_per_s: rate,
  peak_bytes_per_s: rate.describe('all data buses busy all the time'),
  refresh_derated_bytes_per_s: rate.describe('peak less all-bank refresh, tRFCab of every tREFI'),
  link_ceiling_bytes_per_s: rate.describe(
    "what the links can carry of this run's mix of reads and writes, in longest requests",
  ),
  bound_bytes_per_s: rate.describe('the lesser of the refresh-derated peak and the link ceiling'),
  moved_bytes: bytes,
  useful_bytes: bytes,
  stacks: z.array(z.strictObject({ stack: count, ...traffic, bandwidth_stack: stack })),
  channels: z.array(z.strictObject({ stack: count, channel: count, ...traffic })),
  pseudo_channels: z.array(
    z.strictObject({
      stack: count,
      channel: count,
      pseudo_channel: count,
      ...traffic,
      row_hits: count,
      row_misses: count,
      row_conflicts: count,
      activates: count,
      refreshes: count,
      read_queue_mean_entries: z.number().min(0),
      write_queue_mean_entries: z.number().min(0),
    }),
  ),
});

const kernel = z.strictObject({
  name: z.string(),
  launches: count,
  dies: z.array(z.string()).describe('compute dies it runs on'),
  requests: count,
  start_ps: ps.nullable().describe('first issue; null when it never began'),
  end_ps: ps.nullable(),
  duration_ps: ps,
  format: z.string().describe("number format; '' when the trace names none"),
  flops: count,
  read_bytes: bytes.describe('useful'),
  write_bytes: bytes.describe('useful'),
  useful_bytes: bytes,
  moved_bytes: bytes.describe('whole atoms over the DRAM data buses'),
  moved_read_bytes: bytes,
  moved_write_bytes: bytes,
  intensity_useful: ratio.nullable().describe('FLOP per useful byte; null without flops or bytes'),
  intensity_moved: ratio.nullable().describe('FLOP per moved byte'),
  bound_by: z.enum(['compute', 'dram', 'link', 'none']).describe('which ceiling the bound is'),
  bound_flops_per_s: z.number().min(0).nullable().describe('roofline bound over moved bytes; null without flops'),
  attained_flops_per_s: z.number().min(0).nullable(),
  bound_bytes_per_s: rate.describe('the bandwidth ceiling of the dies it ran on, for its mix of reads and writes'),
  attained_bytes_per_s: rate,
  roofline_ratio: ratio
    .nullable()
    .describe(
      'attained over bound: flops, or bytes where there are no flops; a short kernel whose refreshes were postponed may pass 1',
    ),
  compute_utilization: ratio.describe('engine compute time over engines of its dies x its duration'),
  mean_read_latency_ps: ps.nullable(),
  bandwidth_stack: stack.describe('ck of all pseudo-channels: bursts of this kernel and the gaps that ended with them'),
  estimate_ps: ps
    .nullable()
    .describe("the trace's own estimate, all launches together; null when it has none or not all are done"),
});

const direction = z.strictObject({ payload_bytes: bytes, flits: count, utilization: ratio });

const result = z.strictObject({
  format: z.literal(RESULT_FORMAT),
  version: z.literal(RESULT_VERSION),
  partial: z.boolean().describe('stopped before the trace ended'),
  verdict: z.strictObject({
    sentence: z.string(),
    binds: z.string().describe("what binds: 'dram', 'compute', 'link', a class of the bandwidth stack, or 'nothing'"),
    distance_ratio: ratio.describe(
      'achieved bandwidth over the bound of the stacks in use, or compute utilization where compute binds',
    ),
  }),
  makespan_ps: ps,
  bandwidth,
  bandwidth_stack: stack.describe('ck, summed over all pseudo-channels'),
  stack_timeline: z
    .strictObject({ slice_ps: z.number().min(0), slice_ck: count, classes: known(STACK_CLASSES, z.array(count)) })
    .describe('the bandwidth stack over time, ck of all pseudo-channels; slices like those of timeline'),
  read_latency: distribution,
  latency_stack: known([...STAGES.map((stage) => `${stage}_ps` as const), 'total_ps'], ps).describe(
    'means over all reads',
  ),
  queue_wait: known([...STACK_CLASSES.map((name) => `${name}_ps` as const), 'total_ps'], ps).describe(
    'mean time of a read from arrival in its queue to its last column command, by what it waited for; data: bursts of others',
  ),
  delay: known(STAGES, distribution).describe('of reads'),
  delay_counts: z
    .strictObject({
      from_ps: z.array(z.number().min(0)).describe('lower edges of the buckets, eight to a power of two'),
      read_latency: z.array(count),
      ...known(STAGES, z.array(count)).shape,
    })
    .describe('reads by their delay: how many in each bucket'),
  write_delay: known(STAGES, distribution).describe('of writes, until their acknowledgement'),
  queues: queues.extend({ stacks: z.array(queues.extend({ stack: count })) }),
  compute: z.strictObject({
    utilization: ratio.describe('engine compute time over engines x makespan'),
    dies: z.array(
      z.strictObject({
        name: z.string(),
        utilization: ratio,
        mean_outstanding_requests: z.number().min(0).describe('time-weighted, all engines'),
      }),
    ),
  }),
  kernels: z.array(kernel),
  dram: z.strictObject({
    row_hits: count,
    row_misses: count,
    row_conflicts: count,
    activates: count,
    precharges: count,
    reads: count.describe('RD and RDA commands'),
    writes: count.describe('WR and WRA commands'),
    refreshes: count,
    refreshes_all_bank: count,
    refreshes_per_bank: count,
    forwarded_reads: count.describe('served from the write queue'),
    elapsed_ck: count,
  }),
  links: z.array(z.strictObject({ name: z.string(), die: z.string(), stack: count, down: direction, up: direction })),
  timeline: z
    .strictObject({ slice_ps: z.number().min(0), read_bytes: z.array(bytes), write_bytes: z.array(bytes) })
    .describe('bytes over the DRAM data buses; slice i covers i x slice_ps to (i + 1) x slice_ps'),
  banks: z
    .strictObject({
      per_pseudo_channel: count,
      atoms: z.array(count).describe('column commands'),
      activates: z.array(count),
      row_conflicts: z.array(count),
    })
    .describe(
      'counters of each bank: pseudo-channel after pseudo-channel as in bandwidth.pseudo_channels, in each by stack ID, bank group, bank',
    ),
  checks: z.array(
    z.strictObject({ name: z.string(), ok: z.boolean(), got: z.number(), expected: z.number(), tolerance: z.number() }),
  ),
  provenance: z.strictObject({
    program: z.literal('penstock'),
    version: z.string(),
    package_file: z.string(),
    package_hash: z.string().describe('sha256 of the resolved package'),
    trace_file: z.string(),
    trace_hash: z.string().describe('sha256 of the trace as read'),
    trace_rows: count,
    skipped_rows: count,
    seed: z.string(),
    options: z.strictObject({
      replay: z.enum(['open', 'closed', 'paced']),
      until_ps: ps.nullable(),
      overrides: z.array(z.string()),
    }),
  }),
  package: z.looseObject({ name: z.string(), caution: z.string() }).describe('the package as resolved'),
});

export type Result = Omit<z.infer<typeof result>, 'package'> & { package: Package };
export type KernelResult = z.infer<typeof kernel>;
export type Distribution = z.infer<typeof distribution>;
export type LatencyStack = z.infer<typeof result>['latency_stack'];
export type BandwidthStack = z.infer<typeof result>['bandwidth_stack'];
export type Verdict = z.infer<typeof result>['verdict'];

/** The published JSON Schema (draft 2020-12) of the result document. */
export function resultJsonSchema(): object {
  return { title: 'penstock result', ...z.toJSONSchema(result) };
}

/** What is wrong with a document as a result, one line each; empty when it is one. */
export function resultProblems(document: unknown): string[] {
  const parsed = result.safeParse(document);
  return parsed.success ? [] : parsed.error.issues.map((issue) => `${issue.path.join('.')}: ${issue.message}`);
}
