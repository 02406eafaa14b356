import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/errors.js';
import { parsePlan, withQuestions } from '../../src/study/plan.js';
import { pointsOf } from '../../src/study/points.js';
import { tryValues } from '../../src/study/try-values.js';

const HEAD = 'penstock_sweep: 1\npackage: a.yaml\ntrace: t.csv\n';
const AXES = `axes:
  rate: { set: [links.west.rate, links.east.rate], values: [8 GT/s, 16 GT/s] }
  queue: { set: memory.0.controller.read_queue, values: [16, 32, 64] }
`;
const plan = (text: string) => parsePlan(HEAD + text, 'dir/plan.yaml');

test('all combinations, the last axis fastest, then seeds', () => {
  const points = pointsOf(plan(`${AXES}seeds: 2\n`));
  expect(points).toHaveLength(2 * 3 * 2);
  expect(points.map(({ index }) => index)).toEqual([...points.keys()]);
  expect(points[5]).toMatchObject({ configuration: 2, seed: '2', package: 'a.yaml', trace: 't.csv' });
  expect(points[5].overrides).toEqual([
    'links.west.rate=8 GT/s',
    'links.east.rate=8 GT/s',
    'memory.0.controller.read_queue=64',
  ]);
  expect(pointsOf(plan('')).map(({ overrides }) => overrides)).toEqual([[]]);
});

test('conditions take combinations out, and what is left is numbered anew', () => {
  const points = pointsOf(plan(`${AXES}where: [rate >= 12 GT/s or queue <= 32, queue != 16]\n`));
  // rate 8: 32; rate 16: 32 and 64
  expect(points.map(({ values }) => values.map(({ label }) => label))).toEqual([
    ['8 GT/s', 32],
    ['16 GT/s', 32],
    ['16 GT/s', 64],
  ]);
  expect(points.map(({ index, configuration }) => [index, configuration])).toEqual([
    [0, 0],
    [1, 1],
    [2, 2],
  ]);
});

test('named values are a list of overrides, over packages and traces', () => {
  const lists = plan(
    'axes: { map: { values: { base: {}, wide: { address_map.granule: 1 KiB, address_map.interleave: [stack, channel] } } } }\n',
  );
  const points = pointsOf({ ...lists, packages: ['a.yaml', 'b.yaml'], traces: ['t.csv', 'u.csv'] });
  expect(points).toHaveLength(2 * 2 * 2);
  expect(points[1].overrides).toEqual(['address_map.granule=1 KiB', 'address_map.interleave=["stack","channel"]']);
  expect(points.map((point) => point.package + point.trace).slice(1, 5)).toEqual([
    'a.yamlt.csv',
    'a.yamlu.csv',
    'a.yamlu.csv',
    'b.yamlt.csv',
  ]);
});

test('text that would read as a number or a word of YAML stays text', () => {
  const [point] = pointsOf(plan('set: { a: "16", b: "true", c: 8 GT/s, d: 3, e: "x: y" }\n'));
  expect(point.overrides).toEqual(['a="16"', 'b="true"', 'c=8 GT/s', 'd=3', 'e="x: y"']);
});

test('what is asked for is kept', () => {
  const asked = plan(
    `${AXES}figures: [kernels.copy.duration_ps]\npareto: { delay.window_wait.mean_ps: down }\ncost: queue + dram.reads\nneed: queues.write.max_entries < 3\n`,
  );
  for (const figure of [
    'kernels.copy.duration_ps',
    'delay.window_wait.mean_ps',
    'dram.reads',
    'queues.write.max_entries',
  ])
    expect(asked.figures).toContain(figure);
});

test('options ask other questions, of what is kept', () => {
  const other = withQuestions(plan(AXES), {
    pareto: ['makespan_ps', 'compute.utilization:up'],
    cost: 'queue',
    need: ['makespan_ps < 1 us'],
  });
  expect(other.pareto).toEqual([
    { figure: 'makespan_ps', better: 'down' },
    { figure: 'compute.utilization', better: 'up' },
  ]);
  expect(() => withQuestions(plan(AXES), { need: ['dram.reads > 3'], cost: 'queue' })).toThrow(
    /--need: found 'dram.reads' .* expected a figure the sweep keeps; name dram.reads under figures in the plan/,
  );
  expect(() => withQuestions(plan(AXES), { pareto: ['dram.activates'] })).toThrow(
    'dram.activates:up or dram.activates:down',
  );
});

describe('plans that are refused, with file, line and column', () => {
  test.each([
    ['axis: {}', "dir/plan.yaml:4:1: axis: found unknown key 'axis'; expected 'axes'"],
    [
      'axes: { package: { set: a, values: [1] } }',
      /4:\d+: axes.package: found an axis called 'package'; expected a name/,
    ],
    ['axes: { a: { values: [1, 2] } }', /axes.a: found values without a path/],
    ['axes: { a: { set: x, values: { one: {} } } }', /axes.a.set: found set beside values/],
    ['axes: { a: { set: x, values: [1, 2, 1] } }', /4:\d+: axes.a.values.2: found value '1' twice/],
    ['axes: { a: { set: x, values: [] } }', /axes.a.values: found a list of 0/],
    ['axes: { a: { set: x } }', /axes.a.values: found nothing/],
    ['seeds: 0', /4:8: seeds: found 0; expected at least 1/],
    ['seeds: [1, "1"]', /seeds.1: found seed 1 twice/],
    ['replay: fast', /4:9: replay: found 'fast'; expected closed or open or paced/],
    ['until: 20', /until: found 20; expected text: simulated time .*, for example 20 us/],
    ['until: 20', /4:8/],
    ['until: 20 u', /until: found '20 u', whose unit 'u'/],
    ['until: 0 us', /until: found '0 us'; expected a time greater than 0/],
    ['figures: [bandwidth]', /figures.0: found 'bandwidth'; expected one number of bandwidth: achieved_bytes_per_s/],
    ['figures: [kernels.duration_ps]', /figures.0/],
    ['pareto: { makespan_p: down }', /pareto.makespan_p: found 'makespan_p'; expected 'makespan_ps'/],
    ['pareto: { makespan_ps: better }', /expected up or down/],
    ['cost: quue', /4:7: cost: found 'quue' at character 1/],
    ['package: b.yaml', /key|twice/i],
    ['where: [package == "a.yaml", 3 >]', /where.1: found its end/],
  ])('%s', (line, message) => {
    const refused = () => plan(`${line}\n`);
    expect(refused).toThrow(InputError);
    expect(refused).toThrow(message);
  });

  test('standard input, files twice, nothing left, too much', () => {
    const text = (pkg: string, rest = '') => `penstock_sweep: 1\npackage: ${pkg}\ntrace: t.csv\n${rest}`;
    expect(() => parsePlan(text('"-"'), 'p')).toThrow('p:2:10: package: found standard input');
    expect(() => parsePlan(text('[a, b, a]'), 'p')).toThrow("p:2:17: package.2: found 'a' twice");
    expect(() => pointsOf(parsePlan(text('a', 'where: 1 > 2\n'), 'p'))).toThrow(
      'p:4:8: where: found conditions that no',
    );
    expect(() =>
      pointsOf(
        parsePlan(text('a', `${AXES}seeds: 1000\n`.replace('[16, 32, 64]', `[${[...Array(1000).keys()]}]`)), 'p'),
      ),
    ).toThrow('found more than 1000000 points');
    expect(() => parsePlan('', 'p')).toThrow('p: found an empty file; expected a sweep plan');
  });
});

test('a value that no package takes is a slip; one that needs company is not', () => {
  const both = plan(AXES);
  const points = pointsOf(both);
  const refuse = (test: (overrides: readonly string[]) => boolean) => () =>
    tryValues(both, points, ({ overrides }) => {
      if (test(overrides))
        throw new InputError({ where: { file: '--set x', path: 'x' }, found: "'16'", expected: '32' });
    });
  expect(refuse((set) => set[2].endsWith('=16'))).toThrow(
    "dir/plan.yaml:6:58: axes.queue.values.0: found a value no point's package takes (x: x: found '16'); expected 32",
  );
  expect(refuse((set) => set[2].endsWith('=16') && set[0].endsWith('=8 GT/s'))).not.toThrow();
});
