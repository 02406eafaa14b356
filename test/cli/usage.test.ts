import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, test } from 'vitest';
import { failure } from '../../src/cli/failure.js';
import { program } from '../../src/cli/program.js';
import { Session } from '../../src/cli/session.js';
import { build, penstock, ROOT, WAGTAIL } from './penstock.js';

beforeAll(build, 120_000);

const COMMANDS = ['run', 'roofline', 'whatif', 'describe', 'profile', 'synth', 'convert', 'audit', 'schema'];
const TRACE = join(ROOT, 'traces/wagtail-step.csv');

/** What must be refused: the arguments, the exit code, and what the message must say. */
const REFUSED: readonly (readonly [name: string, args: readonly string[], code: number, says: readonly string[]])[] = [
  ['no arguments', [], 2, ['no command', 'run, roofline, whatif, sweep', 'penstock --help']],
  ['an unknown command', ['rnu', TRACE], 2, ["no command 'rnu'", "did you mean 'run'?"]],
  ['an option in place of a command', ['--json', 'x'], 2, ['--json', 'a command first']],
  ['an unknown option', ['run', TRACE, '-p', WAGTAIL, '--sed', '4'], 2, ['no option --sed', 'did you mean --se']],
  ['a misspelt required option', ['run', TRACE, '--pakage', WAGTAIL], 2, ['--pakage', 'did you mean --package?']],
  ['an unknown letter', ['run', TRACE, '-q'], 2, ['no option -q', '--package']],
  ['a missing argument', ['run'], 2, ['expected run <trace>', 'penstock run --help']],
  ['a missing option', ['run', TRACE], 2, ['--package must be given']],
  ['one argument too many', ['run', TRACE, 'more', '-p', WAGTAIL], 2, ["'more'", 'one argument too many']],
  ['an option without its value', ['run', TRACE, '-p'], 2, ['--package needs a value']],
  [
    'an option given twice',
    ['run', TRACE, '-p', WAGTAIL, '--seed', '1', '--seed', '2'],
    2,
    ['--seed', 'more than once'],
  ],
  ['a wrong choice', ['run', TRACE, '-p', WAGTAIL, '--replay', 'opne'], 2, ['"opne"', '"paced"', 'did you mean open?']],
  ['a negated option', ['run', TRACE, '-p', WAGTAIL, '--no-json'], 2, ['no option --no-json']],
  ['a document without schema', ['schema', 'pacage'], 2, ['"pacage"', '"package"', '"result"']],
  ['a missing trace', ['run', 'nowhere.csv', '-p', WAGTAIL], 2, ['nowhere.csv', 'no such file']],
  ['a missing package', ['run', TRACE, '-p', 'nowhere.yaml'], 2, ['nowhere.yaml', 'no such file']],
  ['a directory as trace', ['run', ROOT, '-p', WAGTAIL], 2, ['a directory', 'a trace file']],
  ['a directory as package', ['describe', ROOT], 2, ['a directory', 'a package file']],
  ['--set without a value', ['describe', WAGTAIL, '--set', 'memory.0'], 2, ["'memory.0'", 'path=value']],
  [
    '--set of an unknown key',
    ['describe', WAGTAIL, '--set', 'memory.0.controler.page=open'],
    2,
    ['controler', 'controller'],
  ],
  ['--until without a unit', ['run', TRACE, '-p', WAGTAIL, '--until', '2'], 2, ['--until', "'2'", 'unit', 'ms']],
  ['--until of no time', ['run', TRACE, '-p', WAGTAIL, '--until', '0ms'], 2, ['--until', "'0ms'", 'greater than 0']],
  [
    '--skip-bad-rows of a fraction',
    ['run', TRACE, '-p', WAGTAIL, '--skip-bad-rows', '1.5'],
    2,
    ['--skip-bad-rows', "'1.5'"],
  ],
  ['--clock of no frequency', ['run', TRACE, '-p', WAGTAIL, '--clock', '0GHz'], 2, ['--clock', "'0GHz'"]],
  [
    'a trace without times, replayed open',
    ['run', TRACE, '-p', WAGTAIL, '--replay', 'open'],
    2,
    ['without recorded times'],
  ],
  [
    '--reads above one',
    ['synth', 'uniform', '--bytes', '1KiB', '--out', '-', '--reads', '1.5'],
    2,
    ['--reads', "'1.5'"],
  ],
  [
    '--base beyond the addresses',
    ['synth', 'uniform', '--bytes', '1KiB', '--out', '-', '--base', '0x20000000000000'],
    2,
    ['--base'],
  ],
  ['an unknown pattern', ['synth', 'unifrom', '--bytes', '1KiB', '--out', '-'], 2, ["'unifrom'", "'uniform'"]],
];

describe('refused', () => {
  const session = new Session(new AbortController().signal);
  for (const [name, args, code, says] of REFUSED) {
    test(name, async () => {
      const thrown = await program(args, session).then(
        () => 'nothing',
        (error) => error,
      );
      const refused = failure(thrown);
      expect(refused.code).toBe(code);
      for (const words of says) expect(refused.message).toContain(words);
      expect(refused.message).not.toContain('\n'); // one paragraph
    });
  }

  test('as a process: the message on standard error, nothing on standard output, no stack', async () => {
    for (const [args, code, says] of [
      [[], 2, 'no command'],
      [['run', 'nowhere.csv', '-p', WAGTAIL], 2, 'nowhere.csv'],
      [['run', TRACE, '-p', WAGTAIL, '--json', '/nowhere/r.json'], 4, '/nowhere/r.json'],
    ] as const) {
      const ended = await penstock(args);
      expect(ended).toMatchObject({ code, out: '' });
      expect(ended.err).toContain(says);
      expect(ended.err.trimEnd().split('\n')).toHaveLength(1);
    }
  });

  test('what nobody foresaw is one line and code 3, with its stack only for those who ask', () => {
    expect(failure(new TypeError('x is undefined\n  more'))).toEqual({
      code: 3,
      message: 'penstock: internal error: x is undefined. Set PENSTOCK_DEBUG=1 to see where',
    });
    expect(failure('a string').code).toBe(3);
  });
});

describe('answered', () => {
  test('--version is that of package.json', async () => {
    const { version } = JSON.parse(readFileSync(join(ROOT, 'package.json'), 'utf8'));
    expect(await penstock(['--version'])).toMatchObject({ code: 0, out: `${version}\n`, err: '' });
  });

  test('--help names every command and the exit codes', async () => {
    const { code, out } = await penstock(['--help']);
    expect(code).toBe(0);
    for (const command of COMMANDS) expect(out).toContain(`penstock ${command} <`);
    expect(out).toContain('130 interrupted');
  });

  test('the help of every command ends with examples, a line each', async () => {
    for (const command of COMMANDS) {
      const { code, out } = await penstock([command, '--help']);
      expect(code).toBe(0);
      // pairs of lines, what it does and the whole command, not broken over two lines
      const examples = out.slice(out.indexOf('Examples:')).trimEnd().split('\n').slice(1);
      expect(examples.length).toBeGreaterThan(0);
      expect(
        examples.every((line, i) => (i % 2 === 0 ? line.startsWith('  # ') : line.startsWith('  penstock '))),
      ).toBe(true);
    }
  });

  test('an option may stand before the trace', async () => {
    const ended = await penstock(['run', '-p', WAGTAIL, '--set', 'memory.0.controller.page=closed', 'nowhere.csv']);
    expect(ended.err).toContain('nowhere.csv: found no such file');
  });

  test('schema prints JSON Schemas', async () => {
    for (const document of ['package', 'result']) {
      const { code, out } = await penstock(['schema', document]);
      expect(code).toBe(0);
      const schema = JSON.parse(out);
      expect(schema.type).toBe('object');
      expect(Object.keys(schema.properties).length).toBeGreaterThan(3);
    }
  });

  test('describe prints the package, as text and as JSON', async () => {
    const text = await penstock(['describe', WAGTAIL]);
    expect(text).toMatchObject({ code: 0, err: '' });
    expect(text.out).toContain('Wagtail');
    const json = await penstock(['describe', WAGTAIL, '--json', '--set', 'memory.0.stacks=6']);
    expect(JSON.parse(json.out).memory[0].organisation.stacks).toBe(6);
  });
});
