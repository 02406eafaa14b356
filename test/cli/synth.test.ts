import { existsSync, readFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it, test } from 'vitest';
import { loadPackage, openTrace, simulate } from '../../src/index.js';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

const folder = new Folder();
beforeAll(build, 120_000);
afterAll(() => folder.remove());

/** Small sizes of every mix: enough that not all engines end together. */
const MIXES = [
  'matmul m=200 n=260 k=100',
  'matvec m=500 n=500',
  'prefill tokens=300 heads=4 kv_heads=2',
  'decode batch=2 context=500',
  'norm rows=100 width=512',
  'embedding tokens=200 width=256',
  'experts tokens=4 experts=8 top_k=2 width=256 hidden=64',
  'convolution height=20 width=20 channels=32 filters=48',
  'stencil nx=40 ny=30 nz=20',
  'transpose rows=300 columns=200',
  'permutation elements=4000',
  'spmv rows=2000',
  'reduction elements=100000 tile=4096',
  'ring elements=20000',
];

describe('a mix runs on a package, which moves and computes what it says', () => {
  it.each(MIXES)('%s', async (text) => {
    const file = folder.at('mix.csv');
    const made = await penstock(['synth', ...text.split(' '), '-p', WAGTAIL, '-o', file]);
    expect(made).toMatchObject({ code: 0, err: '' });
    const pkg = loadPackage(WAGTAIL);
    const result = await simulate(pkg, await openTrace(file, { package: pkg }));
    expect(result.checks.filter((check) => !check.ok)).toEqual([]);
    // the same sums from the file itself: op,address,bytes,die,engine,kernel,tile,flops
    const rows = readFileSync(file, 'utf8').trim().split('\n').slice(1);
    const sum = (column: number): number => rows.reduce((total, row) => total + Number(row.split(',')[column]), 0);
    expect(result.kernels.reduce((total, { flops }) => total + flops, 0)).toBe(sum(7));
    expect(result.kernels.reduce((total, { useful_bytes }) => total + useful_bytes, 0)).toBe(sum(2));
    expect(new Set(rows.map((row) => row.split(',')[3])).size).toBe(2);
  });
});

test('says what a mix asks for, and writes it in every form', async () => {
  const matmul = 'synth matmul m=256 n=256 k=256 -p'.split(' ');
  const csv = await penstock([...matmul, WAGTAIL, '-o', folder.at('m.csv')]);
  // 2 x 256^3; A and B each read twice in bf16; C written once
  expect(csv.out).toContain('matmul: 33.6 MFLOP, reads 512.0 KiB, writes 128.0 KiB, 51.2 FLOP/B');
  for (const name of ['m.csv.gz', 'm.csv.zst', 'm.parquet', 'm.arrow']) {
    expect(await penstock([...matmul, WAGTAIL, '-o', folder.at(name)])).toMatchObject({ code: 0, err: '' });
    expect(await penstock(['convert', folder.at(name), folder.at('back.csv')])).toMatchObject({ code: 0, err: '' });
    expect(readFileSync(folder.at('back.csv'), 'utf8')).toBe(readFileSync(folder.at('m.csv'), 'utf8'));
  }
});

test('a mix as kernels is a kernel trace that runs', async () => {
  const file = folder.at('k.csv');
  const made = await penstock(['synth', 'decode', 'batch=2', 'context=256', '--as', 'kernels', '-o', file]);
  expect(made).toMatchObject({ code: 0, err: '' });
  expect(readFileSync(file, 'utf8')).toMatch(/^kernel,stream,.*\ndecode,main,bf16,/);
  expect(await penstock(['run', file, '-p', WAGTAIL])).toMatchObject({ code: 0, err: '' });
  // and is replaced by another, but an access trace is not
  expect(await penstock(['synth', 'norm', '--as', 'kernels', '-o', file])).toMatchObject({ code: 0 });
  const other = await penstock(['synth', 'norm', 'rows=4', '-o', file]);
  expect(other).toMatchObject({ code: 2, err: expect.stringContaining('found a file that is not an access trace') });
});

test.each([
  [['sequential'], '--bytes: found none; expected the bytes to ask for in all'],
  [['matmul', '--bytes', '1MiB'], "--bytes: found '1MiB'; expected none. the sizes of a mix are its parameters"],
  [['sequential', '--bytes', '1MiB', '--dies', '2'], "--dies: found '2'; expected none. a pattern names neither"],
  [['matmul', 'k=0'], "synth: k: found '0'; expected a whole number from 1 up"],
  [['ring', '--dies', '2', '--as', 'kernels'], '--as: found kernels; expected accesses, for this mix'],
  [['matmull', '--bytes', '1MiB'], "unknown pattern 'matmull'"],
])('%j is refused', async (words, message) => {
  const { code, out, err } = await penstock(['synth', ...words, '-o', folder.at('never.csv')]);
  expect({ code, out }).toEqual({ code: 2, out: '' });
  expect(err).toContain(message);
  expect(existsSync(folder.at('never.csv'))).toBe(false);
});
