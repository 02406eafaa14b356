/** How long runs will take, in relative terms, and how they are dealt out: enough to balance shards and to say how long is left. */
import type { Kernel, Trace } from '../trace/index.js';

const ATOM_BYTES = 64; // about one DRAM command's worth of data; only ratios matter
const PER_REQUEST = 3; // cost of a request against that of one more atom of it, from profiles of the engine
const REQUEST_BYTES = 256;
const CHASED = 4; // a lone chase does little at a time, so a request of it costs more

/**
 * Estimated cost of simulating a trace, in atoms: bytes and requests of its kernels; for an access trace what its file's size says,
 * at about 24 bytes a row.
 */
export function traceCost(trace: Trace, fileBytes: number): number {
  if (trace.kind === 'access') return Math.max(1, (fileBytes / 24) * (PER_REQUEST + 1));
  const side = (bytes: number, pattern: Kernel['read']): number => {
    const granule = Math.min(REQUEST_BYTES, pattern?.granule || REQUEST_BYTES);
    const requests = bytes / granule;
    return bytes / ATOM_BYTES + requests * PER_REQUEST * (pattern?.name === 'chase' ? CHASED : 1);
  };
  const sum = trace.kernels.reduce(
    (total, kernel) =>
      total + kernel.repeat * (side(kernel.readBytes, kernel.read) + side(kernel.writeBytes, kernel.write)),
    0,
  );
  return Math.max(1, sum);
}

/** One of n equal slices, from 1. */
export interface Shard {
  readonly k: number;
  readonly n: number;
}

/**
 * Deals things of these costs out to n shards, the dearest first, each to the shard that has least so far (Graham, 1969: never more
 * than 4/3 of the best). Ties go to the lower number, so that every shard comes to the same split by itself.
 */
export function dealt(costs: readonly number[], n: number): number[][] {
  const shards = Array.from({ length: n }, () => ({ sum: 0, items: [] as number[] }));
  for (const i of dearestFirst(costs)) {
    const least = shards.reduce((best, shard) => (shard.sum < best.sum ? shard : best));
    least.sum += costs[i];
    least.items.push(i);
  }
  return shards.map(({ items }) => items);
}

/** Indices by falling cost; equal ones stay in order. */
export function dearestFirst(costs: readonly number[]): number[] {
  return costs.map((_, i) => i).sort((a, b) => costs[b] - costs[a] || a - b);
}
