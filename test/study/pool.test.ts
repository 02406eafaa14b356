import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { CheckError, InputError, loadPackage, openTrace, SystemError, simulate } from '../../src/index.js';
import { receivedError, sentError } from '../../src/study/pool-job.js';
import { build, Folder, WAGTAIL } from '../cli/penstock.js';

// threads run the compiled program, so the pool is taken from there too
let study: typeof import('../../src/study/index.js');
const folder = new Folder();
const trace = folder.at('t.csv');
const job = { package: WAGTAIL, trace };
beforeAll(async () => {
  await build();
  study = await import(new URL('../../dist/study/index.js', import.meta.url).href);
  const rows = Array.from({ length: 400 }, (_, i) => `${i % 5 ? 'R' : 'W'},${i * 256},256,${i}`);
  writeFileSync(trace, `op,address,bytes,time_ns\n${rows.join('\n')}\n`);
}, 120_000);
afterAll(() => folder.remove());

test('a pooled run gives the document of a run in this thread, in the order of the jobs', async () => {
  const overrides = [1, 2, 4, 8, 16].map((depth) => [`memory.0.controller.read_queue=${depth}`]);
  const outcomes = await study.runAll(
    overrides.map((set) => ({ ...job, overrides: set })),
    { workers: 2 },
  );
  for (const [i, outcome] of outcomes.entries()) {
    const pkg = loadPackage(WAGTAIL, overrides[i]);
    const here = await simulate(pkg, await openTrace(trace, { package: pkg }), { overrides: overrides[i] });
    expect(outcome).toEqual({ ok: true, result: here });
    expect(JSON.stringify(outcome?.ok && outcome.result)).toBe(JSON.stringify(here));
  }
});

test('seed, replay, end and the options of the trace reach the run', async () => {
  const run = { seed: 'x', replay: 'open', untilPs: 3e5 } as const;
  writeFileSync(folder.at('bad.csv'), 'op,address,bytes\nR,0,64\nQ,0,64\n');
  const bad = { ...job, trace: folder.at('bad.csv') };
  const [first, second, third] = await study.runAll([
    { ...job, run },
    bad,
    { ...bad, traceOptions: { skipBadRows: 1 } },
  ]);
  expect(first?.ok && first.result.provenance).toMatchObject({ seed: 'x', options: { replay: 'open', until_ps: 3e5 } });
  expect(second?.ok).toBe(false);
  expect(third?.ok && third.result.provenance.skipped_rows).toBe(1);
});

test('a job that fails is an outcome of its own kind, word for word, and the rest goes on', async () => {
  const outcomes = await study.runAll(
    [{ ...job, overrides: ['memory.0.stacks=none'] }, { ...job, trace: folder.at('absent.csv') }, job],
    { workers: 1 },
  );
  const kinds = outcomes.map((outcome) => (outcome?.ok ? 'fine' : outcome?.error.name));
  expect(kinds).toEqual(['InputError', expect.stringMatching(/^(Input|System)Error$/), 'fine']);
  expect(() => loadPackage(WAGTAIL, ['memory.0.stacks=none'])).toThrow(
    outcomes[0]?.ok === false ? outcomes[0].error.message : 'an error',
  );
});

test('errors keep kind, message and place on the way between threads', () => {
  const input = new InputError({ where: { file: 'f', line: 3, column: 4, path: 'p' }, found: 'a', expected: 'b' });
  const back = receivedError(structuredClone(sentError(input)));
  expect(back).toBeInstanceOf(InputError);
  expect(back).toMatchObject({ message: input.message, where: input.where, found: 'a', expected: 'b' });
  for (const Kind of [CheckError, SystemError, Error]) {
    const again = receivedError(structuredClone(sentError(new Kind('said'))));
    expect(again.constructor).toBe(Kind);
    expect(again.message).toBe('said');
  }
  const refused = Object.assign(new Error('EACCES: no'), { code: 'EACCES', syscall: 'open' });
  expect(receivedError(sentError(refused))).toBeInstanceOf(SystemError);
});

test('an abort drops what is under way; what onResult throws ends the run', async () => {
  const stop = new AbortController();
  const seen: number[] = [];
  await study.runPoints(
    Array.from({ length: 50 }, () => job),
    {
      workers: 2,
      signal: stop.signal,
      onResult: (_, index) => {
        seen.push(index);
        if (seen.length === 3) stop.abort();
      },
    },
  );
  expect(seen).toHaveLength(3);
  const thrown = study.runPoints([job, job, job], {
    workers: 2,
    onResult: () => {
      throw new SystemError('full');
    },
  });
  await expect(thrown).rejects.toThrow('full');
});
