/** Access traces made from a pattern, seeded. */
import type { Where } from '../errors.js';
import { stream } from '../random.js';
import { BATCH_ROWS } from './access.js';
import { type AccessBatch, type Kernel, READ, WRITE } from './batch.js';
import { parsePattern } from './pattern.js';
import { regionBytes } from './place.js';
import { createTileWalk } from './walk.js';

export interface SynthOptions {
  /** Bytes to ask for in all; patterns of granules round up to a whole one. */
  readonly bytes: number;
  /** Share of the accesses that are reads, 0 … 1, drawn one by one. */
  readonly readFraction: number;
  readonly seed: string;
  /** Longest access of the patterns sequential, strided and block, bytes. */
  readonly requestBytes: number;
  /** First address. */
  readonly base: number;
  /** Recorded times: none, every `gapPs`, or at random with that mean (a Poisson process). */
  readonly arrivals?: { readonly kind: 'fixed' | 'poisson'; readonly gapPs: number };
  /** Where the pattern was written, for errors. */
  readonly where?: Where;
}

/**
 * Makes the accesses of a pattern. The batch is used again after each pull. A chase is one dependency chain and so the work of one
 * engine; the rows of the other patterns name none. Throws InputError when the pattern cannot be understood.
 */
export function* synthesise(patternText: string, options: SynthOptions): Generator<AccessBatch> {
  const { bytes, readFraction, seed, requestBytes, base, arrivals } = options;
  const pattern = parsePattern(patternText, options.where ?? { file: 'pattern' });
  const geometry = [{ base, capacity: 2 ** 52 - base, engines: 1, requestBytes }];
  const kernel: Kernel = {
    name: 'synthetic',
    line: 0,
    stream: 0,
    format: '',
    flops: 0,
    readBytes: bytes,
    writeBytes: 0,
    read: pattern,
    write: null,
    tileBytes: bytes,
    die: 0,
    repeat: 1,
    estimatePs: 0,
  };
  const readSpan = regionBytes(pattern, bytes, (total) => total, geometry[0]);
  const share = {
    readBase: base,
    readSpan,
    writeBase: 0,
    writeSpan: 0,
    tiles: 1,
    readBytes: bytes,
    writeBytes: 0,
    flops: 0,
  };
  const walk = createTileWalk(seed, geometry);
  walk.begin({ kernel, shares: [share] }, 0, 0, READ, 0);

  const ints = (there: boolean) => (there ? new Int32Array(BATCH_ROWS) : null);
  const batch: AccessBatch = {
    count: 0,
    op: new Uint8Array(BATCH_ROWS),
    address: new Float64Array(BATCH_ROWS),
    bytes: new Float64Array(BATCH_ROWS),
    timePs: arrivals === undefined ? null : new Float64Array(BATCH_ROWS),
    die: null,
    engine: ints(walk.chained),
    kernel: new Int32Array(BATCH_ROWS),
    tile: null,
    flops: null,
    after: ints(walk.chained),
  };
  const lengths = new Int32Array(BATCH_ROWS);
  const mix = stream(seed, 'op');
  const clock = stream(seed, 'arrivals');
  let timePs = 0;
  let made = 0;
  for (;;) {
    const count = walk.fill(batch.address, lengths, 0, BATCH_ROWS);
    if (count === 0) return;
    for (let i = 0; i < count; i++) {
      batch.bytes[i] = lengths[i];
      batch.op[i] = mix() < readFraction ? READ : WRITE;
      if (batch.after !== null) batch.after[i] = made + i === 0 ? 0 : 1;
      if (batch.timePs === null || arrivals === undefined) continue;
      batch.timePs[i] = Math.round(timePs);
      timePs += arrivals.kind === 'fixed' ? arrivals.gapPs : -Math.log(clock.double()) * arrivals.gapPs;
    }
    made += count;
    batch.count = count;
    yield batch;
  }
}
