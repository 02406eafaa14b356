/** What the engine has tables for: the largest package of each kind runs, and one step more is refused by name. */
import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { InputError } from '../../src/errors.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

/** Reads and writes of a few bytes all over memory, some across the edge of an atom. */
function* scattered(count: number, span: number): Generator<Row> {
  for (let i = 0; i < count; i++)
    yield { op: i % 3 === 0 ? 'W' : 'R', address: (i * 2_654_435_761 * 16) % (span - 256), bytes: 24 + (i % 200) };
}

async function runs(pkg: Package, count = 400): Promise<void> {
  const { recording } = await simulate(pkg, accessTrace(scattered(count, 2 ** 32)));
  expect(recording.partial).toBe(false);
  expect(recording.checks.filter((check) => !check.ok)).toEqual([]);
}

function refusal(...overrides: string[]): string {
  try {
    smallPackage(...overrides);
  } catch (error) {
    if (error instanceof InputError) return error.message;
    throw error;
  }
  return 'accepted';
}

const stacks = (count: number): string[] => [`memory.0.stacks=${count}`, `links.0.to=hbm.0-${count - 1}`];

// [what is largest, at the limit, one step above, what is said of that]
const LIMITS: [string, string[], string[], string][] = [
  [
    'pseudo-channels and queue entries',
    // 128 x 16 x 2 = 4096 pseudo-channels of 128 + 128 entries
    [...stacks(128), 'memory.0.controller.read_queue=128', 'memory.0.controller.write_queue=128'],
    [...stacks(128), 'memory.0.controller.read_queue=129', 'memory.0.controller.write_queue=128'],
    'found 1,052,672 queue entries; expected at most 1,048,576 queue entries in a package',
  ],
  ['pseudo-channels', stacks(128), stacks(129), 'found 4,128 pseudo-channels; expected at most 4,096'],
  [
    'engines and outstanding requests',
    ['compute.0.engines=4096', 'compute.0.window=512'],
    ['compute.0.engines=4096', 'compute.0.window=513'],
    'found 2,101,248 outstanding requests (engines x widest window); expected at most 2,097,152',
  ],
  [
    'a window',
    ['compute.0.engines=32', 'compute.0.window=65536'],
    ['compute.0.engines=32', 'compute.0.window=65537'],
    'found 65537; expected at most 65536',
  ],
  [
    'banks',
    [
      'memory.0.organisation={ sids: 4, bank_groups: 8, banks_per_group: 2 }',
      'address_map.fields=[column:3, bank_group:3, column:2, bank:1, sid:2, row:14]',
    ],
    [
      'memory.0.organisation={ sids: 4, bank_groups: 8, banks_per_group: 4 }',
      'address_map.fields=[column:3, bank_group:3, column:2, bank:2, sid:2, row:14]',
    ],
    'found 128 banks in 32 groups a pseudo-channel; expected at most 64 banks in 32 groups',
  ],
  [
    'bank groups',
    [
      'memory.0.organisation={ sids: 1, bank_groups: 32, banks_per_group: 2 }',
      'address_map.fields=[column:3, bank_group:5, column:2, bank:1, row:14]',
    ],
    [
      'memory.0.organisation={ sids: 2, bank_groups: 32, banks_per_group: 1 }',
      'address_map.fields=[column:3, bank_group:5, column:2, sid:1, row:14]',
    ],
    'found 64 banks in 64 groups a pseudo-channel; expected at most 64 banks in 32 groups',
  ],
  [
    'clocks a round trip, for credits',
    // 20 us up and twice 40 us of round trip at 50 GHz: 2^23 edges for the 64 queues of one stack are 2^29 credits
    ['compute.0.clock=3 GHz', 'links.0.latency=10 us', 'memory.0.base_die={ ingress: 10 us, egress: 10 us }'],
    ['compute.0.clock=50 GHz', 'links.0.latency=10 us', 'memory.0.base_die={ ingress: 10 us, egress: 10 us }'],
    'found a round trip of 40.0 us at a compute clock of 20.0 ps for 32 pseudo-channels; expected fewer clocks a round trip or fewer pseudo-channels: their credits under way would not fit in memory',
  ],
  [
    'clocks a round trip, for answers',
    // 4 x 20 us at 1.6 GHz are 128,000 clocks, in a table of 2^17 … of each of 128 stacks; 12 GHz takes eight times that
    ['compute.0.clock=100 MHz', ...stacks(128), 'links.0.latency=10 us', 'memory.0.organisation={ channels: 1 }'],
    [
      'compute.0.clock=100 MHz',
      ...stacks(128),
      'links.0.latency=10 us',
      'memory.0.organisation={ channels: 1 }',
      'memory.0.clock=12 GHz',
    ],
    'ck at a DRAM clock of 83.3 ps for 128 stacks; expected fewer clocks a round trip or fewer stacks: their answers under way would not fit in memory',
  ],
  [
    'a clock',
    ['compute.0.clock=50 GHz'],
    ['compute.0.clock=51 GHz'],
    "found '51 GHz'; expected a clock from 1 MHz to 50 GHz",
  ],
  [
    'a slow clock',
    ['compute.0.clock=1 MHz'],
    ['compute.0.clock=0.9 MHz'],
    "found '0.9 MHz'; expected a clock from 1 MHz to 50 GHz",
  ],
  [
    'a wait for data',
    ['memory.0.timings.RL=4096 ck', 'memory.0.timings.tRTW=0 ck'],
    ['memory.0.timings.RL=4097 ck'],
    "found '4097 ck', 4097 ck; expected at most 4096 ck",
  ],
  [
    'a controller’s pipeline',
    ['memory.0.controller.pipeline=10 us'],
    ['memory.0.controller.pipeline=11 us'],
    "found '11 us', 17600 ck; expected at most 16384 ck",
  ],
  [
    'a flit',
    ['links.0.lanes=8', 'links.0.rate=26 MT/s'],
    ['links.0.lanes=8', 'links.0.rate=25 MT/s'],
    "found '25 MT/s' over 8 lanes: a flit of 256 B takes 10.2 us; expected at most 10.0 us a flit",
  ],
];

describe('the engine runs what is accepted', () => {
  it.each(LIMITS)('largest: %s', async (_, at, above, said) => {
    await runs(smallPackage(...at));
    expect(refusal(...above)).toContain(said);
  });

  it('smallest: one of everything', async () => {
    const one = smallPackage(
      'compute.0.engines=1',
      'compute.0.window=1',
      'compute.0.buffering=1',
      'compute.0.request=32 B',
      'memory.0.controller={ read_queue: 1, write_queue: 1, hit_cap: 1, age_bound: 1 ps, page_timeout: 1 ps, pipeline: 1 ps }',
      'memory.0.organisation={ channels: 1, pseudo_channels: 1, sids: 1, bank_groups: 1, banks_per_group: 1, rows: 1, columns: 1 }',
      'links.0.lanes=1',
      'links.0.landing=32 B',
      'links.0.flit=1 B',
      'links.0.flit_overhead=0 B',
      'links.0.request_header=1 B',
      'links.0.response_header=1 B',
      'links.0.ack=1 B',
      'links.0.latency=0 ns',
      'address_map={ interleave: [stack, channel], granule: 32 B, fields: [column:0] }',
    );
    const rows = Array.from({ length: 20 }, (_, i): Row => ({ op: i % 2 ? 'R' : 'W', address: i, bytes: 5 }));
    const { recording } = await simulate(one, accessTrace(rows));
    expect(recording.checks.filter((check) => !check.ok)).toEqual([]);
  });
});

/*
 * Between two refreshes there must be room for work. Where config draws the line a saturated channel still goes on, in every
 * mode, scope and slack; a clock less is refused.
 */
describe('refresh leaves room', () => {
  const modes = ['all-bank', 'per-bank'].flatMap((mode) =>
    ['pseudo_channel', 'sid'].flatMap((scope) => [1, 2, 8].map((postpone) => [mode, scope, postpone] as const)),
  );
  it.each(modes)('%s, %s, %i owed', async (mode, scope, postpone) => {
    const make = (ck: number): string[] => [
      'memory.0.organisation={ channels: 1 }',
      `memory.0.refresh={ mode: ${mode}, scope: ${scope}, postpone: ${postpone} }`,
      `memory.0.timings.tREFI=${ck} ck`,
    ];
    let least = 100;
    while (refusal(...make(least)) !== 'accepted') least++;
    expect(refusal(...make(least - 1))).toMatch(/tREFI = \d+ ck.*; expected tREFI/);
    const { recording } = await simulate(
      smallPackage(...make(least)),
      accessTrace(scattered(600, 2 ** 29)),
      { untilPs: 2e9 }, // some 2000 intervals of tREFI: it takes about 600
    );
    expect(recording.partial).toBe(false);
    expect(recording.checks.filter((check) => !check.ok)).toEqual([]);
  });
});
