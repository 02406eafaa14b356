import { execFileSync, spawn } from 'node:child_process';
import { chmodSync, existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { parquetReadObjects } from 'hyparquet';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { stream } from '../../src/random.js';
import { build, Folder, penstock, ROOT } from './penstock.js';
import { contents, pointsIn, smallSweep } from './sweep-case.js';

const POINTS = 8 * 3; // 3 rates x 3 queues, less one, with 3 seeds
let folder: Folder;
let plan: string;
let whole: Record<string, string>; // what one machine with two workers makes
const sweep = (args: readonly string[], env: Record<string, string> = {}) =>
  penstock(['sweep', ...args], { cwd: folder.path, env });
beforeAll(async () => {
  await build();
  folder = new Folder();
  plan = smallSweep(folder, 'seeds: 3\n');
  const ended = await sweep([plan, '--workers', '2']);
  expect(ended).toMatchObject({ code: 0, err: '' });
  whole = contents(folder.at('plan.sweep'));
}, 180_000);
afterAll(() => folder.remove());

describe('what a sweep leaves', () => {
  test('lines, tables, and a Parquet file of the same figures', async () => {
    expect(Object.keys(whole)).toEqual(['configurations.csv', 'runs.csv', 'runs.parquet', 'sweep.jsonl']);
    const [header, ...lines] = whole['sweep.jsonl'].trimEnd().split('\n');
    expect(JSON.parse(header)).toMatchObject({ format: 'penstock-sweep', points: POINTS, name: 'small sweep' });
    const records = lines.map((line) => JSON.parse(line));
    expect(records.map(({ point }) => point)).toEqual([...Array(POINTS).keys()]);
    expect(whole['runs.csv'].trimEnd().split('\n')).toHaveLength(POINTS + 1);
    expect(whole['configurations.csv'].trimEnd().split('\n')).toHaveLength(8 + 1);
    const bytes = Buffer.from(whole['runs.parquet'], 'latin1');
    const file = bytes.buffer.slice(bytes.byteOffset, bytes.byteOffset + bytes.length) as ArrayBuffer;
    const rows = await parquetReadObjects({ file });
    expect(rows).toHaveLength(POINTS);
    for (const [i, row] of rows.entries()) {
      expect(row).toMatchObject({ point: i, seed: records[i].seed, rate: records[i].parameters.rate, error: null });
      for (const [name, value] of Object.entries(records[i].figures)) expect(row[name]).toBe(value);
    }
  });

  test('each point is the run a user would make by hand', async () => {
    const record = JSON.parse(whole['sweep.jsonl'].split('\n')[14]); // line 1 is the header: point 13
    const set = record.overrides.flatMap((override: string) => ['--set', override]);
    const json = ['--json', '-', '--seed', record.seed];
    const { out } = await penstock(['run', 'kernels.csv', '-p', 'small.yaml', ...set, ...json], { cwd: folder.path });
    const result = JSON.parse(out);
    expect(record.point).toBe(13);
    expect(record.package_hash).toBe(result.provenance.package_hash);
    expect(record.figures.makespan_ps).toBe(result.makespan_ps);
    expect(record.figures['read_latency.p99_ps']).toBe(result.read_latency.p99_ps);
    expect(record.figures['bandwidth_share.refresh']).toBe(
      result.bandwidth_stack.refresh / result.bandwidth_stack.total,
    );
    expect(record.verdict).toBe(result.verdict.sentence);
  });

  test.each(['1', '4'])('the same bytes with %s workers', async (workers) => {
    expect(await sweep([plan, '--out', `w${workers}`, '--workers', workers])).toMatchObject({ code: 0 });
    expect(contents(folder.at(`w${workers}`))).toEqual(whole);
  });

  test('the same bytes sharded and merged, from one folder or several, by --shard or by Slurm’s variables', async () => {
    for (const k of [2, 1, 3]) await sweep([plan, '--out', 's', '--shard', `${k}/3`]);
    expect(await sweep(['merge', plan, '--out', 's'])).toMatchObject({ code: 0, err: '' });
    expect(contents(folder.at('s'))).toEqual(whole);
    for (const id of [0, 1]) {
      const array = { SLURM_ARRAY_TASK_COUNT: '2', SLURM_ARRAY_TASK_MIN: '0', SLURM_ARRAY_TASK_MAX: '1' };
      const ended = await sweep([plan, '--out', `n${id}`], { ...array, SLURM_ARRAY_TASK_ID: String(id) });
      expect(ended.out).toContain(`Slice ${id + 1} of 2: 12 points done`);
    }
    expect(await sweep(['merge', plan, '--out', 'm', '--from', 'n0', '--from', 'n1'])).toMatchObject({ code: 0 });
    expect(contents(folder.at('m'))).toEqual(whole);
  });

  test('what is done is not run again, and other questions need no run', async () => {
    const started = performance.now();
    const { out } = await sweep([plan, '--need', 'bandwidth.achieved_bytes_per_s >= 100 GB/s', '--cost', 'queue']);
    expect(out).toMatch(
      /^penstock .*\nThe cheapest package that reaches .*: rate 8 GT\/s, queue 4,\nat a cost \(queue\) of 4\.\n/,
    );
    const impossible = await sweep([plan, '--need', 'bandwidth.achieved_bytes_per_s >= 100 TB/s']);
    expect(impossible.out).toContain('No package of the 8 configurations that ran reaches bandwidth');
    expect(performance.now() - started).toBeLessThan(20_000);
    expect(contents(folder.at('plan.sweep'))['sweep.jsonl']).toBe(whole['sweep.jsonl']);
  });
});

describe('what goes wrong', () => {
  test('a point that fails is recorded, the rest goes on, and the exit code says so', async () => {
    const some = smallSweep(folder, '', 'some.yaml');
    writeFileSync(folder.at('beyond.csv'), 'op,address,bytes\nR,0,256\nR,0xffffffffff,64\n');
    writeFileSync(some, readFileSync(some, 'utf8').replace('trace: kernels.csv', 'trace: [kernels.csv, beyond.csv]'));
    const { code, out } = await sweep([some]);
    expect(code).toBe(2);
    expect(out).toContain('8 runs · 16 configurations · 8 failed');
    expect(out).toMatch(/8 of 16 runs failed\n {2}point 8, 9, 10, 11, 12, 13 and 2 more: \S*beyond\.csv:3/);
    // the same again: what is wrong with the input stays wrong, and is not tried again
    expect(await sweep([some])).toMatchObject({ code: 2, out });
  });

  test('a damaged line, another sweep, a changed package or trace, a lost point', async () => {
    const copy = (name: string, change: (text: string) => string) => {
      mkdirSync(folder.at(name));
      writeFileSync(folder.at(`${name}/sweep.jsonl`), change(whole['sweep.jsonl']));
    };
    copy('damaged', (text) => text.replace('{"point":5,', '{"point":5;'));
    expect(await sweep([plan, '--out', 'damaged'])).toMatchObject({
      code: 2,
      err: expect.stringMatching(/^damaged\/sweep\.jsonl:7: found a damaged line; .* remove it/),
    });
    const other = smallSweep(folder, 'seeds: 2\n', 'other.yaml');
    expect((await sweep([other, '--out', 'plan.sweep'])).err).toMatch(
      /^plan\.sweep\/sweep\.jsonl: found points of another sweep: what differs is the seeds/,
    );
    copy('lost', (text) =>
      text
        .split('\n')
        .filter((line) => !/^{"point":(3|4|9),/.test(line))
        .join('\n'),
    );
    expect(await sweep(['merge', plan, '--out', 'lost'])).toMatchObject({
      code: 2,
      out: '',
      err: expect.stringContaining(`lost: found ${POINTS - 3} of ${POINTS} points; missing: 3-4, 9`),
    });
    copy('doubled', (text) => text);
    writeFileSync(
      folder.at('doubled/points-x.jsonl'),
      whole['sweep.jsonl'].replace(/"makespan_ps":\d/, '"makespan_ps":9'),
    );
    expect(await sweep([plan, '--out', 'doubled'])).toMatchObject({
      code: 3,
      err: expect.stringContaining('point 0 has another result'),
    });
    writeFileSync(folder.at('kernels.csv'), `${readFileSync(folder.at('kernels.csv'), 'utf8')}# changed\n`);
    expect((await sweep([plan])).err).toContain('what differs is a trace file');
    smallSweep(folder, 'seeds: 3\n');
    expect(await sweep(['merge', plan, '--out', 'm2', '--from', 'nowhere'])).toMatchObject({ code: 2 });
  });

  test('a full disk: exit 4, what was there stays readable, and a later run goes on', async () => {
    // the shell's limit on the size of a file stands in for the disk
    const limited = (blocks: number) =>
      new Promise<number | null>((resolve) => {
        const command = `ulimit -f ${blocks}; exec "${process.execPath}" "${ROOT}dist/cli/main.js" sweep "${plan}" --out full`;
        spawn('bash', ['-c', command], { cwd: folder.path, stdio: 'ignore' }).on('close', resolve);
      });
    expect(await limited(12)).toBe(4);
    const first = pointsIn(folder.at('full'));
    expect(first.size).toBeGreaterThan(1);
    expect(first.size).toBeLessThan(POINTS);
    for (const [name, text] of Object.entries(contents(folder.at('full'))))
      expect([name, text.endsWith('\n')]).toEqual([name, true]); // no half line either
    expect(await sweep([plan, '--out', 'full'])).toMatchObject({ code: 0 });
    expect(contents(folder.at('full'))).toEqual(whole);
  });

  test.skipIf(!canMount())('a disk that is really full: exit 4', async () => {
    const disk = folder.at('disk');
    mkdirSync(disk);
    execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=16k', 'tmpfs', disk]);
    try {
      expect(await sweep([plan, '--out', 'disk'])).toMatchObject({
        code: 4,
        err: expect.stringContaining('no space left on the disk (ENOSPC)'),
      });
      const kept = pointsIn(disk);
      expect(kept.size).toBeGreaterThan(0);
      for (const [point, line] of kept) expect(whole['sweep.jsonl'].split('\n')[point + 1]).toBe(line);
    } finally {
      execFileSync('umount', [disk]);
    }
  });

  test('a place that cannot be written is known before anything is run: exit 4', async () => {
    const started = performance.now();
    writeFileSync(folder.at('file'), '');
    expect(await sweep([plan, '--out', 'file/below'])).toMatchObject({ code: 4, out: '' });
    const proc = existsSync('/proc/sys/kernel') ? '/proc/sys/kernel/x' : 'file/below'; // read-only even for root
    expect(await sweep([plan, '--out', proc])).toMatchObject({ code: 4, out: '' });
    if (process.getuid?.() !== 0) {
      mkdirSync(folder.at('locked'));
      chmodSync(folder.at('locked'), 0o555);
      expect(await sweep([plan, '--out', 'locked'])).toMatchObject({ code: 4, out: '' });
    }
    expect(performance.now() - started).toBeLessThan(15_000);
  });

  test('an interrupt: exit 130, what is done is said and kept', async () => {
    const ended = await penstock(['sweep', plan, '--out', 'stop', '--workers', '1'], {
      cwd: folder.path,
      onStart: (kill) => void whenDone(folder.at('stop'), 3).then(() => kill('SIGINT')),
    });
    expect(ended.code).toBe(130);
    expect(ended.err).toMatch(/stop keeps \d+ of 24 points/);
    expect(ended.out).toMatch(/\d+ of 24 runs done/);
    expect(await sweep([plan, '--out', 'stop'])).toMatchObject({ code: 0 });
    expect(contents(folder.at('stop'))).toEqual(whole);
  });
});

test('kill -9 at twenty moments: nothing is lost, doubled or torn', async () => {
  const many = smallSweep(folder, 'seeds: 16\n', 'many.yaml'); // 128 points
  expect(await sweep([many, '--out', 'calm', '--workers', '2'])).toMatchObject({ code: 0 });
  const moments = stream('kill', 'moments');
  let before = new Map<number, string>();
  let killed = 0;
  for (let i = 0; i < 20; i++) {
    await penstock(['sweep', many, '--out', 'killed', '--workers', '2'], {
      cwd: folder.path,
      onStart: (kill) =>
        void whenDone(folder.at('killed'), before.size + (i % 3)).then(() =>
          setTimeout(() => kill('SIGKILL'), Math.floor(60 * moments())),
        ),
    }).then(({ signal }) => {
      if (signal === 'SIGKILL') killed++;
    });
    const after = pointsIn(folder.at('killed'));
    for (const [point, line] of before) expect(after.get(point)).toBe(line); // nothing lost
    before = after;
  }
  expect(killed).toBeGreaterThanOrEqual(18);
  expect(before.size).toBeLessThan(128); // there was something left to lose every time
  expect(await sweep([many, '--out', 'killed', '--workers', '2'])).toMatchObject({ code: 0 });
  expect(contents(folder.at('killed'))).toEqual(contents(folder.at('calm'))); // nor doubled, nor torn
}, 240_000);

/** Resolves once so many points stand in the folder. */
async function whenDone(at: string, points: number): Promise<void> {
  for (;;) {
    try {
      if (readdirSync(at).length > 0 && pointsIn(at).size >= points) return;
    } catch {
      // not there yet, or just being renamed
    }
    await new Promise((resolve) => setTimeout(resolve, 5));
  }
}

function canMount(): boolean {
  if (process.platform !== 'linux' || process.getuid?.() !== 0) return false;
  try {
    const probe = new Folder();
    execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=16k', 'tmpfs', probe.path], { stdio: 'ignore' });
    execFileSync('umount', [probe.path]);
    probe.remove();
    return true;
  } catch {
    return false;
  }
}
