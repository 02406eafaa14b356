import fc from 'fast-check';
import { expect, it } from 'vitest';
import { stringify } from 'yaml';
import { packageJsonSchema, parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import { InputError } from '../../src/errors.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';

/*
 * A package that writes out every key there is, changed part by part: numbers scaled, units swapped, words of other keys, parts
 * left out or doubled. Most changes are small, so many results are odd packages that must run, not only broken ones.
 */

const link = { lanes: 512, rate: '16 GT/s', flit: '256 B', flit_overhead: '16 B', request_header: '16 B' };
const answer = { response_header: '16 B', ack: '8 B', latency: '3 ns', landing: '4096 B' };
const die = { clock: '1.6 GHz', engines: 4, window: 16, issue_per_clock: 1, buffering: 3, request: '256 B' };
const rest = { peak: { fp8: '2 TFLOP/s' }, edge: '32 mm' };
const WHOLE = {
  penstock: 1,
  name: 'whole',
  caution: 'invented',
  compute: [
    { name: 'west', ...die, ...rest },
    { name: 'east', ...die, ...rest },
  ],
  memory: [
    {
      name: 'hbm',
      device: 'hbm3-6.4',
      stacks: 4,
      clock: '1.6 GHz',
      organisation: {
        channels: 2,
        pseudo_channels: 2,
        sids: 2,
        bank_groups: 4,
        banks_per_group: 4,
        rows: 16384,
        columns: 32,
        burst_ck: 2,
        atom_bytes: 32,
      },
      timings: {
        ...{ tRC: '45 ns', tRAS: '29 ns', tRP: '16 ns', tRCDRD: '16 ns', tRCDWR: '12 ns', tRTP: '5 ns', tWR: '16 ns' },
        ...{
          tRRD_S: '4 ck',
          tRRD_L: '6 ck',
          tFAW: '16 ns',
          tWTR_S: '3 ns',
          tWTR_L: '8 ns',
          tPPD: '2 ck',
          tRTW: '2 ck',
        },
        ...{ tCCD_S: '2 ck', tCCD_L: 'max(4 ck, 2.5 ns)', tCCD_R: '3 ck', RL: '16 ns', WL: '10 ck' },
        ...{ tRFCab: '350 ns', tRFCpb: '200 ns', tREFI: '1500 ns', tRREFD: '8 ns' },
      },
      activate_window_scope: 'pseudo_channel',
      command_buses: { separate: true, act: '1.5 ck', precharge: '0.5 ck', refresh: '0.5 ck', column: '1 ck' },
      refresh: { mode: 'all-bank', scope: 'pseudo_channel', postpone: 8, pull_in: 8, temperature: '70 C' },
      controller: {
        ...{ read_queue: 16, write_queue: 16, scheduler: 'fr-fcfs', hit_cap: 32, age_bound: '2 us', page: 'open' },
        ...{ page_timeout: '200 ns', drain_high: 12, drain_low: 4, pipeline: '5 ns' },
      },
      base_die: { ingress: '6 ns', egress: '6 ns' },
    },
  ],
  links: [
    { name: 'west', from: 'west', to: 'hbm.0-1', ...link, ...answer },
    { name: 'east', from: 'east', to: 'hbm.2-3', ...link, ...answer },
  ],
  address_map: {
    interleave: ['pseudo_channel', 'channel', 'stack'],
    granule: '256 B',
    rotate: false,
    fields: ['column:3', 'bank_group:2', 'column:2', 'bank:2', 'sid:1', 'row:14'],
    xor: { 'bank_group.0': ['row.0', 'row.4'], 'bank.0': ['row.2'] },
  },
};

type Path = readonly (string | number)[];
type Holder = Record<string | number, unknown>;
const isHolder = (value: unknown): value is Holder => typeof value === 'object' && value !== null;

const PARTS: Path[] = []; // every value, list item and map
const ENDS: Path[] = []; // those that hold nothing further
(function walk(value: unknown, path: Path): void {
  if (path.length > 0) PARTS.push(path);
  if (!isHolder(value)) ENDS.push(path);
  else for (const key of Object.keys(value)) walk(value[key], [...path, Array.isArray(value) ? Number(key) : key]);
})(WHOLE, []);

/** What stands in a place becomes something else; `undefined` leaves it out. */
type Turn = (was: unknown) => unknown;
interface Change {
  readonly says: string;
  readonly path: Path;
  readonly turn: Turn | 'double' | 'leave out';
}

const NUMBER = /^(-?\d*\.?\d+)(.*)$/;
function scaled(was: unknown, factor: number): unknown {
  const match = NUMBER.exec(String(was));
  if (match === null) return was;
  const value = Number((Number(match[1]) * factor).toPrecision(6));
  if (typeof was === 'number') return Math.round(value);
  return `${/^ (ck|B)$/.test(match[2]) ? Math.round(value) : value}${match[2]}`;
}
function withUnit(was: unknown, unit: string): unknown {
  const match = NUMBER.exec(String(was));
  return match === null ? was : `${match[1]} ${unit}`;
}

const oneOf = <T>(...values: readonly T[]): fc.Arbitrary<T> => fc.constantFrom(...values);
const end = oneOf(...ENDS);
const part = oneOf(...PARTS);
const turned = (name: string, path: fc.Arbitrary<Path>, by: fc.Arbitrary<unknown>, turn: (by: unknown) => Turn) =>
  fc.tuple(path, by).map(([at, value]): Change => ({ says: `${name} ${String(value)}`, path: at, turn: turn(value) }));

const change: fc.Arbitrary<Change> = fc.oneof(
  {
    weight: 6,
    arbitrary: turned(
      'times',
      end,
      oneOf(0, 0.01, 0.1, 0.25, 0.5, 0.9, 1.1, 1.5, 2, 3, 4, 10, 100),
      (by) => (was) => scaled(was, by as number),
    ),
  },
  { weight: 1, arbitrary: turned('number', end, oneOf(0, 1, 2, 3, 7, 33, 4096, 1.5, -1, 1e9), (by) => () => by) },
  {
    weight: 1,
    arbitrary: turned(
      'unit',
      end,
      oneOf('ns', 'ck', 'us', 'GHz', 'B', 'KiB', 'GT/s', 'C', 'mm', ''),
      (by) => (was) => withUnit(was, by as string),
    ),
  },
  {
    weight: 2,
    arbitrary: turned(
      'word',
      end,
      oneOf<unknown>(
        ...['off', 'per-bank', 'sid', 'fcfs', 'closed', 'timeout', 'hbm2-1.8', 'hbm.0', 'hbm.0-3', 'west', 'row:0', ''],
        ...[null, true, false, [], {}],
      ),
      (by) => () => by,
    ),
  },
  {
    weight: 2,
    arbitrary: fc
      .tuple(part, oneOf('double' as const, 'leave out' as const))
      .map(([path, turn]) => ({ says: turn, path, turn })),
  },
);

function apply(whole: unknown, { path, turn }: Change): void {
  let at: unknown = whole;
  for (const step of path.slice(0, -1)) at = isHolder(at) ? at[step] : undefined;
  if (!isHolder(at)) return; // an earlier change took it away
  const key = path[path.length - 1];
  if (typeof turn === 'function') at[key] = turn(at[key]);
  else if (turn === 'leave out' && Array.isArray(at)) at.splice(Number(key), 1);
  else if (turn === 'leave out') delete at[key];
  else if (Array.isArray(at)) at.splice(Number(key), 0, at[Number(key)]);
  else at[`${key}s`] = at[key]; // a key of nearly that name
}

/** Reads and writes, half of them one after the other and half of them far apart, to the end of all memory. */
function rowsFor(pkg: Package): Row[] {
  const [{ organisation: o }] = pkg.memory;
  const banks = o.stacks * o.channels * o.pseudo_channels * o.sids * o.bank_groups * o.banks_per_group;
  const capacity = banks * o.rows * o.columns * o.atom_bytes;
  return Array.from({ length: 500 }, (_, i): Row => {
    const bytes = Math.min(capacity, 1 + ((i * 13) % 299));
    const address = (i % 2 ? i * 40 : i * 7919 * 4096) % Math.max(1, capacity - bytes);
    return { op: (i * 7) % 11 < 4 ? 'W' : 'R', address, bytes, timePs: i * 3000 };
  });
}

it('a package with any of its parts changed is refused with a place, or runs', async () => {
  let ran = 0;
  let refused = 0;
  await fc.assert(
    fc.asyncProperty(
      fc.array(change, { minLength: 1, maxLength: 4 }),
      oneOf('closed' as const, 'open' as const, 'paced' as const),
      async (changes, replay) => {
        const whole = structuredClone(WHOLE);
        for (const one of changes) apply(whole, one);
        let pkg: Package;
        try {
          pkg = parsePackage(stringify(whole), 'whole.yaml');
        } catch (error) {
          if (!(error instanceof InputError)) throw error;
          expect(error.message).toMatch(/^whole\.yaml:\d+:\d+: .*found .+; expected .+/);
          refused++;
          return;
        }
        expect(Object.isFrozen(pkg)).toBe(true);
        ran++;
        try {
          const { recording } = await simulate(pkg, accessTrace(rowsFor(pkg)), { untilPs: 2e9, replay });
          expect(recording.checks.filter(({ ok }) => !ok)).toEqual([]);
          expect(recording.partial).toBe(false); // however slow: the rows take some 2 us, and 2 ms are given
        } catch (error) {
          if (!(error instanceof InputError)) throw error; // the trace may not fit the package
        }
      },
    ),
    { seed: 11, numRuns: 400 },
  );
  expect(ran).toBeGreaterThan(80);
  expect(refused).toBeGreaterThan(150);
}, 120_000);

/** Keys of a schema, and of what its lists hold, as dotted paths; those of maps with keys of the user's own are left out. */
function keysOf(schema: Holder, path: string): string[] {
  const { items, properties } = schema;
  if (isHolder(items)) return keysOf(items, `${path}.0`);
  if (!isHolder(properties)) return [];
  return Object.entries(properties).flatMap(([key, below]) => {
    const at = path === '' ? key : `${path}.${key}`;
    return [at, ...keysOf(below as Holder, at)];
  });
}

it('the package it starts from is good, and writes out every key that a package can have', () => {
  expect(parsePackage(stringify(WHOLE), 'whole.yaml').dies).toHaveLength(2);
  const keys = keysOf(packageJsonSchema() as Holder, '').filter((key) => key !== 'extends');
  expect(keys.length).toBeGreaterThan(90);
  const written = new Set(PARTS.map((path) => path.join('.')));
  expect(keys.filter((key) => !written.has(key))).toEqual([]);
});
