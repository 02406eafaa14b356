/** Kernels, traces and walked accesses for the tests of this folder. */
import {
  createTileWalk,
  type DieGeometry,
  type Kernel,
  type KernelTrace,
  type PlacedKernel,
  parsePattern,
  READ,
} from '../../src/trace/index.js';

export const die = (part: Partial<DieGeometry> = {}): DieGeometry => ({
  base: 0,
  capacity: 2 ** 30,
  engines: 4,
  requestBytes: 256,
  ...part,
});

export function kernel(part: Partial<Kernel> & { readText?: string; writeText?: string }): Kernel {
  const { readText, writeText, ...rest } = part;
  const where = { file: 'test' };
  return {
    name: 'k',
    line: 2,
    stream: 0,
    format: '',
    flops: 0,
    readBytes: 0,
    writeBytes: 0,
    read: readText === undefined ? null : parsePattern(readText, where),
    write: writeText === undefined ? null : parsePattern(writeText, where),
    tileBytes: 65536,
    die: -1,
    repeat: 1,
    estimatePs: 0,
    ...rest,
  };
}

export const trace = (...kernels: Kernel[]): KernelTrace => ({
  kind: 'kernel',
  file: 'test.csv',
  streams: ['main'],
  kernels,
  facts: { rows: kernels.length, skippedRows: 0, hash: '' },
});

export interface Access {
  readonly address: number;
  readonly bytes: number;
}

/** All accesses of one tile's side, taken `room` at a time. */
export function walkTile(
  geometry: readonly DieGeometry[],
  placed: PlacedKernel,
  { seed = '1', index = 0, onDie = 0, side = READ, tile = 0, room = 7 } = {},
): Access[] {
  const walk = createTileWalk(seed, geometry);
  walk.begin(placed, index, onDie, side, tile);
  const offset = 3; // fill starts where it is told, not at 0
  const address = new Float64Array(room + offset);
  const bytes = new Int32Array(room + offset);
  const accesses: Access[] = [];
  for (;;) {
    const count = walk.fill(address, bytes, offset, room);
    if (count === 0) return accesses;
    for (let i = offset; i < offset + count; i++) accesses.push({ address: address[i], bytes: bytes[i] });
  }
}

/** All accesses of one side on one die, tile after tile. */
export function walkSide(
  geometry: readonly DieGeometry[],
  placed: PlacedKernel,
  onDie: number,
  side: number,
): Access[] {
  return Array.from({ length: placed.shares[onDie].tiles }, (_, tile) =>
    walkTile(geometry, placed, { onDie, side, tile }),
  ).flat();
}

export const bytesOf = (accesses: readonly Access[]) => accesses.reduce((sum, access) => sum + access.bytes, 0);
