/**
 * Traces: what work there is, before anything is known of how long it takes.
 * In: files or standard input (access rows or kernel rows, CSV), pattern text. Out: batches of accesses as columns, or kernels
 * with their places and a walker that makes each tile's accesses when an engine asks for them.
 * Its one decision: nothing is ever held whole. Access rows pass in batches that are used again; kernel rows become accesses only
 * as they are sent, and equal seeds make equal accesses however they are asked for.
 * Not modelled: what the bytes are, what one kernel leaves in place for the next (each has regions of its own), virtual memory
 * (addresses are physical), and work that depends on data (every row of a trace is done).
 */
export { FARTHEST_AFTER, LONGEST_ACCESS, MOST_KERNELS } from './access.js';
export * from './batch.js';
export { ACCESS_COLUMNS, KERNEL_COLUMNS } from './columns.js';
export { openBytes } from './files.js';
export { DEFAULT_TILE } from './kernels.js';
export { kernelCsv, type MadeMix, MIXES, makeMix, type Site } from './mixes/index.js';
export { openTrace, type TraceOptions } from './open.js';
export { PATTERNS, parsePattern } from './pattern.js';
export { placeKernels } from './place.js';
export { OWN_SHAPE, parseShape, type Shape, type ShapeText } from './shape.js';
export { type ShapeFile, shapeFile } from './shape-file.js';
export { type SynthOptions, synthesise } from './synth.js';
export { createTileWalk } from './walk.js';
export { accessCsv } from './write.js';
export { arrowBytes, parquetBytes } from './write-columns.js';
export { zstd } from './zstd.js';
