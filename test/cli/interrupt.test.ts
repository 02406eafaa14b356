import { spawn } from 'node:child_process';
import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { build, Folder, penstock, ROOT, WAGTAIL } from './penstock.js';

let folder: Folder;
let chase: string; // takes well over ten seconds to run to its end

beforeAll(async () => {
  folder = new Folder();
  chase = folder.at('chase.csv.gz');
  await build();
  expect((await penstock(['synth', 'chase', '--bytes', '128MiB', '--out', chase])).code).toBe(0);
}, 120_000);
afterAll(() => folder.remove());

const AFTER_MS = 2500; // long enough to be in the middle of the run, on a busy machine too

describe('an interrupt', () => {
  for (const signal of ['SIGINT', 'SIGTERM'] as const) {
    test(`${signal}: what was done so far is reported and written, marked partial`, async () => {
      const [json, log] = [folder.at(`${signal}.json`), folder.at(`${signal}.csv`)];
      const ended = await penstock(['run', chase, '-p', WAGTAIL, '--json', json, '--command-log', log], {
        onStart: (kill) => setTimeout(() => kill(signal), AFTER_MS),
      });
      expect(ended).toMatchObject({ code: 130, signal: null });
      expect(ended.out).toContain('Partial');
      const result = JSON.parse(readFileSync(json, 'utf8'));
      expect(result.partial).toBe(true);
      expect(result.bandwidth.useful_bytes).toBeGreaterThan(0);
      expect(result.bandwidth.useful_bytes).toBeLessThan(128 * 1024 * 1024);
      expect(readFileSync(log, 'utf8').endsWith('\n')).toBe(true);
    });
  }

  test('the second one leaves at once, and no half file behind', async () => {
    const ended = await penstock(['run', chase, '-p', WAGTAIL, '--command-log', folder.at('twice.csv')], {
      onStart: (kill) => {
        setTimeout(() => kill('SIGINT'), AFTER_MS);
        setTimeout(() => kill('SIGINT'), AFTER_MS + 1);
      },
    });
    expect(ended.code).toBe(130);
    // the two may fall together, or the first may be served in full; either way nothing is left half done
    expect(readdirSync(folder.path).filter((name) => name.endsWith('.tmp'))).toEqual([]);
  });

  test('a trace that is being written is dropped', async () => {
    const ended = await penstock(['synth', 'uniform', '--bytes', '8GiB', '--out', folder.at('never.csv')], {
      onStart: (kill) => setTimeout(() => kill('SIGINT'), AFTER_MS),
    });
    expect(ended.code).toBe(130);
    expect(readdirSync(folder.path).filter((name) => name.includes('never'))).toEqual([]);
  });
});

describe('a trace that is long in coming', () => {
  test('does not hold up an interrupt', async () => {
    const args = [join(ROOT, 'dist/cli/main.js'), 'run', '-', '-p', WAGTAIL];
    const child = spawn(process.execPath, args, { stdio: ['pipe', 'pipe', 'pipe'] });
    let out = '';
    child.stdout.on('data', (text) => {
      out += text;
    });
    child.stdin.on('error', () => {}); // the program does not read on
    child.stdin.write(`op,address,bytes\n${'R,0,64\n'.repeat(200_000)}`); // and stays open
    setTimeout(() => child.kill('SIGINT'), 2 * AFTER_MS);
    const code = await new Promise((resolve) => child.on('close', resolve));
    child.stdin.destroy();
    expect(code).toBe(130);
    expect(out).toContain('Stopped before the trace ended');
  });
});

describe('a reader that goes away', () => {
  test('is no error: synth stops, quietly', async () => {
    const args = [join(ROOT, 'dist/cli/main.js'), 'synth', 'uniform', '--bytes', '8GiB', '--out', '-'];
    const child = spawn(process.execPath, args, { stdio: ['ignore', 'pipe', 'pipe'] });
    let err = '';
    child.stderr.on('data', (text) => {
      err += text;
    });
    child.stdout.once('data', () => child.stdout.destroy());
    const code = await new Promise((resolve) => child.on('close', resolve));
    expect({ code, err }).toEqual({ code: 0, err: '' });
  });

  test('a run still writes its files', async () => {
    const json = folder.at('unread.json');
    const args = [join(ROOT, 'dist/cli/main.js'), 'run', '-', '-p', WAGTAIL, '--json', json];
    const child = spawn(process.execPath, args, { stdio: ['pipe', 'pipe', 'pipe'] });
    child.stdout.destroy();
    child.stdin.end('op,address,bytes\nR,0,64\n');
    let err = '';
    child.stderr.on('data', (text) => {
      err += text;
    });
    const code = await new Promise((resolve) => child.on('close', resolve));
    expect({ code, err }).toEqual({ code: 0, err: '' });
    expect(JSON.parse(readFileSync(json, 'utf8')).bandwidth.useful_bytes).toBe(64);
  });
});
