import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { loadPackage, openTrace, type Result, type STACK_CLASSES, simulate } from '../../src/index.js';
import { LIMITS } from '../../src/study/limits.js';
import type { WhatIf } from '../../src/study/whatif.js';
import { build, Folder } from '../cli/penstock.js';

// threads run the compiled program, so the study is taken from there too
let study: typeof import('../../src/study/index.js');
const folder = new Folder();
const [file, trace] = [folder.at('p.yaml'), folder.at('t.csv')];

const PACKAGE = `penstock: 1
name: small
compute:
  - { name: die, clock: 1.6 GHz, engines: 8, window: 24, buffering: 2, request: 256 B, peak: { bf16: 100 TFLOP/s } }
memory:
  - name: hbm
    device: hbm3-6.4
    stacks: 1
    refresh: { mode: all-bank }
    controller: { read_queue: 16, write_queue: 16 }
    base_die: { ingress: 5 ns, egress: 5 ns }
links:
  - { name: link, from: die, to: hbm.0, lanes: 256, rate: 16 GT/s, latency: 3 ns, landing: 32 KiB }
address_map:
  interleave: [pseudo_channel, channel, stack]
  granule: 256 B
  fields: [column:3, bank_group:2, column:2, bank:2, sid:1, row:14]
`;
const HEAD = 'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat,estimate_us\n';
const MIXED = `${HEAD}copy,main,bf16,20 MFLOP,1 MiB,512 KiB,sequential,sequential,16 KiB,1,
gather,main,,0,512 KiB,0,uniform granule=64B span=256MiB,,8 KiB,1,
`;

beforeAll(async () => {
  await build();
  study = await import(new URL('../../dist/study/index.js', import.meta.url).href);
  writeFileSync(file, PACKAGE);
  writeFileSync(trace, MIXED);
}, 120_000);
afterAll(() => folder.remove());

const job = { package: file, trace };
const ask = (over: Partial<Parameters<typeof study.whatIf>[1]> = {}): Promise<WhatIf> =>
  study.whatIf(job, { pairs: false, only: [], workers: 2, ...over });

async function run(text: string, rows: string, overrides: readonly string[] = []): Promise<Result> {
  const [p, t] = [folder.at('own.yaml'), folder.at('own.csv')];
  writeFileSync(p, text);
  writeFileSync(t, rows);
  const pkg = loadPackage(p, overrides);
  return simulate(pkg, await openTrace(t, { package: pkg }));
}

describe('what if', () => {
  let all: WhatIf;
  beforeAll(async () => {
    all = await ask();
  }, 120_000);

  test('ranks every limit of the package by the time saved, each against the run as it is', async () => {
    const base = await run(PACKAGE, MIXED);
    expect(all.makespan_ps).toBe(base.makespan_ps);
    expect(all.sentence).toBe(base.verdict.sentence);
    expect(all.lifted.map(({ limits: [key] }) => key).sort()).toEqual(LIMITS.map(({ key }) => key).sort());
    const saved = all.lifted.map(({ saved_ps }) => saved_ps);
    expect(saved).toEqual([...saved].sort((a, b) => b - a));
    for (const row of all.lifted) {
      expect(row.saved_ps).toBe(all.makespan_ps - row.makespan_ps);
      expect(row.saved_ratio).toBe(row.saved_ps / all.makespan_ps);
      expect(row.checks_ok).toBe(true);
    }
    expect(saved[0]).toBeGreaterThan(0);
    expect(all.everything?.saved_ps).toBeGreaterThan(saved[0]);
    expect(all.data_ps).toBe((base.bandwidth.moved_bytes / base.bandwidth.peak_bytes_per_s) * 1e12);
    expect(all.idle).toEqual([]);
    expect(all.partial).toBe(false);
  });

  // [limit, what stands in the file, what stands there instead]
  test.each([
    ['refresh', 'refresh: { mode: all-bank }', 'refresh: { mode: off }'],
    ['window', 'window: 24', 'window: 65536'],
    ['buffering', 'buffering: 2', 'buffering: 64'],
    ['compute', '100 TFLOP/s', '1000000000 PFLOP/s'],
    ['issue', 'window: 24', 'window: 24, issue_per_clock: 16'],
    ['link_rate', 'rate: 16 GT/s', 'rate: 1000 GT/s'],
    ['credits', 'landing: 32 KiB', 'landing: 1 GiB'],
    ['imbalance', '  granule: 256 B', '  granule: 256 B\n  rotate: true'],
    ['column_gap', '    stacks: 1', '    stacks: 1\n    timings: { tCCD_S: 2 ck, tCCD_L: 2 ck, tCCD_R: 2 ck }'],
    ['activate_window', '    stacks: 1', '    stacks: 1\n    timings: { tRRD_S: 0 ck, tRRD_L: 0 ck, tFAW: 0 ck }'],
    [
      'queues',
      'read_queue: 16, write_queue: 16',
      'read_queue: 4096, write_queue: 4096, drain_high: 3072, drain_low: 1024',
    ],
    [
      'row_cycle',
      '    stacks: 1',
      '    stacks: 1\n    timings: { tRC: 2 ck, tRAS: 1 ck, tRP: 1 ck, tRCDRD: 1 ck, tRCDWR: 1 ck, tRTP: 0 ck, tWR: 0 ck, tPPD: 0 ck }',
    ],
    // RL 26 ck and WL 10 ck become 1: 25 ck of 625 ps more on the way out, 9 ck more of write recovery (16 ns are 26 ck)
    [
      'turnaround',
      '    stacks: 1\n    refresh: { mode: all-bank }\n    controller: { read_queue: 16, write_queue: 16 }\n    base_die: { ingress: 5 ns, egress: 5 ns }',
      '    stacks: 1\n    timings: { RL: 1 ck, WL: 1 ck, tRTW: 0 ck, tWTR_S: 0 ck, tWTR_L: 0 ck, tWR: 35 ck }\n    controller: { read_queue: 16, write_queue: 16 }\n    base_die: { ingress: 5 ns, egress: 20625 ps }',
    ],
    [
      'banks', // 32 banks of 16,384 rows become 64 of 8,192
      '[column:3, bank_group:2, column:2, bank:2, sid:1, row:14]',
      '[column:3, bank_group:2, column:2, bank:3, sid:1, row:13]',
    ],
  ])('%s lifted is the run of a package edited by hand', async (key, from, to) => {
    expect(PACKAGE).toContain(from);
    let edited = PACKAGE.replace(from, to);
    if (key === 'banks')
      edited = edited.replace('    stacks: 1', '    stacks: 1\n    organisation: { banks_per_group: 8, rows: 8192 }');
    const by = await run(edited, MIXED);
    const row = all.lifted.find(({ limits }) => limits[0] === key);
    expect(row?.makespan_ps).toBe(by.makespan_ps);
    expect(row?.achieved_bytes_per_s).toBe(by.bandwidth.achieved_bytes_per_s);
    expect(row?.binds).toBe(by.verdict.binds);
    // and the hash of the package is the same but for the file's name, so nothing else was touched
    expect(loadPackage(file, row?.overrides ?? []).hash).toBe(by.provenance.package_hash);
  });

  test('how many threads there are does not show', async () => {
    expect(JSON.stringify(await ask({ workers: 1 }))).toBe(JSON.stringify(all));
  });

  test('what the package does not have is named and not run; --set stands under every run', async () => {
    const without = { ...job, overrides: ['memory.0.refresh.mode=off', 'compute.0.window=512'] };
    const found = await study.whatIf(without, { pairs: false, only: ['refresh', 'buffering'], workers: 1 });
    expect(found.idle).toEqual(['refresh']);
    expect(found.lifted.map(({ limits }) => limits)).toEqual([['buffering']]);
    const by = await run(PACKAGE, MIXED, [...without.overrides, 'compute.0.buffering=64']);
    expect(found.lifted[0].makespan_ps).toBe(by.makespan_ps);
    expect(found.everything?.makespan_ps).toBe(by.makespan_ps);
  });

  test('pairs: every two, ranked by what they save beyond the sum of each alone', async () => {
    const only = ['window', 'buffering', 'refresh'];
    const found = await ask({ pairs: true, only });
    expect(found.pairs).toHaveLength(3);
    const alone = new Map(found.lifted.map(({ limits: [key], saved_ps }) => [key, saved_ps]));
    for (const {
      limits: [a, b],
      saved_ps,
      together_ps,
    } of found.pairs) {
      expect(together_ps).toBe(saved_ps - (alone.get(a) ?? Number.NaN) - (alone.get(b) ?? Number.NaN));
    }
    const gains = found.pairs.map(({ together_ps }) => together_ps);
    expect(gains).toEqual([...gains].sort((a, b) => b - a));
    const pair = found.pairs.find(({ limits }) => limits.join() === 'window,buffering');
    const by = await run(
      PACKAGE.replace('window: 24', 'window: 65536').replace('buffering: 2', 'buffering: 64'),
      MIXED,
    );
    expect(pair?.makespan_ps).toBe(by.makespan_ps);
  });

  test('says how much there is to do before it begins', async () => {
    const said: string[] = [];
    await ask({
      only: ['refresh', 'window'],
      onPlan: (runs, threads, aboutMs) => said.push(`${runs} runs on ${threads}, ${aboutMs > 0}`),
      onRun: (done) => said.push(`${done}`),
    });
    expect(said).toEqual(['3 runs on 2, true', '1', '2', '3']); // two limits and both together
  });

  test('what fails in a run ends it, as its own kind of error; an interrupt leaves what was done', async () => {
    await expect(
      study.whatIf({ ...job, trace: folder.at('absent.csv') }, { pairs: false, only: [], workers: 2 }),
    ).rejects.toThrow(/absent\.csv/);
    const stop = new AbortController();
    const found = await ask({ workers: 1, signal: stop.signal, onRun: (done) => done === 2 && stop.abort() });
    expect(found.partial).toBe(true);
    expect(found.lifted).toHaveLength(2);
    expect(found.everything).toBeNull();
  });
});

describe('everything lifted', () => {
  // addresses that fall evenly: what chance or one hot address makes uneven no package can mend
  test.each([
    ['a copy', 'copy,main,,0,6 MiB,6 MiB,sequential,sequential,64 KiB,1,'],
    ['reads alone', 'sum,main,bf16,1 GFLOP,8 MiB,0,sequential,,64 KiB,1,'],
    [
      'blocks of two matrices',
      'product,main,bf16,9 GFLOP,8 MiB,2 MiB,block rows=32 width=256B pitch=4KiB,sequential,64 KiB,1,',
    ],
    [
      'kernel after kernel',
      'a,main,,0,6 MiB,6 MiB,sequential,sequential,64 KiB,1,\nb,main,,0,8 MiB,0,sequential,,64 KiB,1,',
    ],
  ])('%s reaches its roofline bound within 1 %', async (_, rows) => {
    const pkg = loadPackage(file);
    const overrides = LIMITS.flatMap((limit) => limit.overrides(pkg));
    const base = await run(PACKAGE, `${HEAD}${rows}\n`);
    const free = await run(PACKAGE, `${HEAD}${rows}\n`, overrides);
    // with refresh, links and compute lifted the bound that is left is the DRAM peak
    const boundPs = (free.bandwidth.moved_bytes / free.bandwidth.bound_bytes_per_s) * 1e12;
    expect(free.bandwidth.bound_bytes_per_s).toBe(base.bandwidth.peak_bytes_per_s);
    expect(free.makespan_ps / boundPs).toBeGreaterThanOrEqual(1);
    expect(free.makespan_ps / boundPs).toBeLessThan(1.01);
    expect(base.makespan_ps / boundPs).toBeGreaterThan(1.05); // there was something to lift
  });
});

describe('a limit lifted takes its class of the bandwidth stack away', () => {
  // [limit, class, kernel in which that class takes a share, overrides that make it so]
  const cases: [string, (typeof STACK_CLASSES)[number], string, string[]][] = [
    ['refresh', 'refresh', 'k,main,,0,4 MiB,0,sequential,,16 KiB,1,', []],
    // without refresh: whether one falls into so short a run is worth more than all turnarounds
    ['turnaround', 'turnaround', 'k,main,,0,2 MiB,2 MiB,sequential,sequential,2 KiB,1,', ['memory.0.refresh.mode=off']],
    ['row_cycle', 'row_cycle', 'k,main,,0,1 MiB,0,uniform granule=64B span=1GiB,,8 KiB,1,', []],
    [
      'activate_window',
      'activate_window',
      'k,main,,0,1 MiB,0,uniform granule=32B span=1GiB,,8 KiB,1,',
      ['memory.0.timings.tFAW=60 ns', 'memory.0.controller.read_queue=64', 'compute.0.window=512'],
    ],
    ['column_gap', 'column_gap', 'k,main,,0,4 MiB,0,sequential,,16 KiB,1,', ['compute.0.window=512']],
    ['window', 'starved_window', 'k,main,,0,1 MiB,0,sequential,,64 KiB,1,', ['compute.0.window=4']],
    ['compute', 'starved_compute', 'k,main,bf16,2 GFLOP,1 MiB,0,sequential,,8 KiB,1,', []],
    ['link_rate', 'starved_down_link', 'k,main,,0,0,2 MiB,,sequential,16 KiB,1,', ['links.0.lanes=32']],
    [
      'credits',
      'starved_up_link',
      'k,main,,0,2 MiB,0,sequential,,16 KiB,1,',
      ['links.0.landing=1 KiB', 'links.0.latency=50 ns'],
    ],
    [
      'imbalance',
      'starved_imbalance',
      'k,main,,0,1 MiB,0,strided stride=16KiB granule=256B,,16 KiB,1,',
      ['compute.0.window=512', 'compute.0.buffering=8', 'links.0.lanes=1024', 'links.0.landing=1 MiB'],
    ],
  ];
  test.each(cases)('%s', async (key, name, row, overrides) => {
    const limit = LIMITS.find((candidate) => candidate.key === key);
    const share = ({ bandwidth_stack: stack }: Result): number => stack[name] / stack.total;
    const rows = `${HEAD}${row}\n`;
    const base = await run(PACKAGE, rows, overrides);
    const lifts = limit?.overrides(loadPackage(file, overrides)) ?? [];
    const free = await run(PACKAGE, rows, [...overrides, ...lifts]);
    expect(share(base)).toBeGreaterThan(0.02);
    expect(free.bandwidth_stack[name]).toBeLessThan(base.bandwidth_stack[name] / 5);
    expect(free.makespan_ps).toBeLessThan(base.makespan_ps);
  });
});
