import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { readFileSync, truncateSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { gunzipSync, gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { build, Folder, penstock, ROOT, WAGTAIL } from './penstock.js';

const folder = new Folder();
const log = folder.at('log.csv');
const zipped = folder.at('log.csv.gz');

beforeAll(async () => {
  await build();
  const trace = folder.at('trace.csv');
  await penstock(['synth', 'uniform', 'granule=64B', 'span=1GiB', '--bytes', '2MiB', '--reads', '0.6', '-o', trace]);
  for (const file of [log, zipped]) {
    const { code } = await penstock(['run', trace, '-p', WAGTAIL, '--command-log', file]);
    expect(code).toBe(0);
  }
}, 120_000);
afterAll(() => folder.remove());

const audit = (file: string, ...more: string[]) => penstock(['audit', file, '-p', WAGTAIL, ...more]);

describe('the log of a run', () => {
  test('keeps every rule, plain or gzipped, from a file or standard input', async () => {
    const text = readFileSync(log, 'utf8');
    expect(gunzipSync(readFileSync(zipped)).toString()).toBe(text);
    const rows = text.trimEnd().split('\n').length - 1;
    expect(rows).toBeGreaterThan(65_536); // 2 MiB are 65,536 atoms, each a column command of its own
    for (const ended of [
      await audit(log),
      await audit(zipped),
      await penstock(['audit', '-', '-p', WAGTAIL], { input: text }),
    ]) {
      expect(ended).toMatchObject({ code: 0, err: '' });
      expect(ended.out).toMatch(
        new RegExp(
          `^${rows.toLocaleString('en-US')} commands from ck [\\d.]+ to ck [\\d.]+ \\([\\d.]+ us\\): none breaks any of 34 rules\\.\\n[\\d,]+ ACT, .*[\\d,]+ RD, .*\\.\\n$`,
        ),
      );
    }
    const { out, code } = await audit(log, '--json');
    expect(code).toBe(0);
    const report = JSON.parse(out);
    expect(report).toMatchObject({ format: 'penstock-audit', ok: true, partial: false, commands: rows, violations: 0 });
    expect(Object.values<number>(report.commands_by_name).reduce((sum, n) => sum + n, 0)).toBe(rows);
    const { RD, RDA, WR, WRA } = report.commands_by_name;
    // a read of what still waits to be written is answered from the queue, without a command
    expect(65_536 - (RD + RDA + WR + WRA)).toBeGreaterThanOrEqual(0);
    expect(65_536 - (RD + RDA + WR + WRA)).toBeLessThan(65);
  });

  test('breaks a rule that is longer than the one it was run with', async () => {
    const { code, out } = await audit(
      log,
      '--set',
      'memory.0.timings.tRP=40ns',
      '--set',
      'memory.0.timings.tRC=80ns',
      '--show',
      '2',
    );
    expect(code).toBe(1);
    expect(out).toMatch(/^[\d,]+ violations of \d+ rules in [\d,]+ commands/);
    expect(out).toMatch(
      /line \d+: ck [\d.]+ ACT stack \d channel \d+\.\d .*\n {4}tRP: at least 64 ck, found [\d.]+\n {4}after line \d+: ck [\d.]+ PRE/,
    );
  });

  test('may be held against another value, as the help has it', async () => {
    const { code, out } = await audit(log, '--set', 'memory.0.timings.tFAW=18ns');
    expect(code).toBe(1);
    // 16 ns of 1.6 GHz are 25.6, so 26 ck; 18 ns are 28.8, so 29
    expect(out).toMatch(/tFAW: at least 29 ck, found 2[678](\.5)?\n {4}after line/);
  });

  test('with one command moved is found out, both lines named', async () => {
    const lines = readFileSync(log, 'utf8').split('\n');
    // the first read after its ACT, a clock too early: tRCDRD is 16 ns of 1.6 GHz, 25.6, so 26 ck
    const at = lines.findIndex((line) => line.includes(',RD,'));
    const cells = lines[at].split(',');
    const place = cells.slice(1, 7).join(',');
    const act = lines.findIndex((line) => line.includes(`,${place},`) && line.includes(',ACT,'));
    const opened = Number(lines[act].split(',')[0]);
    const early = Math.floor(opened + 25);
    lines[at] = [early, ...cells.slice(1)].join(',');
    const file = folder.at('moved.csv');
    writeFileSync(file, lines.join('\n'));
    const { code, out } = await audit(file);
    expect(code).toBe(1);
    expect(out).toContain(`line ${at + 1}: ck ${early} RD`);
    expect(out).toContain(
      `tRCDRD: at least 26 ck, found ${early - opened}\n    after line ${act + 1}: ck ${opened} ACT`,
    );
  });
});

test('an interrupt while the log is long in coming: what was read so far is reported, marked partial', async () => {
  const args = [join(ROOT, 'dist/cli/main.js'), 'audit', '-', '-p', WAGTAIL, '--json'];
  const child = spawn(process.execPath, args, { stdio: ['pipe', 'pipe', 'ignore'] });
  child.stdin.write(readFileSync(log).subarray(0, 500_000)); // and no end
  child.stdin.on('error', () => {}); // a program that ends early does not read on
  setTimeout(() => child.kill('SIGINT'), 4000); // long enough to have begun, on a busy machine too
  let out = '';
  child.stdout.setEncoding('utf8').on('data', (text) => {
    out += text;
  });
  const [code] = await once(child, 'close');
  expect(code).toBe(130);
  expect(JSON.parse(out)).toMatchObject({ ok: true, partial: true, commands: expect.any(Number) });
  expect(JSON.parse(out).commands).toBeGreaterThan(0);
});

describe('what is not a command log', () => {
  const header = 'ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,request\n';
  test.each([
    ['an empty file', '', /found an empty file; expected a command log/],
    ['a header alone', header, /found a header and no command/],
    ['another header', 'op,address,bytes\nR,0,64\n', /:1: ck: found no such column in the header; expected ck,stack,/],
    ['a word for a number', `${header}0,0,0,0,0,0,zero,1,,ACT,0\n`, /:2:13: bank: found 'zero'/],
    ['a stack too many', `${header}0,6,0,0,0,0,0,1,,ACT,0\n`, /:2: stack: found 6; expected 0 to 5: the package has 6/],
    ['NUL bytes', `${header}0,0,0,0,0,0,0,\0,,ACT,0\n`, /:2:15: row: found '\\u0000'/],
    ['a line without end', `${header}${'1'.repeat(100_000)}`, /:2: found a line of more than 65536 bytes/],
  ])('%s', async (_, text, message) => {
    const file = folder.at('bad.csv');
    writeFileSync(file, text);
    const { code, out, err } = await audit(file);
    expect({ code, out }).toEqual({ code: 2, out: '' });
    expect(err).toMatch(message);
    expect(err.trimEnd().split('\n')).toHaveLength(1);
  });

  test('a gzip file cut short, a folder, nothing at all, a package that is none', async () => {
    const cut = folder.at('cut.csv.gz');
    writeFileSync(cut, gzipSync(readFileSync(log)));
    truncateSync(cut, 5000);
    expect(await audit(cut)).toMatchObject({ code: 2, err: expect.stringContaining('gzip data that ends too early') });
    expect(await audit(folder.path)).toMatchObject({
      code: 2,
      err: expect.stringContaining('found a directory; expected a command log'),
    });
    expect(await audit(folder.at('none.csv'))).toMatchObject({ code: 2, err: expect.stringContaining('no such file') });
    expect(await penstock(['audit', log, '-p', log])).toMatchObject({ code: 2 });
    expect(await penstock(['audit', log])).toMatchObject({ code: 2, err: expect.stringContaining('package') });
  });
});
