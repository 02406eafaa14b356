import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

const folder = new Folder();
const trace = folder.at('t.csv');
beforeAll(async () => {
  await build();
  writeFileSync(
    trace,
    'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat,estimate_us\n' +
      'copy,main,,0,2 MiB,1 MiB,sequential,sequential,16 KiB,1,\n',
  );
}, 120_000);
afterAll(() => folder.remove());

const whatif = (...args: string[]) => penstock(['whatif', trace, '-p', WAGTAIL, ...args]);

test('says how long it will take before it starts, then what would help most', async () => {
  const { code, out, err } = await whatif('--limits', 'refresh,window,queues');
  expect(err).toMatch(/^penstock: 4 more runs, [1-4] side by side, about \d+ (s|min)\n$/);
  expect(code).toBe(0);
  const lines = out.split('\n');
  expect(lines[1]).toMatch(/^(Lifting .* would save most|No limit saves anything by itself)/);
  expect(out).toMatch(/^Without +time +saved/m);
  expect(out).toMatch(/^ {2}all of these /m);
  expect(Math.max(...lines.map((line) => [...line].length))).toBeLessThanOrEqual(100);
});

test('--json gives each run with the --set that makes it', async () => {
  const { code, out } = await whatif('--limits', 'window', '--json');
  expect(code).toBe(0);
  const found = JSON.parse(out);
  expect(found.lifted[0].overrides).toEqual(['compute.0.window=32768', 'compute.1.window=32768']);
  const set = found.lifted[0].overrides.flatMap((text: string) => ['--set', text]);
  const again = await penstock(['run', trace, '-p', WAGTAIL, ...set, '--json', '-']);
  expect(JSON.parse(again.out).makespan_ps).toBe(found.lifted[0].makespan_ps);
});

test('--pairs names two that only help together, or says that there are none', async () => {
  const { code, out } = await whatif('--limits', 'window,buffering', '--pairs');
  expect(code).toBe(0);
  expect(out).toMatch(/Two that help each other|No two limits save more together/);
});

test.each([
  [['--limits', 'refesh'], "--limits: found 'refesh'; expected limits out of refresh, turnaround"],
  [['--workers', '0'], "--workers: found '0'; expected a whole number, 1 or more"],
])('%j is refused', async (args, said) => {
  const { code, err, out } = await whatif(...args);
  expect(err).toContain(said);
  expect([code, out]).toEqual([2, '']);
});

test('standard input is refused: every run reads the trace again', async () => {
  const { code, err } = await penstock(['whatif', '-', '-p', WAGTAIL]);
  expect(err).toContain('whatif: found standard input; expected a trace file: every run reads it again');
  expect(code).toBe(2);
});

test('an interrupt reports what was done, as partial', async () => {
  let stop = (): void => {};
  const timer = setTimeout(() => stop(), 4000);
  const { code, out } = await penstock(['whatif', 'traces/wagtail-step.csv', '-p', WAGTAIL, '--workers', '1'], {
    onStart: (kill) => {
      stop = () => kill('SIGINT');
    },
  });
  clearTimeout(timer);
  expect(code).toBe(130);
  expect(out).toContain('Partial: interrupted');
});
