import { readFileSync } from 'node:fs';
import { resolve as absolute, dirname, isAbsolute, join } from 'node:path';
import { InputError, nearest, SystemError, type Where } from '../errors.js';
import { checkPackage } from './check-package.js';
import type { Package } from './package.js';
import { resolve } from './resolve.js';
import { merge, parseTree, type Tree, withValue } from './tree.js';
import { keysAt, validate } from './validate.js';

/**
 * Loads a package file with everything it extends, and lays overrides (`path=value`, list items by number or name) over it.
 * Throws InputError with the place of whatever is wrong, SystemError when a file is there but cannot be read.
 */
export function loadPackage(file: string, overrides: readonly string[] = []): Package {
  return build(loadTree(file, []), file, overrides);
}

/** The same from text, for tests and library use; `extends` is looked up beside `file`. */
export function parsePackage(text: string, file: string, overrides: readonly string[] = []): Package {
  return build(extended(parseTree(text, file), file, [absolute(file)]), file, overrides);
}

function build(tree: Tree, file: string, overrides: readonly string[]): Package {
  const laid = overrides.reduce(override, tree);
  const pkg = resolve(validate(laid), laid, file);
  checkPackage(pkg, laid);
  return pkg;
}

function loadTree(file: string, chain: readonly string[], from?: Where): Tree {
  const id = absolute(file);
  if (chain.includes(id)) {
    throw new InputError({
      where: from ?? { file },
      found: `${file}, which is already being extended (${[...chain, id].map((f) => f.split(/[\\/]/).pop()).join(' -> ')})`,
      expected: 'files that do not extend each other in a circle',
    });
  }
  return extended(parseTree(readText(file, from), file), file, [...chain, id]);
}

function extended(tree: Tree, file: string, chain: readonly string[]): Tree {
  const base = tree.kind === 'map' ? tree.entries.get('extends')?.value : undefined;
  if (base === undefined) return tree;
  if (base.kind !== 'scalar' || typeof base.value !== 'string') {
    throw new InputError({
      where: { ...base.where, path: 'extends' },
      found: 'something other than a file name',
      expected: 'the name of a package file',
    });
  }
  const target = isAbsolute(base.value) ? base.value : join(dirname(file), base.value);
  return merge(loadTree(target, chain, { ...base.where, path: 'extends' }), tree);
}

function readText(file: string, from?: Where): string {
  try {
    return readFileSync(file, 'utf8');
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    const where = from ?? { file };
    if (code === 'ENOENT')
      throw new InputError({
        where,
        found: from ? `'${file}', a file that does not exist` : 'no such file',
        expected: 'a package file (YAML)',
      });
    if (code === 'EISDIR') throw new InputError({ where, found: 'a directory', expected: 'a package file (YAML)' });
    throw new SystemError(`${file}: cannot be read (${code ?? String(error)})`);
  }
}

/** Lays one `path=value` over the tree; the value is a YAML scalar. */
function override(tree: Tree, text: string): Tree {
  const where: Where = { file: `--set ${text}` };
  const at = text.indexOf('=');
  if (at <= 0)
    throw new InputError({
      where,
      found: `'${text}'`,
      expected: 'path=value, for example memory.0.controller.read_queue=32',
    });
  const path = text.slice(0, at).split('.');
  const value = parseScalar(text.slice(at + 1), where);
  return withValue(tree, path, value, (step, below) => {
    const known = below.kind === 'list' ? below.items.map((_, i) => String(i)) : [];
    return new InputError({
      where,
      found: `no '${step}' on the way to ${path.join('.')}`,
      expected:
        known.length > 0 ? `one of ${known.join(', ')}, or an item's name` : 'a path to a key of the package file',
      hint:
        nearest(String(step), keysAt([])) === undefined
          ? undefined
          : `Did you mean '${nearest(String(step), keysAt([]))}'?`,
    });
  });
}

function parseScalar(text: string, where: Where): Tree {
  const tree = parseTree(`value: ${text}`, where.file);
  const value = tree.kind === 'map' ? tree.entries.get('value')?.value : undefined;
  if (value === undefined) throw new InputError({ where, found: `'${text}'`, expected: 'a value' });
  return withPlace(value, where);
}

/** The tree with one place for all its nodes, since an option has no lines. */
function withPlace(tree: Tree, where: Where): Tree {
  if (tree.kind === 'scalar') return { ...tree, where };
  if (tree.kind === 'list') return { ...tree, where, items: tree.items.map((item) => withPlace(item, where)) };
  const entries = new Map(
    [...tree.entries].map(([key, { value }]) => [key, { key: where, value: withPlace(value, where) }]),
  );
  return { ...tree, where, entries };
}
