import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { gunzipSync, gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { build, Folder, penstock, ROOT, WAGTAIL } from './penstock.js';

let folder: Folder;
let trace: string;

beforeAll(async () => {
  folder = new Folder();
  trace = folder.at('mixed.csv');
  await build();
  const made = await penstock([
    'synth',
    'uniform',
    'granule=64B',
    'span=64MiB',
    '--bytes',
    '256KiB',
    '--reads',
    '0.7',
    '--out',
    trace,
  ]);
  expect(made).toEqual({ code: 0, signal: null, out: '', err: '' });
}, 120_000);
afterAll(() => folder.remove());

const run = (...args: string[]) => penstock(['run', '-p', WAGTAIL, ...args]);

describe('synth', () => {
  test('writes what was asked for, and the same again for the same seed', async () => {
    const rows = readFileSync(trace, 'utf8').trimEnd().split('\n');
    expect(rows[0]).toBe('op,address,bytes');
    expect(rows).toHaveLength(1 + (256 * 1024) / 64);
    const reads = rows.filter((row) => row.startsWith('R')).length;
    expect(reads / (rows.length - 1)).toBeGreaterThan(0.65); // 0.7 +- 6 standard deviations of 4096 draws
    expect(reads / (rows.length - 1)).toBeLessThan(0.75);
    const words = ['synth', 'uniform granule=64B span=64MiB', '--bytes=256KiB', '--reads=0.7', '--out=-'];
    expect((await penstock(words)).out).toBe(readFileSync(trace, 'utf8'));
    expect((await penstock([...words, '--seed', '2'])).out).not.toBe(readFileSync(trace, 'utf8'));
  });

  test('.csv.gz holds the same text; --base and --request are kept to', async () => {
    const zipped = folder.at('s.csv.gz');
    const made = await penstock([
      'synth',
      'sequential',
      '--bytes',
      '1KiB',
      '--request',
      '128B',
      '--base',
      '0x1000',
      '-o',
      zipped,
    ]);
    expect(made.code).toBe(0);
    expect(gunzipSync(readFileSync(zipped)).toString().split('\n').slice(0, 3)).toEqual([
      'op,address,bytes',
      'R,0x1000,128',
      'R,0x1080,128',
    ]);
  });
});

describe('run', () => {
  test('reports, without colour where nobody looks, in 100 columns', async () => {
    const { code, out, err } = await run(trace);
    expect(code).toBe(0);
    expect(err).toBe('');
    expect(out).toContain('Bandwidth');
    expect(out).not.toContain('\u001b');
    for (const line of out.split('\n')) expect([...line].length).toBeLessThanOrEqual(100);
  });

  test('equal runs write equal bytes; another seed, override or replay is said in the document', async () => {
    const [a, b, c] = [folder.at('a.json'), folder.at('b.json'), folder.at('c.json')];
    expect((await run(trace, '--json', a)).code).toBe(0);
    expect((await run(trace, '--json', b)).code).toBe(0);
    expect((await run(trace, '--json', c, '--set', 'memory.0.controller.page=closed', '--seed', 'x')).code).toBe(0);
    expect(readFileSync(a)).toEqual(readFileSync(b));
    const [first, other] = [a, c].map((file) => JSON.parse(readFileSync(file, 'utf8')));
    expect(first.provenance.seed).toBe('1');
    expect(other.provenance.seed).toBe('x');
    expect(other.provenance.options.overrides).toEqual(['memory.0.controller.page=closed']);
    expect([first, other].map((result) => result.package.memory[0].controller.page)).toEqual(['open', 'closed']);
    expect(other.dram).not.toEqual(first.dram);
    expect(first.bandwidth.useful_bytes).toBe(256 * 1024);
    expect(first.partial).toBe(false);
  });

  test('--json - gives the document alone; from standard input it is the same but for the name', async () => {
    const fromFile = await run(trace, '--json', '-');
    const piped = await penstock(['run', '-', '-p', WAGTAIL, '--json', '-'], { input: readFileSync(trace, 'utf8') });
    expect(piped.code).toBe(0);
    expect(JSON.parse(piped.out).provenance.trace_file).toBe('-');
    expect(piped.out.replace('"trace_file": "-"', `"trace_file": ${JSON.stringify(trace)}`)).toBe(fromFile.out);
  });

  test('replaces its own result, and refuses any other file before it computes', async () => {
    const file = folder.at('own.json');
    expect((await run(trace, '--json', file)).code).toBe(0);
    expect((await run(trace, '--json', file)).code).toBe(0);
    const copy = folder.at('copy.csv');
    writeFileSync(copy, readFileSync(trace));
    for (const option of ['--json', '--command-log']) {
      const refused = await run(trace, option, copy);
      expect(refused).toMatchObject({ code: 2, out: '' });
      expect(refused.err).toMatch(/copy\.csv: found a file that is not a (penstock result|command log)/);
    }
    expect(readFileSync(copy)).toEqual(readFileSync(trace));
  });

  test('a place that cannot be written is the system’s failure', async () => {
    mkdirSync(folder.at('dir'), { recursive: true });
    for (const [place, says] of [
      [folder.at('dir'), 'it is a directory'],
      [folder.at('none/r.json'), 'there is no folder'],
    ]) {
      const ended = await run(trace, '--json', place);
      expect(ended).toMatchObject({ code: 4, out: '' });
      expect(ended.err).toContain(says);
    }
  });

  test.skipIf(!existsSync('/dev/full'))(
    'a full disk under the command log ends the run, and leaves no other file',
    async () => {
      const json = folder.at('full.json');
      const ended = await run(trace, '--json', json, '--command-log', '/dev/full');
      expect(ended.code).toBe(4);
      expect(ended.err).toContain('/dev/full: cannot be written: no space left on the disk (ENOSPC)');
      expect(readdirSync(folder.path).filter((name) => name.includes('full.json'))).toEqual([]);
    },
  );

  test('--until stops early and says so', async () => {
    const { code, out } = await run(trace, '--until', '100ns', '--json', '-');
    const result = JSON.parse(out);
    expect(code).toBe(0);
    expect(result.partial).toBe(true);
    expect(result.makespan_ps).toBeLessThanOrEqual(100_000);
    expect(result.provenance.options.until_ps).toBe(100_000);
  });

  test('a trace that goes wrong half way leaves no file; bad rows may be skipped and are counted', async () => {
    const bad = folder.at('bad.csv');
    writeFileSync(bad, `${readFileSync(trace, 'utf8')}R,zero,64\n`);
    const ended = await run(bad, '--json', folder.at('bad.json'), '--command-log', folder.at('badlog.csv'));
    expect(ended).toMatchObject({ code: 2, out: '' });
    expect(ended.err).toContain(`${bad}:4098`);
    expect(readdirSync(folder.path).filter((name) => /bad\.json|badlog/.test(name))).toEqual([]);
    const skipped = await run(bad, '--skip-bad-rows', '1', '--json', '-');
    expect(skipped.code).toBe(0);
    expect(JSON.parse(skipped.out).provenance.skipped_rows).toBe(1);
  });

  test('recorded times are kept in open replay, and --clock gives column cycle its unit', async () => {
    const timed = folder.at('timed.csv');
    const rows = Array.from({ length: 20 }, (_, i) => `R,${i * 4096},64,${i * 1000}`);
    writeFileSync(timed, `op,address,bytes,cycle\n${rows.join('\n')}\n`);
    const unknown = await run(timed, '--replay', 'open');
    expect(unknown.code).toBe(2);
    const { code, out } = await run(timed, '--replay', 'open', '--clock', '2GHz', '--json', '-');
    expect(code).toBe(0);
    const last = (19 * 1000 * 1e12) / 2e9; // arrival of the last row, ps
    expect(JSON.parse(out).makespan_ps).toBeGreaterThan(last);
    expect(JSON.parse(out).makespan_ps).toBeLessThan(last + 1e6);
  });

  test('NO_COLOR and FORCE_COLOR do not change what goes into a pipe', async () => {
    const plain = await run(trace);
    for (const env of [{ NO_COLOR: '1' }, { FORCE_COLOR: '1' }]) {
      expect((await penstock(['run', trace, '-p', WAGTAIL], { env: env as Record<string, string> })).out).toBe(
        plain.out,
      );
    }
  });
});

describe('a command log', () => {
  const HEADER = 'ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,request';

  test('has the commands the result counts, and .gz holds the same', async () => {
    const [plain, zipped] = [folder.at('log.csv'), folder.at('log.csv.gz')];
    const { code, out } = await run(trace, '--command-log', plain, '--json', '-');
    expect(code).toBe(0);
    const { dram } = JSON.parse(out);
    const [header, ...rows] = readFileSync(plain, 'utf8').trimEnd().split('\n');
    expect(header).toBe(HEADER);
    const count = (...names: string[]) => rows.filter((row) => names.includes(row.split(',')[9])).length;
    expect(count('ACT')).toBe(dram.activates);
    expect(count('RD', 'RDA')).toBe(dram.reads);
    expect(count('WR', 'WRA')).toBe(dram.writes);
    for (const row of rows) expect(row).toMatch(/^\d+(\.5)?,\d+,\d+,\d+,\d*,\d*,\d*,\d*,\d*,[A-Za-z]+,\d*$/);
    expect((await run(trace, '--command-log', zipped)).code).toBe(0);
    expect(gunzipSync(readFileSync(zipped))).toEqual(readFileSync(plain));
    expect(readFileSync(zipped).length).toBeLessThan(gzipSync(readFileSync(plain)).length * 1.5);
  });
});

test('the demo named in package.json is there', () => {
  const { scripts } = JSON.parse(readFileSync(join(ROOT, 'package.json'), 'utf8'));
  for (const file of scripts.start.split(' ').filter((word: string) => /^(traces|configs)\//.test(word))) {
    expect(existsSync(join(ROOT, file))).toBe(true);
  }
});
