import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { TABLE_NAMES } from '../../src/report/index.js';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

let folder: Folder;
let trace: string;
beforeAll(async () => {
  folder = new Folder();
  trace = folder.at('t.csv');
  writeFileSync(trace, 'op,address,bytes\nR,0,4096\nW,8192,4096\n');
  await build();
}, 120_000);
afterAll(() => folder.remove());

const run = (...args: string[]) => penstock(['run', trace, '-p', WAGTAIL, ...args]);

describe('report files', () => {
  test('--html: the path is the last line said, the page is whole, and is replaced by the next', async () => {
    const file = folder.at('r.html');
    const first = await run('--html', file);
    expect(first).toMatchObject({ code: 0, err: '' });
    expect(first.out.trimEnd().split('\n').at(-1)).toBe(`HTML report: ${file}`);
    const page = readFileSync(file, 'utf8');
    expect(page).toMatch(/^<!doctype html>[\s\S]*<\/html>\n$/);
    expect((await run('--html', file)).code).toBe(0);
    expect(readFileSync(file, 'utf8')).toBe(page); // equal runs, equal bytes
  });

  test('--html does not replace a page of someone else', async () => {
    writeFileSync(folder.at('mine.html'), '<!doctype html><title>mine</title>');
    const ended = await run('--html', folder.at('mine.html'));
    expect(ended.code).toBe(2);
    expect(ended.err).toMatch(/a file that is not a penstock HTML report/);
    expect(readFileSync(folder.at('mine.html'), 'utf8')).toContain('mine');
  });

  test('with --json - standard output is the document alone', async () => {
    const ended = await run('--json', '-', '--html', folder.at('j.html'), '--csv', folder.at('j'));
    expect(ended.code).toBe(0);
    expect(JSON.parse(ended.out).format).toBe('penstock-result');
    expect(readdirSync(folder.at('j')).sort()).toEqual([...TABLE_NAMES].sort());
  });

  test('--csv where a file stands: nothing is run, nothing is written', async () => {
    const ended = await run('--csv', trace, '--html', folder.at('not.html'));
    expect(ended).toMatchObject({ code: 4, out: '' });
    expect(ended.err).toMatch(/t\.csv: the tables cannot be written: it is no folder/);
    expect(readdirSync(folder.path)).not.toContain('not.html');
    expect(readdirSync(folder.path).filter((name) => name.endsWith('.tmp'))).toEqual([]);
  });
});
