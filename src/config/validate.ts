import type { z } from 'zod';
import { InputError, nearest } from '../errors.js';
import { type PackageFile, packageFile } from './schema.js';
import { locate, type Path, plain, type Tree } from './tree.js';

/** Checks a document against the schema; the first thing wrong is thrown with its place. */
export function validate(tree: Tree): PackageFile {
  const answer = packageFile.safeParse(plain(tree));
  if (answer.success) return answer.data;
  // a misspelt key is the likelier cause than the one that is then missing
  const { issues } = answer.error;
  throw explain(tree, issues.find(({ code }) => code === 'unrecognized_keys') ?? issues[0]);
}

function explain(tree: Tree, issue: z.core.$ZodIssue): InputError {
  const path = issue.path as Path;
  const found = describe(valueAt(tree, path));
  switch (issue.code) {
    case 'unrecognized_keys': {
      const [key] = issue.keys;
      const known = keysAt(path);
      const like = nearest(key, known);
      return new InputError({
        where: locate(tree, [...path, key], true),
        found: `unknown key '${key}'`,
        expected: like === undefined ? `one of ${known.join(', ')}` : `'${like}'`,
      });
    }
    case 'invalid_value':
      return new InputError({
        where: locate(tree, path),
        found,
        expected: issue.values.map((value) => String(value)).join(' or '),
      });
    case 'too_small':
      return new InputError({
        where: locate(tree, path),
        found,
        expected: `${issue.origin === 'array' ? 'a list of at least' : 'at least'} ${issue.minimum}${issue.origin === 'string' ? ' character' : ''}`,
      });
    case 'too_big':
      return new InputError({
        where: locate(tree, path),
        found,
        expected: `${issue.origin === 'array' ? 'a list of at most' : 'at most'} ${issue.maximum}`,
      });
    case 'invalid_format':
      return new InputError({
        where: locate(tree, path),
        found,
        expected: issue.message === 'field:bits' ? 'a field and its bits, for example bank_group:2' : issue.message,
      });
    case 'invalid_key':
      return new InputError({
        where: locate(tree, path, true),
        found: `key '${String(path[path.length - 1])}'`,
        expected: 'a field and a bit of it, for example bank_group.0',
      });
    default: {
      const expected = 'expected' in issue ? wording(String(issue.expected)) : issue.message;
      return new InputError({ where: locate(tree, path), found, expected });
    }
  }
}

const WORDS: Readonly<Record<string, string>> = {
  string: 'text; quantities are written with their unit, for example 14 ns',
  int: 'a whole number',
  number: 'a number',
  object: 'a map of keys',
  array: 'a list',
  record: 'a map of keys',
};
const wording = (expected: string): string => WORDS[expected] ?? expected;

function describe(value: unknown): string {
  if (value === undefined) return 'nothing';
  if (value === null) return 'an empty value';
  if (Array.isArray(value)) return `a list of ${value.length}`;
  if (typeof value === 'object') return 'a map';
  return typeof value === 'string' ? `'${value}'` : String(value);
}

function valueAt(tree: Tree, path: Path): unknown {
  let at: unknown = plain(tree);
  for (const step of path) at = (at as Record<string | number, unknown> | undefined | null)?.[step];
  return at;
}

/** The keys the schema knows at a path; the wrappers of defaults and options are looked through. */
export function keysAt(path: Path): string[] {
  let at: z.core.$ZodType | undefined = packageFile;
  for (const step of path) {
    const def = unwrap(at)._zod.def as {
      shape?: Record<string, z.core.$ZodType>;
      element?: z.core.$ZodType;
      valueType?: z.core.$ZodType;
    };
    at = def.shape?.[String(step)] ?? def.element ?? def.valueType;
    if (at === undefined) return [];
  }
  const def = unwrap(at)._zod.def as { shape?: Record<string, unknown> };
  return Object.keys(def.shape ?? {});
}

function unwrap(type: z.core.$ZodType): z.core.$ZodType {
  let at = type;
  for (;;) {
    const inner = (at._zod.def as { innerType?: z.core.$ZodType }).innerType;
    if (inner === undefined) return at;
    at = inner;
  }
}
