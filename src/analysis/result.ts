import type { Package } from '../config/package.js';
import { type Recording, type RunOptions, STAGES, type StageName } from '../engine/recording.js';
import type { Trace, TraceFacts } from '../trace/batch.js';
import { allDies, boundsOf } from './bounds.js';
import { checksOf } from './checks.js';
import type { Delays } from './delays.js';
import { coarseEdge, type Histogram } from './histogram.js';
import { bandwidthByPlace, queueOccupancy } from './places.js';
import { type Distribution, type LatencyStack, RESULT_FORMAT, RESULT_VERSION, type Result } from './result-schema.js';
import { kernelFacts, kernelResult } from './roofline.js';
import { queueWait, stackOfRows, stackTimeline } from './stacks.js';
import { standingOf } from './standing.js';
import { sum } from './sums.js';
import { verdict } from './verdict.js';

/** Where a result comes from, beyond the package and the trace. */
export interface Origin {
  readonly version: string; // of the program
  readonly options: Pick<RunOptions, 'replay' | 'seed' | 'untilPs'>;
  readonly overrides: readonly string[]; // `path=value`, as given
}

/**
 * Everything a run says, in one document with a stable order of keys and no clock on the wall. The trace must have been run to
 * its end, or as far as the recording goes.
 */
export function buildResult(pkg: Package, trace: Trace, origin: Origin, recording: Recording, delays: Delays): Result {
  const { makespanPs, dram, kernels, links } = recording;
  const seconds = makespanPs / 1e12;
  const rate = (bytes: number): number => (seconds > 0 ? bytes / seconds : 0);
  const busy = (ps: number): number => (makespanPs > 0 ? ps / makespanPs : 0);

  const movedReads = sum(kernels.map((kernel) => kernel.movedReadBytes));
  const movedWrites = sum(kernels.map((kernel) => kernel.movedWriteBytes));
  const useful = sum(kernels.map((kernel) => kernel.readBytes + kernel.writeBytes));
  const bounds = boundsOf(pkg, allDies(pkg), movedReads, movedWrites);
  const { bandwidthStack, kernelStack } = recording;
  const compute = computeOf(pkg, recording);
  const [refreshesAll, refreshesBank] = [sum(dram.refreshesAll), sum(dram.refreshesBank)];

  return {
    format: RESULT_FORMAT,
    version: RESULT_VERSION,
    partial: recording.partial,
    verdict: verdict(standingOf(pkg, recording)),
    makespan_ps: makespanPs,
    bandwidth: {
      achieved_bytes_per_s: rate(movedReads + movedWrites),
      useful_bytes_per_s: rate(useful),
      read_bytes_per_s: rate(movedReads),
      write_bytes_per_s: rate(movedWrites),
      peak_bytes_per_s: bounds.peak,
      refresh_derated_bytes_per_s: bounds.refreshDerated,
      link_ceiling_bytes_per_s: bounds.link,
      bound_bytes_per_s: bounds.bound,
      moved_bytes: movedReads + movedWrites,
      useful_bytes: useful,
      ...bandwidthByPlace(pkg, recording),
    },
    bandwidth_stack: stackOfRows(bandwidthStack, 0, dram.reads.length),
    stack_timeline: stackTimeline(recording),
    read_latency: distribution(delays.readLatency),
    latency_stack: latencyStack(delays),
    queue_wait: queueWait(recording, pkg.memory[0].clockPs, delays.readLatency.count),
    delay: byStage(delays.reads),
    delay_counts: delayCounts(delays),
    write_delay: byStage(delays.writes),
    queues: queueOccupancy(pkg, recording),
    compute,
    kernels: kernels.map((kernel, k) => {
      const stack = stackOfRows(kernelStack, k, k + 1);
      return kernelResult(pkg, kernel, kernelFacts(pkg, trace, k), delays.kernels[k], stack);
    }),
    dram: {
      row_hits: sum(dram.rowHits),
      row_misses: sum(dram.rowMisses),
      row_conflicts: sum(dram.rowConflicts),
      activates: sum(dram.activates),
      precharges: sum(dram.precharges),
      reads: sum(dram.reads),
      writes: sum(dram.writes),
      refreshes: refreshesAll + refreshesBank,
      refreshes_all_bank: refreshesAll,
      refreshes_per_bank: refreshesBank,
      forwarded_reads: sum(dram.forwarded),
      elapsed_ck: recording.elapsedCk,
    },
    links: links.map((link, s) => {
      const { name, die, stack: number, flitPs } = pkg.links[s];
      return {
        name,
        die: pkg.dies[die].name,
        stack: number,
        down: {
          payload_bytes: link.payloadBytesDown,
          flits: link.flitsDown,
          utilization: busy(link.flitsDown * flitPs),
        },
        up: { payload_bytes: link.payloadBytesUp, flits: link.flitsUp, utilization: busy(link.flitsUp * flitPs) },
      };
    }),
    timeline: {
      slice_ps: recording.timeline.slicePs,
      read_bytes: [...recording.timeline.readBytes],
      write_bytes: [...recording.timeline.writeBytes],
    },
    banks: {
      per_pseudo_channel: recording.banks.count,
      atoms: [...recording.banks.atoms],
      activates: [...recording.banks.activates],
      row_conflicts: [...recording.banks.conflicts],
    },
    checks: checksOf(pkg, recording, delays),
    provenance: provenance(pkg, trace, origin),
    package: pkg,
  };
}

function provenance(pkg: Package, trace: Trace, { version, options, overrides }: Origin): Result['provenance'] {
  const facts: TraceFacts = trace.kind === 'kernel' ? trace.facts : trace.facts();
  return {
    program: 'penstock',
    version,
    package_file: pkg.file,
    package_hash: pkg.hash,
    trace_file: trace.file,
    trace_hash: facts.hash,
    trace_rows: facts.rows,
    skipped_rows: facts.skippedRows,
    seed: options.seed,
    options: {
      replay: options.replay,
      until_ps: Number.isFinite(options.untilPs) ? options.untilPs : null,
      overrides: [...overrides],
    },
  };
}

/** Compute utilization and outstanding requests: engines of all dies stand in die order in the recording. */
function computeOf(pkg: Package, { engineComputePs, engineWindowPs, makespanPs }: Recording): Result['compute'] {
  const part = (values: Float64Array, from: number, to: number): number => sum(values.subarray(from, to));
  const share = (ps: number, of: number): number => (of > 0 ? ps / of : 0);
  let from = 0;
  const dies = pkg.dies.map(({ name, engines }) => {
    const to = from + engines;
    const die = {
      name,
      utilization: share(part(engineComputePs, from, to), engines * makespanPs),
      mean_outstanding_requests: share(part(engineWindowPs, from, to), makespanPs),
    };
    from = to;
    return die;
  });
  return { utilization: share(sum(engineComputePs), from * makespanPs), dies };
}

function distribution(histogram: Histogram): Distribution {
  return {
    count: histogram.count,
    mean_ps: histogram.mean,
    p50_ps: histogram.percentile(0.5),
    p90_ps: histogram.percentile(0.9),
    p99_ps: histogram.percentile(0.99),
    p999_ps: histogram.percentile(0.999),
    max_ps: histogram.count > 0 ? histogram.max : 0,
  };
}

function byStage(histograms: readonly Histogram[]): Result['delay'] {
  return Object.fromEntries(STAGES.map((stage, i) => [stage, distribution(histograms[i])])) as Result['delay'];
}

function latencyStack(delays: Delays): LatencyStack {
  const parts = STAGES.map((stage, i) => [`${stage}_ps`, delays.reads[i].mean] as const);
  return { ...Object.fromEntries(parts), total_ps: delays.readLatency.mean } as LatencyStack;
}

/** Reads by delay, in buckets that all columns share; they begin at the first that any column has a count in. */
function delayCounts({ readLatency, reads }: Delays): Result['delay_counts'] {
  const columns = [readLatency, ...reads].map((histogram) => histogram.coarse());
  const length = Math.max(...columns.map((column) => column.length));
  const padded = columns.map((column) => Array.from({ length }, (_, i) => column[i] ?? 0));
  return {
    from_ps: Array.from({ length }, (_, i) => coarseEdge(i)),
    read_latency: padded[0],
    ...(Object.fromEntries(STAGES.map((stage, i) => [stage, padded[i + 1]])) as Record<StageName, number[]>),
  };
}
