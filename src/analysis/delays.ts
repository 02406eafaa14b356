import { type Collector, type SampleBlock, STAGES } from '../engine/recording.js';
import { Histogram } from './histogram.js';

const WRITE_OP = 1; // SampleBlock.op; 0 and 2 are reads

/** Latency of the reads of one kernel, and how many bytes were asked for by all its requests. */
export interface KernelDelays {
  reads: number;
  readLatencyPs: number; // summed
  requests: number;
  bytes: number; // useful
}

/**
 * Collects the delays of finished requests: one histogram a stage for reads and one for writes, and one of the read latency, which
 * is the sum of a read's stages. Its cost is one pass over each column.
 */
export class Delays implements Collector {
  /** One a stage of STAGES, in that order. */
  readonly reads: readonly Histogram[] = STAGES.map(() => new Histogram());
  readonly writes: readonly Histogram[] = STAGES.map(() => new Histogram());
  readonly readLatency = new Histogram();
  /** By kernel index; grows as kernels are seen. */
  readonly kernels: KernelDelays[] = [];
  forwarded = 0; // reads served from a write queue
  negative = 0; // stage delays below zero: always an engine fault

  private readonly readRows = new Int32Array(1 << 12);
  private readonly writeRows = new Int32Array(1 << 12);
  private picked = new Float64Array(1 << 12); // one column's values of the rows picked
  private latency = new Float64Array(1 << 12);

  add(block: SampleBlock): void {
    // longer blocks than the engine's are taken in pieces
    for (let from = 0; from < block.count; from += this.readRows.length) {
      this.addRows(block, from, Math.min(block.count, from + this.readRows.length));
    }
  }

  private addRows(block: SampleBlock, from: number, to: number): void {
    const { readRows, writeRows, latency } = this;
    const { op, kernel, bytes } = block;
    // split the rows into reads and writes
    let reads = 0;
    let writes = 0;
    for (let row = from; row < to; row++) {
      if (op[row] === WRITE_OP) writeRows[writes++] = row;
      else readRows[reads++] = row;
      if (op[row] === 2) this.forwarded++;
    }

    // one stage after the other, each a tight loop over one column
    latency.fill(0, 0, reads);
    for (let stage = 0; stage < block.stages.length; stage++) {
      const column = block.stages[stage];
      this.pick(column, readRows, reads, this.reads[stage]);
      for (let i = 0; i < reads; i++) latency[i] += this.picked[i];
      this.pick(column, writeRows, writes, this.writes[stage]);
    }
    this.readLatency.add(latency, reads);

    for (let row = from; row < to; row++) {
      const entry = this.kernels[kernel[row]] ?? this.kernelEntry(kernel[row]);
      entry.requests++;
      entry.bytes += bytes[row];
    }
    for (let i = 0; i < reads; i++) {
      const entry = this.kernels[kernel[readRows[i]]];
      entry.reads++;
      entry.readLatencyPs += latency[i];
    }
  }

  /** Copies a column's values of some rows into `picked` and adds them to a histogram; negative ones are counted and taken as 0. */
  private pick(column: Float64Array, rows: Int32Array, count: number, into: Histogram): void {
    const { picked } = this;
    let least = 0;
    for (let i = 0; i < count; i++) {
      const value = column[rows[i]];
      picked[i] = value;
      if (value < least) least = value;
    }
    if (least < 0) {
      for (let i = 0; i < count; i++) {
        if (picked[i] >= 0) continue;
        this.negative++;
        picked[i] = 0;
      }
    }
    into.add(picked, count);
  }

  private kernelEntry(kernel: number): KernelDelays {
    while (this.kernels.length <= kernel) this.kernels.push({ reads: 0, readLatencyPs: 0, requests: 0, bytes: 0 });
    return this.kernels[kernel];
  }
}
