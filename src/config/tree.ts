import type { Where } from '../errors.js';

/**
 * A YAML document whose every node remembers where it was written, so that a value can be traced back through `extends` and
 * `--set` to its file, line and column.
 */
export type Tree =
  | { readonly kind: 'map'; readonly where: Where; readonly entries: ReadonlyMap<string, Entry> }
  | { readonly kind: 'list'; readonly where: Where; readonly items: readonly Tree[] }
  | {
      readonly kind: 'scalar';
      readonly where: Where;
      readonly value: unknown;
      readonly text?: string; // a number as it was written
    };

export interface Entry {
  readonly key: Where; // where the key stands
  readonly value: Tree;
}

export type Path = readonly (string | number)[];

/** Lays `over` on `base`: maps are merged key by key, lists of named things name by name, everything else is replaced. */
export function merge(base: Tree, over: Tree): Tree {
  if (base.kind === 'list' && over.kind === 'list') return mergeNamed(base, over);
  if (base.kind !== 'map' || over.kind !== 'map') return over;
  const entries = new Map(base.entries);
  for (const [key, entry] of over.entries) {
    const below = entries.get(key);
    entries.set(key, below === undefined ? entry : { key: entry.key, value: merge(below.value, entry.value) });
  }
  return { kind: 'map', where: over.where, entries };
}

/** Items of one name are merged, others follow behind; a list with an item without a name is replaced whole. */
function mergeNamed(base: Tree & { kind: 'list' }, over: Tree & { kind: 'list' }): Tree {
  const names = [...base.items, ...over.items].map(nameOf);
  if (names.includes(undefined)) return over;
  const items = [...base.items];
  for (const item of over.items) {
    const at = base.items.findIndex((below) => nameOf(below) === nameOf(item));
    if (at < 0) items.push(item);
    else items[at] = merge(items[at], item);
  }
  return { kind: 'list', where: over.where, items };
}

function nameOf(item: Tree): unknown {
  const name = item.kind === 'map' ? item.entries.get('name')?.value : undefined;
  return name?.kind === 'scalar' ? name.value : undefined;
}

/** The plain value of a tree. */
export function plain(tree: Tree): unknown {
  if (tree.kind === 'scalar') return tree.value;
  if (tree.kind === 'list') return tree.items.map(plain);
  return Object.fromEntries([...tree.entries].map(([key, { value }]) => [key, plain(value)]));
}

/** The tree at a path, undefined when there is none. */
export function subtree(tree: Tree, path: Path): Tree | undefined {
  let at: Tree | undefined = tree;
  for (const step of path) {
    if (at?.kind === 'map') at = at.entries.get(String(step))?.value;
    else at = at?.kind === 'list' ? at.items[Number(step)] : undefined;
  }
  return at;
}

/** Where the value at a path stands, or the nearest thing above it; with `key`, where its key stands. */
export function locate(tree: Tree, path: Path, key = false): Where {
  let at = tree;
  let where = tree.where;
  for (const [depth, step] of path.entries()) {
    let next: Tree | undefined;
    if (at.kind === 'map') {
      const entry = at.entries.get(String(step));
      if (entry !== undefined) {
        next = entry.value;
        where = key && depth === path.length - 1 ? entry.key : next.where;
      }
    } else if (at.kind === 'list') {
      next = at.items[Number(step)];
      if (next !== undefined) where = next.where;
    }
    if (next === undefined) break;
    at = next;
  }
  return { ...where, path: path.join('.') };
}

/** A copy of the tree with one value replaced or added; the steps before the last must exist, or `missing` is thrown. */
export function withValue(
  tree: Tree,
  path: Path,
  value: Tree,
  missing: (step: string | number, at: Tree) => Error,
): Tree {
  const [step, ...rest] = path;
  if (step === undefined) return value;
  if (tree.kind === 'list') {
    const index = listIndex(tree.items, step);
    if (index < 0) throw missing(step, tree);
    return {
      ...tree,
      items: tree.items.map((item, i) => (i === index ? withValue(item, rest, value, missing) : item)),
    };
  }
  if (tree.kind !== 'map') throw missing(step, tree);
  const name = String(step);
  const below: Tree = tree.entries.get(name)?.value ?? { kind: 'map', where: value.where, entries: new Map() };
  const entries = new Map(tree.entries);
  entries.set(name, { key: value.where, value: withValue(below, rest, value, missing) });
  return { ...tree, entries };
}

/** A list item by its number or by its `name`. */
function listIndex(items: readonly Tree[], step: string | number): number {
  const number = Number(step);
  if (Number.isInteger(number)) return number >= 0 && number < items.length ? number : -1;
  return items.findIndex((item) => {
    const name = item.kind === 'map' ? item.entries.get('name')?.value : undefined;
    return name?.kind === 'scalar' && name.value === step;
  });
}

/** Names of the items of a list, as far as they have any. */
export function namesOf(list: Tree & { kind: 'list' }): string[] {
  return list.items.map(nameOf).filter((name) => typeof name === 'string');
}
