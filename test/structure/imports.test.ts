/** The house rules a script can see: who may import whom, who may touch the machine, how long files are, what is not mentioned. */
import { execFileSync } from 'node:child_process';
import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join, relative } from 'node:path';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';

const ROOT = fileURLToPath(new URL('../../', import.meta.url));
const SRC = join(ROOT, 'src');

/** Folder -> folders it may import from, and why no more. The files beside the folders (units, errors, random) are for all. */
const MAY: Readonly<Record<string, readonly [may: readonly string[], because: string]>> = {
  config: [[], 'what the user wrote comes first: it knows nothing of what is made of it'],
  trace: [['config'], 'rows are read against dies and capacities, before anything runs'],
  model: [['config', 'trace'], 'calculators have no clock, so nothing that has one'],
  engine: [['config', 'trace', 'model'], 'what happens does not know what it means'],
  analysis: [['config', 'trace', 'model', 'engine'], 'figures are made of a recording, not of how they will look'],
  report: [['config', 'trace', 'model', 'engine', 'analysis'], 'a reporter only prints what a result holds'],
  study: [
    ['config', 'trace', 'model', 'engine', 'analysis', 'report'],
    'a study runs the line many times; it owns no terminal',
  ],
  audit: [['config'], 'a second reading of the rules that shares code with the engine would share its errors'],
  cli: [['config', 'trace', 'model', 'engine', 'analysis', 'report', 'study', 'audit'], 'the command line stands last'],
};

/** Files that may touch files and the process: the command line, and the places that open what the user names. */
const TOUCHES = [
  /^cli\//,
  /^study\/pool/,
  /^config\/load\.ts$/,
  /^trace\/(open|bytes|arrow|files|ahead|ahead-thread|zstd)\.ts$/,
  /^index\.ts$/,
];

/** Files over 300 lines, each with its reason. */
const LONG: Readonly<Record<string, string>> = {
  'engine/channel.ts': 'hot state must be module-level constants of one file: see DEVELOPERS.md',
  'engine/front-end.ts': 'the dies, links and credits of one clock edge, in order',
  'engine/kernel-work.ts': 'tiles, streams and launches of kernels share one state per engine',
  'trace/plain.ts': 'the loop from bytes to batch: cut in two, it costs a call a cell',
  'engine/trace-work.ts': 'rows, tiles and dependencies of accesses share one state per engine',
};

const files = readdirSync(SRC, { recursive: true, encoding: 'utf8' })
  .filter((name) => name.endsWith('.ts'))
  .map((name) => name.replaceAll('\\', '/'));
const textOf = (file: string): string => readFileSync(join(SRC, file), 'utf8');
const importsOf = (file: string): string[] =>
  [...textOf(file).matchAll(/(?:from|import)\s*\(?\s*'([^']+)'/g)].map(([, target]) => target);
const inside = (file: string, target: string): string =>
  relative(SRC, join(SRC, dirname(file), target))
    .replaceAll('\\', '/')
    .replace(/\.js$/, '.ts');
const folderOf = (file: string): string => (file.includes('/') ? file.slice(0, file.indexOf('/')) : '');

describe('imports go left', () => {
  it.each(files)('%s', (file) => {
    const folder = folderOf(file);
    for (const target of importsOf(file).filter((name) => name.startsWith('.'))) {
      const other = folderOf(inside(file, target));
      if (folder === '' || other === folder) continue;
      if (other === '') {
        // index.ts is the library's face: only the command line stands behind it
        if (inside(file, target) === 'index.ts' && !['cli', 'study'].includes(folder))
          throw new Error(`${file} imports the library's face, which imports it`);
        continue;
      }
      const [may, because] = MAY[folder] ?? [[], 'no such folder in the table'];
      if (!may.includes(other))
        throw new Error(
          `${file} imports ${target}, but ${folder} may import ${may.join(', ') || 'no folder'}: ${because}`,
        );
    }
  });

  it('and in no circle', () => {
    const state = new Map<string, 'open' | 'done'>();
    const visit = (file: string, path: readonly string[]): void => {
      if (state.get(file) === 'done') return;
      if (state.get(file) === 'open')
        throw new Error(`a circle: ${[...path.slice(path.indexOf(file)), file].join(' -> ')}`);
      state.set(file, 'open');
      for (const target of importsOf(file).filter((name) => name.startsWith('.'))) {
        const other = inside(file, target);
        if (files.includes(other)) visit(other, [...path, file]);
      }
      state.set(file, 'done');
    };
    for (const file of files) visit(file, []);
  });
});

describe('the machine is touched in few places', () => {
  it.each(files.filter((file) => !TOUCHES.some((allowed) => allowed.test(file))))('%s', (file) => {
    const text = textOf(file).replace(/\/\*[\s\S]*?\*\/|\/\/.*$/gm, '');
    // however it is written: with node: or without, as a part of it, or imported on the way
    const machine = /^(node:)?(fs|child_process|worker_threads|os|process|net|http|https|tty|readline)(\/|$)/;
    expect(importsOf(file).filter((name) => machine.test(name))).toEqual([]);
    expect(text).not.toMatch(/\b(process|console)\s*(\.|\[)|\bglobalThis\b/);
  });
});

it('only the command line prints, reads its arguments or ends the process', () => {
  for (const file of files.filter((name) => !name.startsWith('cli/'))) {
    const text = textOf(file).replace(/\/\*[\s\S]*?\*\/|\/\/.*$/gm, '');
    if (/\b(console\.|process\.(stdout|stderr|exit|argv))/.test(text))
      throw new Error(`${file} talks to the terminal: a library that prints cannot be used by another program`);
  }
});

it('long files are few, and each has its reason', () => {
  const long = files.filter((file) => textOf(file).split('\n').length > 300);
  expect(long.filter((file) => !(file in LONG))).toEqual([]);
  // a file that has become short again needs no reason any more
  expect(Object.keys(LONG).filter((file) => !long.includes(file))).toEqual([]);
});

it('the tables name what is there', () => {
  const folders = new Set(files.map(folderOf).filter((name) => name !== ''));
  for (const folder of folders) expect(Object.keys(MAY)).toContain(folder);
  // places opened for a reason that has gone would stay open for the next
  for (const allowed of TOUCHES.filter((pattern) => !pattern.source.includes('study')))
    expect(files.some((file) => allowed.test(file))).toBe(true);
  for (const name of files) expect(name).not.toMatch(/\b(utils?|helpers?|common|misc)\b/);
});

it('each folder says what it is for', () => {
  for (const folder of new Set(files.map(folderOf).filter((name) => name !== ''))) {
    if (folder === 'cli') expect(textOf('cli/main.ts')).toMatch(/^#!.*\n\/\*\*/);
    else
      expect(textOf(`${folder}/index.ts`)).toMatch(
        /^\/\*\*[\s\S]*In: [\s\S]*Out: [\s\S]*one decision[\s\S]*Not modelled/,
      );
  }
});

it('nothing tracked names a place outside the project', () => {
  const tracked = execFileSync('git', ['ls-files'], { cwd: ROOT, encoding: 'utf8' }).trim().split('\n');
  const names = /\.\.\/[s]hared|(^|[^\w.])\/(work|tmp|root|home)\/[a-z]/;
  for (const file of tracked.filter((name) => !/package-lock|\.png$|\.gz$/.test(name)))
    for (const [i, line] of readFileSync(join(ROOT, file), 'utf8').split('\n').entries())
      if (names.test(line)) throw new Error(`${file}:${i + 1}: ${line.trim()}`);
});
