import fc from 'fast-check';
import { expect, it } from 'vitest';
import { domains, parsePackage } from '../../src/config/index.js';
import { type Package, TIMING_NAMES } from '../../src/config/package.js';
import { InputError } from '../../src/errors.js';
import { accessTrace, kernelTrace, type Row, simulate } from '../helpers/engine.js';

/*
 * The fuzz beside this one breaks a file; here everything is well-formed, and each value is drawn from the whole of its range:
 * one of something, powers and odd counts, and the far ends. Whatever config lets through, the engine must run to its end.
 */

/** Whole numbers over orders of magnitude: as many between 1 and 10 as between 100 and 1000. */
const spread = (least: number, most: number): fc.Arbitrary<number> =>
  fc
    .double({ min: Math.log(least + 1), max: Math.log(most + 1), noNaN: true })
    .map((x) => Math.min(most, Math.max(least, Math.round(Math.exp(x) - 1))));
const of = <T>(...words: T[]): fc.Arbitrary<T> => fc.constantFrom(...words);
const key = (path: string, value: fc.Arbitrary<unknown>, unit = ''): fc.Arbitrary<string> =>
  value.map((v) => `${path}=${String(v)}${unit}`);

const controller = (name: string, value: fc.Arbitrary<unknown>, unit = ''): fc.Arbitrary<string> =>
  key(`memory.0.controller.${name}`, value, unit);
const link = (name: string, value: fc.Arbitrary<unknown>, unit = ''): fc.Arbitrary<string> =>
  fc.nat(1).chain((i) => key(`links.${i}.${name}`, value, unit));
const die = (name: string, value: fc.Arbitrary<unknown>, unit = ''): fc.Arbitrary<string> =>
  fc.nat(1).chain((i) => key(`compute.${i}.${name}`, value, unit));
const timing = (most: number): fc.Arbitrary<string> =>
  of(...TIMING_NAMES).chain((name) => key(`memory.0.timings.${name}`, spread(0, most), ' ck'));
const half = spread(1, 64).map((clocks) => `${clocks / 2} ck`);

const override = fc.oneof(
  die('clock', spread(1, 50_000), ' MHz'),
  die('engines', spread(1, 300)),
  die('window', spread(1, 3000)),
  die('issue_per_clock', spread(1, 16)),
  die('buffering', spread(1, 64)),
  die(
    'request',
    spread(1, 2048).map((atoms) => 32 * atoms),
    ' B',
  ),
  key('memory.0.device', of('hbm2-1.8', 'hbm3-6.4')),
  key('memory.0.clock', spread(100, 50_000), ' MHz'),
  controller('read_queue', spread(1, 4096)),
  controller('write_queue', spread(1, 4096)),
  controller('scheduler', of('fcfs', 'fr-fcfs')),
  controller('hit_cap', spread(1, 1000)),
  controller('age_bound', spread(1, 1e7), ' ns'),
  controller('page', of('open', 'closed', 'timeout')),
  controller('page_timeout', spread(1, 1e6), ' ns'),
  controller('pipeline', spread(1, 10_000), ' ns'),
  key('memory.0.base_die.ingress', spread(0, 10_000), ' ns'),
  key('memory.0.base_die.egress', spread(0, 10_000), ' ns'),
  key('memory.0.refresh.mode', of('all-bank', 'per-bank', 'off')),
  key('memory.0.refresh.scope', of('sid', 'pseudo_channel')),
  key('memory.0.refresh.postpone', spread(1, 8)),
  key('memory.0.refresh.pull_in', spread(0, 8)),
  key('memory.0.refresh.temperature', of(20, 95), ' C'),
  key('memory.0.activate_window_scope', of('sid', 'pseudo_channel')),
  key('memory.0.command_buses.separate', of(true, false)),
  key('memory.0.command_buses.act', half),
  key('memory.0.command_buses.precharge', half),
  key('memory.0.command_buses.refresh', half),
  key('memory.0.command_buses.column', half),
  timing(4096),
  timing(64),
  timing(64),
  of('tREFI', 'tRFCab', 'tRFCpb').chain((name) => key(`memory.0.timings.${name}`, spread(1, 2 ** 20), ' ck')),
  link('lanes', spread(1, 65_536)),
  link('rate', spread(100, 1_000_000), ' MT/s'),
  link('flit', spread(1, 65_536), ' B'),
  link('flit_overhead', spread(0, 200), ' B'),
  link('request_header', spread(1, 4096), ' B'),
  link('response_header', spread(1, 4096), ' B'),
  link('ack', spread(1, 4096), ' B'),
  link('latency', spread(0, 10_000), ' ns'),
  link('landing', spread(32, 1e6), ' B'),
  key('address_map.granule', of(32, 64, 96, 128, 256, 1024, 65_536, 2 ** 20, 2 ** 29), ' B'),
  key('address_map.rotate', of(true, false)),
  key('address_map.interleave', of('[stack, channel, pseudo_channel]', '[channel, pseudo_channel, stack]')),
);

/** Devices of all shapes with the fields they need, beside the presets' own. */
const shape = fc
  .record({
    channels: of(1, 2, 3, 16),
    pseudo_channels: of(1, 2, 4),
    sids: of(1, 2, 4),
    bank_groups: of(1, 2, 4, 8),
    banks_per_group: of(1, 2, 4),
    rowBits: fc.integer({ min: 0, max: 14 }),
    columnBits: fc.integer({ min: 0, max: 6 }),
    burst_ck: of(1, 2, 4),
    atom_bytes: of(8, 32, 48, 64),
  })
  .map(({ rowBits, columnBits, ...o }) => {
    const bits = { column: columnBits, bank_group: o.bank_groups, bank: o.banks_per_group, sid: o.sids, row: rowBits };
    for (const name of ['bank_group', 'bank', 'sid'] as const) bits[name] = Math.log2(bits[name]);
    const counts = Object.entries({ ...o, rows: 2 ** rowBits, columns: 2 ** columnBits });
    return [
      `memory.0.organisation={ ${counts.map(([name, count]) => `${name}: ${count}`).join(', ')} }`,
      `address_map.fields=[${Object.entries(bits).map(([name, count]) => `${name}:${count}`)}]`,
      `address_map.granule=${o.atom_bytes} B`,
      `compute.0.request=${8 * o.atom_bytes} B`,
      `compute.1.request=${8 * o.atom_bytes} B`,
    ];
  });

const BASE = `
penstock: 1
name: two
compute:
  - { name: west, clock: 1.6 GHz, engines: 3, window: 16, peak: { bf16: 1 TFLOP/s } }
  - { name: east, clock: 1 GHz, engines: 2, window: 16, peak: { bf16: 1 TFLOP/s } }
memory:
  - { name: hbm, device: hbm3-6.4, stacks: 3 }
links:
  - { name: west, from: west, to: hbm.0-1, lanes: 64, rate: 16 GT/s }
  - { name: east, from: east, to: hbm.2, lanes: 64, rate: 16 GT/s }
address_map:
  interleave: [pseudo_channel, channel, stack]
  granule: 256 B
  fields: [column:3, bank_group:2, column:2, bank:2, sid:1, row:14]
`;

/** Reads and writes all over both dies' memory, few of them at the edges of atoms. */
function rows(pkg: Package, seed: number): Row[] {
  const places = domains(pkg);
  return Array.from({ length: 2000 }, (_, i) => {
    const { die, base, capacity } = places[i % 2];
    const at = (i * 2_654_435_761 + seed * 977) % Math.max(1, Math.min(capacity - 300, 2 ** 31));
    const bytes = Math.min(1 + ((i * 37) % 300), capacity - at);
    return { op: (i * seed) % 7 < 3 ? 'W' : 'R', address: base + at, bytes, die };
  });
}

const KERNELS = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile
a,s,bf16,1 GFLOP,4 KiB,4 KiB,sequential,uniform granule=64B,1 KiB
b,t,bf16,0,2 KiB,0,chase granule=64B span=4KiB,,
c,s,bf16,1 FLOP,8 KiB,1 KiB,zipf s=1.1 granule=64B span=8KiB,strided stride=96B,512 B
`;

it('a package of any values in range is refused as an InputError, or runs to its end', async () => {
  let ran = 0;
  let refused = 0;
  await fc.assert(
    fc.asyncProperty(
      fc.tuple(fc.option(shape, { nil: [] }), fc.array(override, { maxLength: 5 })),
      fc.integer({ min: 1, max: 1000 }),
      async ([device, changes], seed) => {
        let pkg: Package;
        try {
          pkg = parsePackage(BASE, 'ranges.yaml', [...device, ...changes]);
        } catch (error) {
          if (!(error instanceof InputError)) throw error;
          refused++;
          return;
        }
        const limit = { signal: AbortSignal.timeout(20_000) };
        const { recording } = await simulate(pkg, accessTrace(rows(pkg, seed)), limit);
        expect(recording.partial).toBe(false);
        expect(recording.checks.filter((check) => !check.ok)).toEqual([]);
        if (domains(pkg).every(({ capacity }) => capacity >= 2 ** 16)) {
          const kernels = await simulate(pkg, await kernelTrace(pkg, KERNELS), limit);
          expect(kernels.recording.partial).toBe(false);
          expect(kernels.recording.checks.filter((check) => !check.ok)).toEqual([]);
        }
        ran++;
      },
    ),
    { seed: 5, numRuns: 120 },
  );
  expect(ran).toBeGreaterThan(50);
  expect(refused).toBeGreaterThan(20);
}, 240_000);
