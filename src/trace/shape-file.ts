/** The shape of a captured trace kept in a YAML file: columns, ops, delimiter, clock. */
import { parseTree } from '../config/parse-tree.js';
import { locate, plain } from '../config/tree.js';
import { InputError, nearest, type Where } from '../errors.js';
import type { ShapeText } from './shape.js';

const KEYS = ['columns', 'ops', 'delimiter', 'clock'] as const;

/** A shape file as text of the command line, and where each part of it stands. */
export interface ShapeFile {
  readonly text: ShapeText;
  readonly clock: string | undefined;
  where(part: keyof ShapeText): Where;
}

/**
 * Understands the text of a shape file. `columns` and `ops` are mappings, or text as on the command line:
 *
 *     columns: { address: Addr:hex, op: Kind, time: Stamp:cycle, bytes: =64 }
 *     ops: { read: [LD, load], write: ST }
 *     delimiter: ;
 *     clock: 1.7 GHz
 */
export function shapeFile(text: string, file: string): ShapeFile {
  const tree = parseTree(text, file, { file: 'a file of columns and ops', map: `some of ${KEYS.join(', ')}` });
  const parts = plain(tree) as Record<string, unknown>; // parseTree gives nothing but a map
  for (const key of Object.keys(parts)) {
    if (KEYS.some((known) => known === key)) continue;
    const like = nearest(key, KEYS);
    throw new InputError({
      where: locate(tree, [key], true),
      found: `unknown key '${key}'`,
      expected: like === undefined ? `one of ${KEYS.join(', ')}` : `'${like}'`,
    });
  }
  const word = (key: string): string | undefined => {
    const value = parts[key];
    if (value === undefined || typeof value === 'string') return value;
    throw new InputError({ where: locate(tree, [key]), found: JSON.stringify(value), expected: 'text' });
  };
  const pairs = (key: 'columns' | 'ops', join: string): string | undefined => {
    const value = parts[key];
    if (typeof value !== 'object' || value === null) return word(key);
    return Object.entries(value)
      .map(([name, words]) => `${name}=${Array.isArray(words) ? words.join(join) : String(words)}`)
      .join(',');
  };
  return {
    text: { columns: pairs('columns', ','), ops: pairs('ops', '|'), delimiter: word('delimiter') },
    clock: word('clock'),
    where: (part) => locate(tree, [part]),
  };
}
