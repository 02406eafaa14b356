import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test, vi } from 'vitest';
import { describe as progressLine } from '../../src/cli/progress.js';
import * as library from '../../src/index.js';
import { Folder, WAGTAIL } from './penstock.js';

let folder: Folder;
let file: string;
beforeAll(() => {
  folder = new Folder();
  file = folder.at('t.csv');
  writeFileSync(file, `op,address,bytes\n${Array.from({ length: 500 }, (_, i) => `R,${i * 256},256`).join('\n')}\n`);
});
afterAll(() => folder.remove());

test('load, open, simulate: the document of the command line, without a word', async () => {
  const says = (['stdout', 'stderr'] as const).map((name) => vi.spyOn(process[name], 'write'));
  const pkg = library.loadPackage(WAGTAIL);
  const result = await library.simulate(pkg, await library.openTrace(file, { package: pkg }));
  expect(result.bandwidth.useful_bytes).toBe(500 * 256);
  expect(result.partial).toBe(false);
  expect(result.checks.filter((check) => !check.ok)).toEqual([]);
  for (const write of says) {
    expect(write).not.toHaveBeenCalled();
    write.mockRestore();
  }
});

test('equal runs give equal documents, one after the other or asked for at once', async () => {
  const pkg = library.loadPackage(WAGTAIL);
  const runs = [1, 2].map(async () => library.simulate(pkg, await library.openTrace(file, { package: pkg })));
  const [first, second] = await Promise.all(runs);
  expect(second).toEqual(first);
});

test('commands are handed over, and an aborted run is partial', async () => {
  const pkg = library.loadPackage(WAGTAIL);
  let reads = 0;
  const onCommand: library.CommandSink = (...command) => {
    if (library.COMMANDS[command[7]].startsWith('RD')) reads++;
  };
  const result = await library.simulate(pkg, await library.openTrace(file, { package: pkg }), { onCommand });
  expect(reads).toBe(result.dram.reads);
  expect(reads).toBe((500 * 256) / pkg.memory[0].organisation.atom_bytes);
  const short = await library.simulate(pkg, await library.openTrace(file, { package: pkg }), { untilPs: 50_000 });
  expect(short.partial).toBe(true);
});

test('errors are thrown, not printed: a row beyond the capacity of the package names its line', async () => {
  const far = folder.at('far.csv');
  writeFileSync(far, 'op,address,bytes\nR,0,64\nR,0xfffffffffff,64\n');
  const pkg = library.loadPackage(WAGTAIL);
  await expect(library.openTrace(far, { package: pkg })).rejects.toMatchObject({
    name: 'InputError',
    where: { file: far, line: 3 },
  });
});

test('the progress line says how far, how fast and how long still', () => {
  const progress = { simulatedPs: 2_500_000, requests: 3_000_000, bytes: 0 };
  // a quarter done in 3 s: 1 M requests/s, and three times as long to go
  expect(progressLine(progress, 0.25, 3)).toBe('25 %, 1.00 M requests/s, 2.50 us simulated, 9 s left');
  expect(progressLine(progress, 0, 3)).toBe('3.00 M requests, 1.00 M requests/s, 2.50 us simulated');
  expect(progressLine(progress, 0.01, 60)).toContain('1 h 39 min left'); // 99 minutes
});
