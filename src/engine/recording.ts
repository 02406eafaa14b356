/**
 * What a run leaves behind: the noun between `engine` and `analysis`. Samples go out in blocks while the run goes on, so memory
 * does not grow with the trace; counters come at the end. Index `p` is a pseudo-channel of the whole package:
 * p = (stack * channels + channel) * pseudo_channels + pseudo_channel.
 */

/** Stages of a request's life, in order; the delays of one read add up to its latency exactly. */
export const STAGES = [
  'window_wait', // ready to issue, waiting for a window entry or an issue slot
  'down_link_queue', // waiting for queue credit, landing credit and the link
  'down_link_transit', // first byte on the link to arrival in the controller queue (ingress included)
  'controller_queue', // in the queue until its first DRAM command
  'bank_preparation', // first DRAM command to first column command
  'data_transfer', // first column command to last byte on the DRAM data bus (forwarded: controller pipeline)
  'up_link_queue', // base-die egress buffer, waiting for the link
  'up_link_transit', // egress, serialisation and flight
] as const;
export type StageName = (typeof STAGES)[number];

/** Classes of the bandwidth stack; every ck of every pseudo-channel is in exactly one. */
export const STACK_CLASSES = [
  'read_data',
  'write_data',
  'refresh',
  'row_cycle',
  'activate_window',
  'column_gap',
  'turnaround',
  'command_bus',
  'starved_down_link',
  'starved_up_link',
  'starved_queue_credits',
  'starved_window',
  'starved_compute',
  'starved_imbalance',
  'starved_arrivals',
  'starved_drain',
] as const;
export type StackClass = (typeof STACK_CLASSES)[number];

/** One finished request a row. Reused after `add` returns. */
export interface SampleBlock {
  count: number;
  readonly kernel: Int32Array; // kernel index
  readonly op: Uint8Array; // 0 read, 1 write, 2 read served from the write queue
  readonly channel: Int32Array; // pseudo-channel index p
  readonly bytes: Float64Array; // useful bytes
  readonly donePs: Float64Array; // when the answer was back at the engine
  readonly stages: readonly Float64Array[]; // one column a stage of STAGES, ps; a write's end with its acknowledgement: its
  // controller_queue is the pipeline, bank_preparation and data_transfer are 0
}

/** Takes sample blocks as they come. */
export interface Collector {
  add(block: SampleBlock): void;
}

export interface KernelRecord {
  readonly name: string;
  startPs: number; // first issue; -1 when nothing was issued
  endPs: number; // last answer, or end of last tile's compute
  flops: number; // done
  computePs: number; // summed over engines
  readBytes: number; // useful, answered
  writeBytes: number;
  movedReadBytes: number; // whole atoms over the DRAM data bus (forwarded reads not counted)
  movedWriteBytes: number;
  requests: number;
  launches: number; // finished
}

export interface LinkRecord {
  flitsDown: number;
  flitsUp: number;
  payloadBytesDown: number; // headers included
  payloadBytesUp: number;
}

/** A check of a conserved quantity: `got` must equal `expected` within `tolerance` (absolute). */
export interface Check {
  readonly name: string;
  readonly ok: boolean;
  readonly got: number;
  readonly expected: number;
  readonly tolerance: number;
}

export interface Recording {
  readonly makespanPs: number; // last answer, end of compute or write data, whichever is last
  readonly partial: boolean; // stopped by --until or an interrupt
  readonly elapsedCk: number; // DRAM clocks each pseudo-channel is accounted for (one memory group)
  readonly kernels: readonly KernelRecord[]; // by kernel index
  readonly links: readonly LinkRecord[]; // by stack
  /** Per pseudo-channel counters, length = pseudo-channels of the package. */
  readonly dram: {
    readonly reads: Float64Array; // RD and RDA commands = atoms
    readonly writes: Float64Array;
    readonly activates: Float64Array;
    readonly precharges: Float64Array; // PRE and PREA commands and own precharges
    readonly refreshesAll: Float64Array;
    readonly refreshesBank: Float64Array;
    readonly rowHits: Float64Array; // requests, judged at their first command
    readonly rowMisses: Float64Array;
    readonly rowConflicts: Float64Array;
    readonly forwarded: Float64Array; // reads served from the write queue
    readonly readQueueCk: Float64Array; // integral of read queue entries over time, entry x ck
    readonly writeQueueCk: Float64Array;
    readonly readQueueMax: Int32Array;
    readonly writeQueueMax: Int32Array;
  };
  /** Per bank of a pseudo-channel, index p * count + bank, stack IDs and bank groups in order within p. */
  readonly banks: {
    readonly count: number; // banks of a pseudo-channel
    readonly atoms: Float64Array; // column commands
    readonly activates: Float64Array;
    readonly conflicts: Float64Array; // requests that found another row open
  };
  /** bandwidthStack[p * STACK_CLASSES.length + class], ck; each p sums to elapsedCk. All zeros when attribution was off. */
  readonly bandwidthStack: Float64Array;
  /** kernelStack[kernel * STACK_CLASSES.length + class], ck of all pseudo-channels: bursts of the kernel and the gaps before them. */
  readonly kernelStack: Float64Array;
  /** The bandwidth stack over time: slice i covers clocks [i * sliceCk, (i + 1) * sliceCk) of all pseudo-channels. */
  readonly stackTimeline: {
    readonly sliceCk: number;
    readonly slicePs: number;
    readonly classes: Float64Array; // slice * STACK_CLASSES.length + class, ck; at most 512 slices
  };
  /** readWaitCk[class]: what reads in the controllers' queues waited for, from arrival to last column command, read x ck. */
  readonly readWaitCk: Float64Array;
  /** Engines of all dies in die order: time spent computing, ps, and integral of outstanding requests, request x ps. */
  readonly engineComputePs: Float64Array;
  readonly engineWindowPs: Float64Array;
  readonly checks: readonly Check[]; // the engine's own: conservation, Little's law, stacks
  /** Bytes moved on the DRAM buses per time slice: slice i covers [i*slicePs, (i+1)*slicePs). At most 512 slices. */
  readonly timeline: { readonly slicePs: number; readonly readBytes: Float64Array; readonly writeBytes: Float64Array };
}

/** DRAM commands by their JEDEC names; the number is what the command sink gets. */
export const COMMANDS = ['ACT', 'RD', 'RDA', 'WR', 'WRA', 'PRE', 'PREA', 'REFab', 'REFpb', 'RFMab', 'RFMpb'] as const;
export type CommandName = (typeof COMMANDS)[number];

/** Receives every DRAM command, per channel in order of time. Unused fields are -1. `halfCk` counts half clocks. */
export type CommandSink = (
  halfCk: number,
  p: number,
  sid: number,
  bankGroup: number,
  bank: number, // within its group
  row: number,
  column: number, // atom within the row
  command: number, // index into COMMANDS
  request: number, // the request's number in order of issue
) => void;

export interface RunOptions {
  readonly replay: 'open' | 'closed' | 'paced';
  readonly seed: string;
  readonly untilPs: number; // Infinity: to the end
  readonly windowPs: number; // at most this long a window; Infinity: as long as the package allows (tests shorten it)
  readonly attribution: boolean; // false: no bandwidth stack, for measuring its cost
  readonly onCommand: CommandSink | null;
  readonly onProgress: ((progress: Progress) => void) | null; // called about every 100,000 requests
  readonly signal: AbortSignal | null; // aborting ends the run early, partial
}

export interface Progress {
  readonly simulatedPs: number;
  readonly requests: number; // answered so far
  readonly bytes: number; // answered so far, useful
}
