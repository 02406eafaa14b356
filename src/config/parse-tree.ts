import { isAlias, isMap, isScalar, isSeq, LineCounter, type Node, type ParsedNode, parseDocument } from 'yaml';
import { InputError, type Where } from '../errors.js';
import type { Entry, Tree } from './tree.js';

/*
 * YAML text to a tree of values with places. YAML lets a few lines stand for millions of values, or for one inside itself, so
 * size and depth have an end well above any package: what passes here can be walked by anything that follows.
 */
const MOST_NODES = 2 ** 17;
const MOST_LEVELS = 32;

/** What a text should have been, for its errors. */
export interface Expected {
  readonly file: string; // the kind of file
  readonly map: string; // what is in it
}
const PACKAGE: Expected = {
  file: 'a package file',
  map: 'a package: a map with the keys penstock, name, compute …',
};

/** Parses a file whose content is a map; a syntax error, an unknown alias or another document is an InputError. */
export function parseTree(text: string, file: string, expected = PACKAGE): Tree {
  if (text.includes('\0')) {
    throw new InputError({ where: { file }, found: 'a NUL byte', expected: `${expected.file}: YAML text` });
  }
  const lines = new LineCounter();
  const tree = read(text, lines, (offset) => {
    const { line, col } = lines.linePos(offset);
    return { file, line, column: col };
  });
  if (tree === null) throw new InputError({ where: { file }, found: 'an empty file', expected: expected.map });
  if (tree.kind !== 'map') {
    const found = tree.kind === 'list' ? 'a list' : 'plain text';
    throw new InputError({ where: tree.where, found, expected: expected.map });
  }
  return tree;
}

/** Parses the value of an option, all of which stands at one place. */
export function parseValue(text: string, where: Where): Tree {
  return read(text, new LineCounter(), () => where) ?? { kind: 'scalar', where, value: null };
}

function read(text: string, lines: LineCounter, at: (offset: number) => Where): Tree | null {
  const document = parse(text, lines, at);
  // a tag that is not known, or a directive, would be passed over: what is written would not be what is meant
  const [problem] = [...document.errors, ...document.warnings];
  if (problem !== undefined) {
    const where = at(problem.pos[0]);
    if (problem.message.startsWith('Maximum call stack')) throw tooMuch(at(0), 'values in very many levels');
    if (problem.code === 'MULTIPLE_DOCS') {
      throw new InputError({ where, found: 'a second document behind ---', expected: 'one document a file' });
    }
    const found = problem.message.split(' at line')[0].split('\n')[0];
    throw new InputError({ where, found, expected: 'well-formed YAML' });
  }
  if (document.contents === null) return null;

  const place = (node: unknown): Where => at((node as Node | null)?.range?.[0] ?? 0);
  let nodes = 0;
  const convert = (node: ParsedNode | null, level: number): Tree => {
    const where = place(node);
    if (++nodes > MOST_NODES) throw tooMuch(where, `more than ${MOST_NODES} values`);
    if (level > MOST_LEVELS) throw tooMuch(where, `values in more than ${MOST_LEVELS} levels`);
    if (isAlias(node)) {
      const target = node.resolve(document) as ParsedNode | undefined;
      if (target === undefined) {
        throw new InputError({
          where,
          found: `alias *${node.source}`,
          expected: 'an anchor of that name earlier in the file',
        });
      }
      return convert(target, level + 1);
    }
    if (isSeq(node)) {
      return { kind: 'list', where, items: node.items.map((item) => convert(item as ParsedNode, level + 1)) };
    }
    if (!isMap(node)) {
      const { value, source } = isScalar(node) ? node : { value: null, source: undefined };
      return typeof value === 'number' && source !== undefined
        ? { kind: 'scalar', where, value, text: source }
        : { kind: 'scalar', where, value };
    }
    const entries = new Map<string, Entry>();
    const merged: Tree[] = [];
    for (const { key, value } of node.items) {
      const name = isScalar(key) ? String(key.value) : undefined;
      if (name === undefined) {
        throw new InputError({ where: place(key ?? node), found: 'a key that is no word', expected: 'a key' });
      }
      const tree: Tree =
        value === null ? { kind: 'scalar', where: place(key), value: null } : convert(value as ParsedNode, level + 1);
      if (name === '<<') merged.push(...mapsOf(tree));
      else if (!entries.has(name)) entries.set(name, { key: place(key), value: tree });
      else throw new InputError({ where: place(key), found: `key '${name}' twice`, expected: 'each key once' });
    }
    // the merge key of YAML 1.1: keys of another map, earlier maps first, the map's own keys before all
    for (const from of merged) {
      if (from.kind !== 'map') continue;
      for (const [name, entry] of from.entries) if (!entries.has(name)) entries.set(name, entry);
    }
    return { kind: 'map', where, entries };
  };
  return convert(document.contents, 0);
}

function parse(text: string, lines: LineCounter, at: (offset: number) => Where) {
  try {
    return parseDocument(text, { lineCounter: lines, uniqueKeys: true });
  } catch (error) {
    // the parser calls itself for each level
    if (error instanceof RangeError) throw tooMuch(at(0), 'values in very many levels');
    throw error;
  }
}

function tooMuch(where: Where, found: string): InputError {
  return new InputError({
    where,
    found: `${found}, aliases written out`,
    expected: `at most ${MOST_NODES} values in ${MOST_LEVELS} levels`,
  });
}

/** What a merge key takes keys from: a map, or a list of maps. */
function mapsOf(tree: Tree): readonly Tree[] {
  const maps = tree.kind === 'list' ? tree.items : [tree];
  const other = maps.find(({ kind }) => kind !== 'map');
  if (other === undefined) return maps;
  throw new InputError({
    where: other.where,
    found: 'something other than a map behind <<',
    expected: 'an alias of a map, or a list of them',
  });
}
