import type { z } from 'zod';
import { InputError, nearest } from '../errors.js';
import { isQuantity, type PackageFile, packageFile } from './schema.js';
import { locate, type Path, plain, subtree, type Tree } from './tree.js';

/** Checks a package file against its schema; the first thing wrong is thrown with its place. */
export function validate(tree: Tree): PackageFile {
  return validateAs(tree, packageFile);
}

/** Checks a document against a schema; the first thing wrong is thrown with its place. */
export function validateAs<T extends z.ZodType>(tree: Tree, schema: T): z.infer<T> {
  refuseProto(tree, []);
  const answer = schema.safeParse(plain(tree));
  if (answer.success) return answer.data;
  // a misspelt key is the likelier cause than the one that is then missing
  const { issues } = answer.error;
  throw explain(tree, schema, issues.find(({ code }) => code === 'unrecognized_keys') ?? issues[0]);
}

/** JavaScript keeps this one name for itself, so the schema would pass over it: what is written would not be what is meant. */
function refuseProto(tree: Tree, path: Path): void {
  if (tree.kind === 'list') tree.items.forEach((item, i) => void refuseProto(item, [...path, i]));
  if (tree.kind !== 'map') return;
  for (const [name, { key, value }] of tree.entries) {
    const at = [...path, name];
    if (name !== '__proto__') refuseProto(value, at);
    else
      throw new InputError({ where: { ...key, path: at.join('.') }, found: `key '${name}'`, expected: 'another key' });
  }
}

function explain(tree: Tree, schema: z.ZodType, issue: z.core.$ZodIssue): InputError {
  const path = issue.path as Path;
  const found = describe(subtree(tree, path));
  switch (issue.code) {
    case 'unrecognized_keys': {
      const [key] = issue.keys;
      const known = keysAt(path, schema);
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
        expected: `${issue.origin === 'array' ? 'a list of at most' : 'at most'} ${mostAt(path, schema) ?? issue.maximum}`,
      });
    case 'invalid_format':
      return new InputError({
        where: locate(tree, path),
        found,
        expected: FORMATS[issue.message] ?? issue.message,
      });
    case 'invalid_key':
      return new InputError({
        where: locate(tree, path, true),
        found: `key '${String(path[path.length - 1])}'`,
        expected:
          path[0] === 'address_map'
            ? 'a field and a bit of it, for example bank_group.0'
            : 'the name of a number format, for example bf16',
      });
    default: {
      const expected = 'expected' in issue ? wording(String(issue.expected), path, schema) : issue.message;
      return new InputError({ where: locate(tree, path), found, expected });
    }
  }
}

/** What the schema calls the shapes of its strings, said in full. */
const FORMATS: Readonly<Record<string, string>> = {
  'field:bits': 'a field and its bits, for example bank_group:2',
  'row.bit': 'a bit of the row, for example row.3',
};

const WORDS: Readonly<Record<string, string>> = {
  string: 'text',
  int: 'a whole number',
  number: 'a number',
  object: 'a map of keys',
  array: 'a list',
  record: 'a map of keys',
  boolean: 'true or false',
};

/** What kind of value would do, and what the schema says of it. */
function wording(expected: string, path: Path, schema: z.ZodType): string {
  const type = typeAt(path, schema);
  const whole = expected === 'number' && (schema as z.ZodType) === packageFile; // the package's schema has no others
  const kind =
    type !== undefined && isQuantity(unwrap(type))
      ? 'a quantity with its unit'
      : (WORDS[whole ? 'int' : expected] ?? expected);
  const about = type === undefined ? undefined : descriptionOf(type);
  return about === undefined ? kind : `${kind}: ${about}`;
}

function describe(tree: Tree | undefined): string {
  if (tree === undefined) return 'nothing';
  if (tree.kind === 'list') return `a list of ${tree.items.length}`;
  if (tree.kind === 'map') return 'a map';
  if (tree.value === null) return 'an empty value';
  return typeof tree.value === 'string' ? `'${tree.value}'` : (tree.text ?? String(tree.value));
}

/** The keys a schema, the package's by default, knows at a path. */
export function keysAt(path: Path, schema: z.ZodType = packageFile): string[] {
  const type = typeAt(path, schema);
  return type === undefined ? [] : Object.keys(partsOf(type).shape ?? {});
}

/** Whether a path leads to a map whose keys are the user's own. */
export function isOpenMap(path: Path): boolean {
  const type = typeAt(path, packageFile);
  return type !== undefined && partsOf(type).valueType !== undefined;
}

/** The greatest number the schema takes at a path; for one beyond all whole numbers the issue would name another limit. */
function mostAt(path: Path, schema: z.ZodType): number | undefined {
  const type = typeAt(path, schema);
  return type === undefined ? undefined : ((unwrap(type) as z.ZodNumber).maxValue ?? undefined);
}

interface Parts {
  readonly shape?: Readonly<Record<string, z.core.$ZodType>>;
  readonly element?: z.core.$ZodType;
  readonly valueType?: z.core.$ZodType;
}
const partsOf = (type: z.core.$ZodType): Parts => unwrap(type)._zod.def as Parts;

function typeAt(path: Path, schema: z.core.$ZodType): z.core.$ZodType | undefined {
  let at: z.core.$ZodType | undefined = schema;
  for (const step of path) {
    const { shape, element, valueType }: Parts = partsOf(at);
    at = shape !== undefined && Object.hasOwn(shape, step) ? shape[step] : (element ?? valueType);
    if (at === undefined) return undefined;
  }
  return at;
}

/** The type below the wrappers of defaults and options. */
function unwrap(type: z.core.$ZodType): z.core.$ZodType {
  let at = type;
  for (;;) {
    const inner = (at._zod.def as { innerType?: z.core.$ZodType }).innerType;
    if (inner === undefined) return at;
    at = inner;
  }
}

function descriptionOf(type: z.core.$ZodType): string | undefined {
  return (type as z.ZodType).description ?? (unwrap(type) as z.ZodType).description;
}
