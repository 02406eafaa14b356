import fc from 'fast-check';
import { parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import type { SampleBlock } from '../../src/engine/index.js';
import { stream } from '../../src/random.js';
import type { Row } from '../helpers/engine.js';

/*
 * Random small packages and traces for the laws. A case is plain data, so that a failing one can be read and run again; refresh
 * intervals are shorter than real ones, so that short runs meet refreshes.
 */

export const PATTERNS = ['sequential', 'strided', 'uniform', 'zipf', 'chase', 'block'] as const;
export type PatternName = (typeof PATTERNS)[number];

export interface Design {
  readonly stacks: number; // of the first die
  readonly eastStacks: number; // of a second die, 0: there is none
  readonly channels: number;
  readonly device: 'hbm3-6.4' | 'hbm2-1.8';
  readonly clocks: readonly [string, string];
  readonly refresh: string; // body of the refresh section
  readonly page: 'open' | 'closed' | 'timeout';
  readonly scheduler: 'fr-fcfs' | 'fcfs';
  readonly queue: number; // entries of either queue
  readonly window: number;
  readonly issue: number;
  readonly landing: number; // bytes
  readonly fold: boolean; // rows folded into banks
}

export const PLAIN: Design = {
  stacks: 1,
  eastStacks: 0,
  channels: 2,
  device: 'hbm3-6.4',
  clocks: ['1.6 GHz', '1.6 GHz'],
  refresh: 'mode: all-bank, postpone: 1, pull_in: 1',
  page: 'open',
  scheduler: 'fr-fcfs',
  queue: 16,
  window: 16,
  issue: 1,
  landing: 65536,
  fold: false,
};

export const REFRESHES = [
  'mode: off',
  'mode: all-bank, postpone: 1, pull_in: 0',
  'mode: all-bank, postpone: 2, pull_in: 2',
  'mode: all-bank, scope: sid, postpone: 2, pull_in: 1',
  'mode: per-bank, postpone: 1',
  'mode: per-bank, postpone: 4',
] as const;

export function build(design: Design, ...overrides: string[]): Package {
  const { stacks, eastStacks } = design;
  const range = (first: number, count: number): string =>
    count === 1 ? `hbm.${first}` : `hbm.${first}-${first + count - 1}`;
  const die = (name: string, clock: string): string =>
    `  - { name: ${name}, clock: ${clock}, engines: 3, window: ${design.window}, issue_per_clock: ${design.issue}, buffering: 2, request: 256 B, peak: { bf16: 3 TFLOP/s } }`;
  const link = (name: string, to: string): string =>
    `  - { name: ${name}, from: ${name}, to: ${to}, lanes: 256, rate: 16 GT/s, latency: 3 ns, landing: ${design.landing} B }`;
  const text = `
penstock: 1
name: law
compute:
${die('west', design.clocks[0])}
${eastStacks > 0 ? die('east', design.clocks[1]) : ''}
memory:
  - name: hbm
    device: ${design.device}
    stacks: ${stacks + eastStacks}
    organisation: { channels: ${design.channels} }
    timings: { tREFI: 1500 ns }
    refresh: { ${design.refresh} }
    controller: { read_queue: ${design.queue}, write_queue: ${design.queue}, scheduler: ${design.scheduler}, page: ${design.page}, page_timeout: 60 ns, age_bound: 1 us }
    base_die: { ingress: 5 ns, egress: 4 ns }
links:
${link('west', range(0, stacks))}
${eastStacks > 0 ? link('east', range(stacks, eastStacks)) : ''}
address_map:
  interleave: [pseudo_channel, channel, stack]
  granule: 256 B
  fields: [column:3, bank_group:2, column:2, bank:2, ${design.device === 'hbm3-6.4' ? 'sid:1, ' : ''}row:14]
  xor: ${design.fold ? '{ bank_group.0: [row.0, row.4], bank.0: [row.2], bank.1: [row.3, row.7] }' : '{}'}
`;
  return parsePackage(text, 'law.yaml', overrides);
}

export interface Work {
  readonly pattern: PatternName;
  readonly rows: number;
  readonly writes: number; // share of rows that write
  readonly size: number; // bytes of a row; 0: random, down to single bytes
  readonly gapPs: number; // mean recorded time between rows
  readonly after: boolean; // some rows depend on earlier ones
  readonly tiles: boolean; // rows form tiles with compute
  readonly seed: number;
}

/** Rows of a pattern over all dies of a package, times rising. */
export function rowsOf(pkg: Package, work: Work): Row[] {
  const random = stream(`law ${work.seed}`, work.pattern);
  const { organisation: o } = pkg.memory[0];
  const stackBytes =
    o.channels * o.pseudo_channels * o.sids * o.bank_groups * o.banks_per_group * o.rows * o.columns * o.atom_bytes;
  const stacks = pkg.dies.map((_, die) => pkg.links.filter((link) => link.die === die).length);
  const bases = pkg.dies.map((_, die) => stackBytes * stacks.slice(0, die).reduce((a, b) => a + b, 0));
  const next = pkg.dies.map(() => 0); // per die: bytes or steps gone so far
  const hot = Array.from({ length: 64 }, () => Math.floor(random() * 2 ** 14));
  // rows that wait for a store of their own tile are a matter of their own: see replay.test.ts
  const depends = (work.after || work.pattern === 'chase') && (!work.tiles || work.writes === 0);
  const rows: Row[] = [];
  let time = 0;
  for (let i = 0; i < work.rows; i++) {
    const die = Math.floor(random() * pkg.dies.length);
    const bytes = work.size > 0 ? work.size : 1 + Math.floor(random() ** 3 * 2000);
    const span = 2 ** 26; // bytes of each die
    let offset: number;
    const step = next[die]++;
    if (work.pattern === 'sequential') offset = step * Math.max(work.size, 512);
    else if (work.pattern === 'strided') offset = (step * 8192 * 4) % span;
    else if (work.pattern === 'uniform' || work.pattern === 'chase') offset = Math.floor(random() * 2 ** 18) * 64;
    else if (work.pattern === 'zipf') offset = hot[Math.floor(64 ** random()) - 1] * 256;
    else offset = (step % 16) * 16384 + Math.floor(step / 16) * 256; // block: rows of 256 B, 16 KiB apart
    const address = bases[die] + (offset % span) + (work.size > 0 ? 0 : Math.floor(random() * 64));
    time += Math.floor(-work.gapPs * Math.log(1 - random()));
    rows.push({
      op: random() < work.writes ? 'W' : 'R',
      address,
      bytes,
      kernel: i & 1,
      timePs: time,
      ...(depends ? { after: work.pattern === 'chase' ? 1 : Math.floor(random() * 4) } : {}),
      ...(work.tiles ? { tile: Math.floor(i / 24), flops: i % 5 === 0 ? 200_000 : 0 } : {}),
    });
  }
  return rows;
}

const oneOf = <const T extends readonly unknown[]>(...values: T): fc.Arbitrary<T[number]> =>
  fc.constantFrom<T[number]>(...values);

export const anyDesign: fc.Arbitrary<Design> = fc.record({
  stacks: fc.integer({ min: 1, max: 3 }),
  eastStacks: oneOf(0, 0, 1, 2),
  channels: fc.integer({ min: 1, max: 3 }),
  device: oneOf('hbm3-6.4', 'hbm3-6.4', 'hbm2-1.8'),
  clocks: oneOf(['1.6 GHz', '1.6 GHz'] as const, ['1.3 GHz', '2.1 GHz'] as const),
  refresh: oneOf(...REFRESHES),
  page: oneOf('open', 'closed', 'timeout'),
  scheduler: oneOf('fr-fcfs', 'fr-fcfs', 'fcfs'),
  queue: oneOf(2, 8, 32),
  window: oneOf(1, 6, 40),
  issue: oneOf(1, 3),
  landing: oneOf(512, 4096, 65536),
  fold: fc.boolean(),
});

export const anyWork: fc.Arbitrary<Work> = fc.record({
  pattern: oneOf(...PATTERNS),
  rows: fc.integer({ min: 40, max: 500 }),
  writes: oneOf(0, 0.3, 0.5, 1),
  size: oneOf(0, 32, 64, 256, 1024),
  gapPs: oneOf(100, 400, 4000, 60_000),
  after: fc.boolean(),
  tiles: fc.boolean(),
  seed: fc.nat(1 << 20),
});

export const anyReplay = oneOf('closed', 'closed', 'open', 'paced');

/** One finished request with everything a sample block says of it. */
export interface Finished {
  readonly kernel: number;
  readonly op: number;
  readonly p: number;
  readonly bytes: number;
  readonly donePs: number;
  readonly stages: readonly number[];
}

/** Collects finished requests; hand `collector` to a run and read `all` after it. */
export function finished(): { readonly all: Finished[]; readonly collector: { add(block: SampleBlock): void } } {
  const all: Finished[] = [];
  return {
    all,
    collector: {
      add(block) {
        for (let i = 0; i < block.count; i++) {
          all.push({
            kernel: block.kernel[i],
            op: block.op[i],
            p: block.channel[i],
            bytes: block.bytes[i],
            donePs: block.donePs[i],
            stages: block.stages.map((stage) => stage[i]),
          });
        }
      },
    },
  };
}
