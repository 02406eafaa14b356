import { type Collector, type SampleBlock, STAGES } from '../engine/recording.js';
import { Histogram } from './histogram.js';

const ROWS = 1 << 12; // taken at once: what the columns of so many need stays in cache
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

  private readonly readRows = new Int32Array(ROWS);
  private readonly writeRows = new Int32Array(ROWS);
  private readonly latency = new Float64Array(ROWS); // of the row, where it is a read

  add(block: SampleBlock): void {
    // longer blocks than the engine's are taken in pieces
    for (let from = 0; from < block.count; from += ROWS) this.addRows(block, from, Math.min(block.count, from + ROWS));
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
    latency.fill(0);
    for (let stage = 0; stage < block.stages.length; stage++) {
      const column = block.stages[stage];
      for (let row = from; row < to; row++) latency[row - from] += column[row];
      this.reads[stage].add(column, readRows, reads);
      this.writes[stage].add(column, writeRows, writes);
    }
    for (let i = 0; i < reads; i++) readRows[i] -= from;
    this.readLatency.add(latency, readRows, reads);

    for (let row = from; row < to; row++) {
      const entry = this.kernels[kernel[row]] ?? this.kernelEntry(kernel[row]);
      entry.requests++;
      entry.bytes += bytes[row];
    }
    for (let i = 0; i < reads; i++) {
      const entry = this.kernels[kernel[from + readRows[i]]];
      entry.reads++;
      entry.readLatencyPs += latency[readRows[i]];
    }
  }

  /** The least delay of any stage, ps: below zero only by a fault of the engine. */
  get least(): number {
    return Math.min(...this.reads.map((stage) => stage.min), ...this.writes.map((stage) => stage.min));
  }

  private kernelEntry(kernel: number): KernelDelays {
    while (this.kernels.length <= kernel) this.kernels.push({ reads: 0, readLatencyPs: 0, requests: 0, bytes: 0 });
    return this.kernels[kernel];
  }
}
