/** What is in an access trace, without running it: one pass over its batches in fixed memory. */
import type { Package } from '../../config/index.js';
import { type AccessBatch, type AccessTrace, READ } from '../../trace/batch.js';
import { FOOTPRINT_ERROR, Footprint } from './footprint.js';
import { Frequent } from './frequent.js';
import { DISTANCE_BUCKETS, ReuseDistance } from './reuse.js';
import { Spread, type SpreadResult } from './spread.js';

export const LINE = 64; // bytes of a line, in which footprint and reuse are counted
const ADDRESS_BITS = 52;
const SLICES = 64; // of time

export interface ProfileResult {
  readonly format: 'penstock-profile';
  readonly version: 1;
  readonly trace_file: string;
  readonly rows: number;
  readonly skipped_rows: number;
  readonly reads: number;
  readonly writes: number;
  readonly bytes: number;
  readonly read_bytes: number;
  readonly span_ps: number | null; // from the first recorded time to the last; null without times
  /** Bytes in the busiest of 64 equal parts of the span over the mean of all; null without times. */
  readonly burstiness: number | null;
  readonly footprint: {
    readonly line_bytes: number;
    readonly lines: number;
    readonly bytes: number;
    readonly exact: boolean;
    readonly error: number;
  };
  readonly sizes: readonly { readonly bytes: number; readonly share: number }[]; // most frequent first
  readonly sequential_share: number; // rows that begin where the row before ended
  readonly strides: readonly { readonly bytes: number; readonly share: number }[]; // from row to row, most frequent first
  readonly reuse: {
    readonly cold_share: number;
    readonly samples: number;
    readonly buckets: readonly { readonly lines: number; readonly share: number }[];
  };
  /** By address bit from 0: share of rows in which it is 1, and in which it is not what it was in the row before. */
  readonly bits: readonly { readonly bit: number; readonly ones: number; readonly toggles: number }[];
  readonly kernels: readonly {
    readonly name: string;
    readonly rows: number;
    readonly bytes: number;
    readonly flops: number;
    readonly flops_per_byte: number | null;
  }[];
  readonly spread: SpreadResult | null; // null without a package
}

/** Reads a trace to its end. With `pkg` its spread over the package is worked out too. `proceed` false stops early. */
export async function profile(
  trace: AccessTrace,
  pkg: Package | null,
  proceed: (rows: number) => Promise<boolean>,
): Promise<ProfileResult> {
  const profiler = new Profiler(pkg);
  for await (const batch of trace.batches()) {
    profiler.add(batch);
    if (!(await proceed(profiler.rows))) break;
  }
  return profiler.result(trace);
}

class Profiler {
  rows = 0;
  private reads = 0;
  private bytes = 0;
  private readBytes = 0;
  private firstPs = -1;
  private lastPs = 0;
  private readonly slices = new Float64Array(2 * SLICES); // bytes by time; joined two by two as time goes on
  private slicePs = 1;
  private sequential = 0;
  private end = -1; // of the row before
  private previous = 0; // address of the row before
  private readonly footprint = new Footprint();
  private readonly reuse = new ReuseDistance();
  private readonly sizes = new Frequent(256);
  private readonly strides = new Frequent(1024);
  private readonly ones = new Float64Array(ADDRESS_BITS);
  private readonly toggles = new Float64Array(ADDRESS_BITS);
  private kernelRows = new Float64Array(64);
  private kernelBytes = new Float64Array(64);
  private kernelFlops = new Float64Array(64);
  private readonly spread: Spread | null;

  constructor(pkg: Package | null) {
    this.spread = pkg === null ? null : new Spread(pkg);
  }

  add(batch: AccessBatch): void {
    const { count, op, address, bytes, timePs, kernel, flops } = batch;
    for (let i = 0; i < count; i++) {
      const [a, b] = [address[i], bytes[i]];
      if (op[i] === READ) {
        this.reads++;
        this.readBytes += b;
      }
      this.bytes += b;
      if (timePs !== null) this.time(timePs[i], b);
      if (a === this.end) this.sequential++;
      if (this.rows > 0) this.strides.add(a - this.previous);
      this.addressBits(a);
      this.end = a + b;
      this.previous = a;
      this.sizes.add(b);
      for (let line = Math.floor(a / LINE); line * LINE < a + b; line++) {
        this.footprint.add(line);
        this.reuse.add(line);
      }
      this.kernel(kernel[i], b, flops === null ? 0 : flops[i]);
      this.spread?.add(a, b);
      this.rows++;
    }
  }

  private time(ps: number, bytes: number): void {
    if (this.firstPs < 0) this.firstPs = ps;
    this.lastPs = ps;
    const at = ps - this.firstPs;
    while (at >= this.slicePs * this.slices.length) {
      for (let i = 0; i < SLICES; i++) this.slices[i] = this.slices[2 * i] + this.slices[2 * i + 1];
      this.slices.fill(0, SLICES);
      this.slicePs *= 2;
    }
    this.slices[Math.floor(at / this.slicePs)] += bytes;
  }

  private addressBits(address: number): void {
    const [low, high] = [(address % 4294967296) | 0, Math.floor(address / 4294967296)];
    const changedLow = low ^ ((this.previous % 4294967296) | 0);
    const changedHigh = high ^ Math.floor(this.previous / 4294967296);
    const first = this.rows === 0;
    for (let bit = 0; bit < 32; bit++) {
      this.ones[bit] += (low >>> bit) & 1;
      if (!first) this.toggles[bit] += (changedLow >>> bit) & 1;
    }
    if (high === 0 && changedHigh === 0) return;
    for (let bit = 32; bit < ADDRESS_BITS; bit++) {
      this.ones[bit] += (high >>> (bit - 32)) & 1;
      if (!first) this.toggles[bit] += (changedHigh >>> (bit - 32)) & 1;
    }
  }

  private kernel(kernel: number, bytes: number, flops: number): void {
    while (kernel >= this.kernelRows.length) {
      const wider = (old: Float64Array): Float64Array<ArrayBuffer> => {
        const out = new Float64Array(2 * old.length);
        out.set(old);
        return out;
      };
      this.kernelRows = wider(this.kernelRows);
      this.kernelBytes = wider(this.kernelBytes);
      this.kernelFlops = wider(this.kernelFlops);
    }
    this.kernelRows[kernel]++;
    this.kernelBytes[kernel] += bytes;
    this.kernelFlops[kernel] += flops;
  }

  result(trace: AccessTrace): ProfileResult {
    const { rows, footprint, reuse } = this;
    const share = (count: number, of = rows): number => (of > 0 ? count / of : 0);
    const distances = reuse.adjusted();
    const touches = reuse.cold + distances.reduce((a, b) => a + b, 0);
    const used = this.slices.subarray(0, Math.floor((this.lastPs - this.firstPs) / this.slicePs) + 1);
    const highest = Math.max(...this.ones.map((n, bit) => (n > 0 ? bit : 0)));
    return {
      format: 'penstock-profile',
      version: 1,
      trace_file: trace.file,
      rows,
      skipped_rows: trace.facts().skippedRows,
      reads: this.reads,
      writes: rows - this.reads,
      bytes: this.bytes,
      read_bytes: this.readBytes,
      span_ps: this.firstPs < 0 ? null : this.lastPs - this.firstPs,
      burstiness: this.firstPs < 0 ? null : (Math.max(...used) * used.length) / this.bytes,
      footprint: {
        line_bytes: LINE,
        lines: Math.round(footprint.lines),
        bytes: Math.round(footprint.lines) * LINE,
        exact: footprint.exact,
        error: footprint.exact ? 0 : FOOTPRINT_ERROR,
      },
      sizes: this.sizes.top(5).map(({ value, count }) => ({ bytes: value, share: share(count) })),
      sequential_share: share(this.sequential),
      strides: this.strides.top(5).map(({ value, count }) => ({ bytes: value, share: share(count) })),
      reuse: {
        cold_share: share(reuse.cold, touches),
        samples: reuse.samples,
        buckets: Array.from({ length: DISTANCE_BUCKETS }, (_, k) => ({
          lines: 2 ** k,
          share: share(distances[k], touches),
        })).filter((bucket) => bucket.share > 0),
      },
      bits: Array.from({ length: highest + 1 }, (_, bit) => ({
        bit,
        ones: share(this.ones[bit]),
        toggles: share(this.toggles[bit], rows - 1),
      })),
      kernels: trace.kernelNames.map((name, k) => ({
        name,
        rows: this.kernelRows[k] ?? 0,
        bytes: this.kernelBytes[k] ?? 0,
        flops: this.kernelFlops[k] ?? 0,
        flops_per_byte: this.kernelFlops[k] > 0 ? this.kernelFlops[k] / this.kernelBytes[k] : null,
      })),
      spread: this.spread?.result() ?? null,
    };
  }
}
