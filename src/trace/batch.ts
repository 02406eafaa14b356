/** What a trace is once read: batches of columns for an access trace, rows of kernels for a kernel trace. */

export const READ = 0;
export const WRITE = 1;

/** A block of access-trace rows as columns; every array is at least `count` long. Reused by the reader after the next pull. */
export interface AccessBatch {
  count: number;
  readonly op: Uint8Array; // READ or WRITE
  readonly address: Float64Array; // first byte, global address space
  readonly bytes: Float64Array; // length asked for, 1 … 2^31
  readonly timePs: Float64Array | null; // recorded time; null when the trace has none
  readonly die: Int32Array | null; // compute die index, null or -1: the die that owns the address
  readonly engine: Int32Array | null; // engine within the die, null or -1: dealt in turn
  readonly kernel: Int32Array; // index into AccessTrace.kernelNames
  readonly tile: Int32Array | null; // rows of one engine that follow each other with one tile number are one tile; -1: a tile of its own
  readonly flops: Float64Array | null; // work done once the row's tile has been loaded
  readonly after: Int32Array | null; // rows back on this engine that must have returned first; 0: none
}

export interface AccessTrace {
  readonly kind: 'access';
  readonly file: string;
  /** Kernel names in order of first sight; grows while batches are read. */
  readonly kernelNames: string[];
  readonly hasTime: boolean;
  batches(): AsyncIterable<AccessBatch>;
  /** Known once the batches have ended. */
  facts(): TraceFacts;
  /** How much of the file has been read, 0 to 1; NaN where its length is not known. */
  fraction?(): number;
}

export interface TraceFacts {
  readonly rows: number;
  readonly skippedRows: number;
  readonly hash: string; // sha256 of the file's bytes as read, hex
}

export type PatternName = 'sequential' | 'strided' | 'uniform' | 'zipf' | 'chase' | 'block';

/** An access pattern with every parameter resolved; sizes in bytes, 0 where the pattern has no such parameter. */
export interface Pattern {
  readonly name: PatternName;
  readonly granule: number; // bytes of one access (uniform, zipf, chase)
  readonly span: number; // bytes the pattern ranges over; 0: the kernel's own size
  readonly stride: number; // strided: bytes from one access to the next
  readonly s: number; // zipf exponent
  readonly rows: number; // block: rows of a block
  readonly width: number; // block: bytes of a row of the block
  readonly pitch: number; // block: bytes from one row to the next
  readonly text: string; // as written
}

export interface Kernel {
  readonly name: string;
  readonly line: number; // of the trace file
  readonly stream: number; // index into KernelTrace.streams
  readonly format: string; // number format, '' when flops is 0
  readonly flops: number; // of one launch
  readonly readBytes: number; // of one launch
  readonly writeBytes: number;
  readonly read: Pattern | null; // null when readBytes is 0
  readonly write: Pattern | null;
  readonly tileBytes: number; // bytes loaded (stored, when it only writes) by one tile
  readonly die: number; // -1: shared out over all dies
  readonly repeat: number; // launches, one after the other
  readonly estimatePs: number; // the user's own estimate of one launch; 0: none
}

export interface KernelTrace {
  readonly kind: 'kernel';
  readonly file: string;
  readonly streams: readonly string[];
  readonly kernels: readonly Kernel[];
  readonly facts: TraceFacts;
}

export type Trace = AccessTrace | KernelTrace;

/** What trace expansion must know of the package: one entry a compute die. */
export interface DieGeometry {
  readonly base: number; // first address of the die's own memory
  readonly capacity: number; // bytes
  readonly engines: number;
  readonly requestBytes: number;
}

/** A kernel with its place: what each die does of it. */
export interface PlacedKernel {
  readonly kernel: Kernel;
  readonly shares: readonly KernelShare[]; // one entry a die, `tiles` 0 where the die has no part
}

export interface KernelShare {
  readonly readBase: number; // global address where this die's read region starts
  readonly readSpan: number; // bytes of the region
  readonly writeBase: number;
  readonly writeSpan: number;
  readonly tiles: number; // tiles of this die, numbered 0 … tiles - 1; engine e takes e, e + engines, …
  readonly readBytes: number; // this die's bytes; tile i loads from i*readBytes/tiles, in whole accesses
  readonly writeBytes: number;
  readonly flops: number; // this die's share of one launch; a tile computes flops / tiles
}

/**
 * Walks the accesses of one tile, one side (loads or stores), filling columns lazily. One walker belongs to one engine context
 * and is used again for the next tile. Equal seed, kernel index, die, side and tile give equal accesses, whatever the fill sizes.
 */
export interface TileWalk {
  /** Points the walker at a tile. `kernelIndex` is the kernel's row number in the trace, `side` READ or WRITE. */
  begin(placed: PlacedKernel, kernelIndex: number, die: number, side: number, tile: number): void;
  /** Writes up to `room` next accesses at `from` into the columns and returns how many; 0 means the tile's side is done. */
  fill(address: Float64Array, bytes: Int32Array, from: number, room: number): number;
  /** True when each access of this side must wait for the one before it (pointer chase). */
  readonly chained: boolean;
}
