import { closeSync, openSync, readSync } from 'node:fs';
import { resolve as absolute, dirname, isAbsolute, join } from 'node:path';
import { InputError, nearest, SystemError, type Where } from '../errors.js';
import { formatBytes } from '../units.js';
import { checkPackage } from './check-package.js';
import type { Package } from './package.js';
import { parseTree, parseValue } from './parse-tree.js';
import { resolve } from './resolve.js';
import { merge, namesOf, type Tree, withValue } from './tree.js';
import { isOpenMap, validate } from './validate.js';

const MOST_TEXT = 2 ** 22; // bytes of a package file
const NO_FILE: ReadonlySet<string> = new Set([
  'ENOENT',
  'ENOTDIR',
  'ENAMETOOLONG',
  'ERR_INVALID_ARG_VALUE', // a NUL in the name
]);

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
  if (base.kind !== 'scalar' || typeof base.value !== 'string' || base.value === '') {
    throw new InputError({
      where: { ...base.where, path: 'extends' },
      found: base.kind === 'scalar' && base.value === '' ? "''" : 'something other than a file name',
      expected: 'the name of a package file',
    });
  }
  const target = isAbsolute(base.value) ? base.value : join(dirname(file), base.value);
  return merge(loadTree(target, chain, { ...base.where, path: 'extends' }), tree);
}

/** Text of a package file, read no further than one could be long: another file by mistake is refused at once. */
function readText(file: string, from?: Where): string {
  const where = from ?? { file };
  const name = from === undefined ? '' : `'${file}', `;
  let descriptor = -1;
  try {
    descriptor = openSync(file, 'r');
    const bytes = Buffer.alloc(MOST_TEXT + 1);
    let length = 0;
    for (let got = -1; got !== 0 && length < bytes.length; length += got)
      got = readSync(descriptor, bytes, length, bytes.length - length, null);
    if (length > MOST_TEXT) {
      throw new InputError({
        where,
        found: `${name}a file of more than ${formatBytes(MOST_TEXT)}`,
        expected: 'a package file (YAML)',
      });
    }
    return bytes.toString('utf8', 0, length);
  } catch (error) {
    if (error instanceof InputError) throw error;
    const { code } = error as NodeJS.ErrnoException;
    if (code !== undefined && NO_FILE.has(code)) {
      throw new InputError({
        where,
        found: from ? `'${file}', a file that does not exist` : 'no such file',
        expected: 'a package file (YAML)',
      });
    }
    if (code === 'EISDIR')
      throw new InputError({ where, found: `${name}a directory`, expected: 'a package file (YAML)' });
    throw new SystemError(`${file}: cannot be read (${code ?? String(error)})`);
  } finally {
    if (descriptor >= 0) closeSync(descriptor);
  }
}

/** Lays one `path=value` over the tree; the value is YAML. */
function override(tree: Tree, text: string): Tree {
  const where: Where = { file: `--set ${text}` };
  const at = text.indexOf('=');
  if (at <= 0)
    throw new InputError({
      where,
      found: `'${text}'`,
      expected: 'path=value, for example memory.0.controller.read_queue=32',
    });
  const path = keyPath(text.slice(0, at).split('.'));
  if (path[0] === 'extends') {
    throw new InputError({
      where,
      found: 'the base of a package file',
      expected: 'a key of the package itself: what a file extends is read before anything is set',
    });
  }
  const value = parseValue(text.slice(at + 1), where);
  return withValue(tree, path, value, (step, below) => {
    const names = below.kind === 'list' ? namesOf(below) : [];
    const numbers = below.kind === 'list' ? `0 to ${below.items.length - 1}` : '';
    const like = nearest(String(step), names);
    return new InputError({
      where,
      found: `no '${step}' on the way to ${path.join('.')}`,
      expected:
        below.kind === 'list'
          ? `an item of the list: ${[...names, below.items.length === 1 ? '0' : numbers].join(', ')}`
          : 'a path to a key of the package file',
      hint: like === undefined ? undefined : `Did you mean '${like}'?`,
    });
  });
}

/** Keys of the user's own (number formats, folded bits) may have dots in them: there the rest of a path is one key. */
function keyPath(steps: readonly string[]): string[] {
  const free = steps.findIndex((_, i) => i > 0 && isOpenMap(steps.slice(0, i)));
  return free < 0 ? [...steps] : [...steps.slice(0, free), steps.slice(free).join('.')];
}
