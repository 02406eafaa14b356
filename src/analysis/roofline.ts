import type { Package } from '../config/package.js';
import type { KernelRecord } from '../engine/recording.js';
import type { Trace } from '../trace/batch.js';
import { allDies, type Bounds, boundsOf } from './bounds.js';
import type { KernelDelays } from './delays.js';
import type { BandwidthStack, KernelResult } from './result-schema.js';

/** What the trace says of a kernel beyond the engine's counters. */
export interface KernelFacts {
  readonly format: string; // '' when the trace names none
  readonly dies: readonly number[]; // compute dies it runs on
  readonly estimatePs: number; // of all its launches; 0: none
  readonly launches: number; // asked for; 0: not known
}

/** Facts of the kernel with index `k`; rows of an access trace carry no format and may run anywhere. */
export function kernelFacts(pkg: Package, trace: Trace, k: number): KernelFacts {
  if (trace.kind === 'access') return { format: '', dies: allDies(pkg), estimatePs: 0, launches: 0 };
  const { format, die, estimatePs, repeat } = trace.kernels[k];
  return { format, dies: die < 0 ? allDies(pkg) : [die], estimatePs: estimatePs * repeat, launches: repeat };
}

/**
 * FLOP/s of some dies together for a number format. Work without a format runs at each die's highest peak, as the engine has it.
 */
export function peakFlops(pkg: Package, dies: readonly number[], format: string): number {
  let sum = 0;
  for (const die of dies) {
    const { peakFlops: peaks } = pkg.dies[die];
    sum += format === '' ? Math.max(0, ...Object.values(peaks)) : (peaks[format] ?? 0);
  }
  return sum;
}

/** One kernel against its roofline. */
export interface Roofline {
  readonly intensityUseful: number | null; // FLOP per byte
  readonly intensityMoved: number | null;
  readonly limit: 'compute' | 'dram' | 'link' | 'none';
  readonly boundFlopsPerS: number | null;
  readonly attainedFlopsPerS: number | null;
  readonly attainedBytesPerS: number;
  readonly ratio: number | null; // attained over bound; null when nothing was done
}

/**
 * The roofline (Williams, Waterman and Patterson, 2009): bound = min(peak FLOP/s, intensity x bandwidth ceiling), the intensity
 * taken over moved bytes; a kernel without flops is set against the bandwidth ceiling itself.
 */
export function roofline(
  work: { flops: number; usefulBytes: number; movedBytes: number; durationPs: number },
  peak: number,
  bounds: Bounds,
): Roofline {
  const { flops, usefulBytes, movedBytes, durationPs } = work;
  const seconds = durationPs / 1e12;
  const attainedBytesPerS = seconds > 0 ? movedBytes / seconds : 0;
  if (flops === 0) {
    const idle = movedBytes === 0 || seconds === 0;
    return {
      intensityUseful: null,
      intensityMoved: null,
      limit: idle ? 'none' : bounds.limit,
      boundFlopsPerS: null,
      attainedFlopsPerS: null,
      attainedBytesPerS,
      ratio: idle ? null : attainedBytesPerS / bounds.bound,
    };
  }
  const intensityMoved = movedBytes > 0 ? flops / movedBytes : null;
  const slope = intensityMoved === null ? Number.POSITIVE_INFINITY : intensityMoved * bounds.bound;
  const boundFlopsPerS = Math.min(peak, slope);
  const attainedFlopsPerS = seconds > 0 ? flops / seconds : 0;
  return {
    intensityUseful: usefulBytes > 0 ? flops / usefulBytes : null,
    intensityMoved,
    limit: peak <= slope ? 'compute' : bounds.limit,
    boundFlopsPerS,
    attainedFlopsPerS,
    attainedBytesPerS,
    ratio: boundFlopsPerS > 0 && seconds > 0 ? attainedFlopsPerS / boundFlopsPerS : null,
  };
}

/** A kernel's entry of the result. */
export function kernelResult(
  pkg: Package,
  record: KernelRecord,
  facts: KernelFacts,
  delays: KernelDelays | undefined,
  stack: BandwidthStack,
): KernelResult {
  const began = record.startPs >= 0;
  const durationPs = began ? Math.max(0, record.endPs - record.startPs) : 0;
  const usefulBytes = record.readBytes + record.writeBytes;
  const movedBytes = record.movedReadBytes + record.movedWriteBytes;
  const bounds = boundsOf(pkg, facts.dies, record.movedReadBytes, record.movedWriteBytes);
  const peak = peakFlops(pkg, facts.dies, facts.format);
  const line = roofline({ flops: record.flops, usefulBytes, movedBytes, durationPs }, peak, bounds);
  const engines = facts.dies.reduce((sum, die) => sum + pkg.dies[die].engines, 0);
  return {
    name: record.name,
    launches: record.launches,
    dies: facts.dies.map((die) => pkg.dies[die].name),
    requests: record.requests,
    start_ps: began ? record.startPs : null,
    end_ps: began ? record.endPs : null,
    duration_ps: durationPs,
    format: facts.format,
    flops: record.flops,
    read_bytes: record.readBytes,
    write_bytes: record.writeBytes,
    useful_bytes: usefulBytes,
    moved_bytes: movedBytes,
    moved_read_bytes: record.movedReadBytes,
    moved_write_bytes: record.movedWriteBytes,
    intensity_useful: line.intensityUseful,
    intensity_moved: line.intensityMoved,
    bound_by: line.limit,
    bound_flops_per_s: line.boundFlopsPerS,
    attained_flops_per_s: line.attainedFlopsPerS,
    bound_bytes_per_s: bounds.bound,
    attained_bytes_per_s: line.attainedBytesPerS,
    roofline_ratio: line.ratio,
    compute_utilization: durationPs > 0 ? record.computePs / (engines * durationPs) : 0,
    mean_read_latency_ps: delays !== undefined && delays.reads > 0 ? delays.readLatencyPs / delays.reads : null,
    bandwidth_stack: stack,
    estimate_ps: facts.estimatePs > 0 && record.launches === facts.launches ? facts.estimatePs : null,
  };
}
