import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

const folder = new Folder();
const trace = folder.at('trace.csv');
beforeAll(async () => {
  await build();
  const made = await penstock([
    'synth',
    'uniform',
    'granule=64B',
    'span=1GiB',
    '--bytes',
    '1MiB',
    '--reads',
    '0.5',
    '-o',
    trace,
  ]);
  expect(made.code).toBe(0);
}, 120_000);
afterAll(() => folder.remove());

test('there and back again, in every form, and each runs to the same result', async () => {
  const results: string[] = [];
  for (const name of ['t.csv.gz', 't.parquet', 't.arrow']) {
    expect(await penstock(['convert', trace, folder.at(name)])).toMatchObject({
      code: 0,
      out: `${folder.at(name)}: 16,384 rows\n`,
      err: '',
    });
    expect(await penstock(['convert', folder.at(name), folder.at('back.csv')])).toMatchObject({ code: 0 });
    expect(readFileSync(folder.at('back.csv'), 'utf8')).toBe(readFileSync(trace, 'utf8'));
    const { code, out } = await penstock(['run', folder.at(name), '-p', WAGTAIL, '--json', '-']);
    expect(code).toBe(0);
    const { provenance, ...rest } = JSON.parse(out);
    expect(provenance.trace_rows).toBe(16_384);
    results.push(JSON.stringify(rest));
  }
  expect(new Set(results).size).toBe(1);
});

test('a captured trace becomes one of ours', async () => {
  writeFileSync(folder.at('capture.txt'), 'Kind;Addr\nLD;1f0\nST;2B40\n');
  const shape = ['--columns', 'op=Kind,address=Addr:hex,bytes==64', '--ops', 'read=LD,write=ST', '--delimiter', ';'];
  expect(await penstock(['convert', folder.at('capture.txt'), folder.at('c.csv'), ...shape])).toMatchObject({
    code: 0,
  });
  expect(readFileSync(folder.at('c.csv'), 'utf8')).toBe('op,address,bytes\nR,0x1f0,64\nW,0x2b40,64\n');
});

test('what cannot be done leaves nothing behind', async () => {
  writeFileSync(folder.at('bad.csv'), `op,address,bytes\n${'R,0,64\n'.repeat(10_000)}R,0,0\n`);
  const bad = await penstock(['convert', folder.at('bad.csv'), folder.at('never.parquet')]);
  expect(bad).toMatchObject({ code: 2, out: '', err: expect.stringContaining("bad.csv:10002:5: bytes: found '0'") });
  const form = await penstock(['convert', trace, folder.at('trace.xls')]);
  expect(form).toMatchObject({
    code: 2,
    err: expect.stringContaining('expected one that ends in .csv, .csv.gz, .csv.zst, .parquet or .arrow'),
  });
  writeFileSync(folder.at('mine.arrow'), 'precious');
  const other = await penstock(['convert', trace, folder.at('mine.arrow')]);
  expect(other).toMatchObject({ code: 2 });
  expect(readFileSync(folder.at('mine.arrow'), 'utf8')).toBe('precious');
  expect(existsSync(folder.at('never.parquet'))).toBe(false);
  expect(readdirSync(folder.path).filter((name) => name.endsWith('.tmp'))).toEqual([]);
});
