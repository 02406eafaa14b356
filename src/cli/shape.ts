/** Options that say what shape a captured trace has; `run`, `profile` and `convert` share them. */
import { readFileSync } from 'node:fs';
import { InputError } from '../errors.js';
import { OWN_SHAPE, parseShape, type Shape, type ShapeText, shapeFile } from '../trace/index.js';
import { systemError } from './system-error.js';

export const SHAPE = {
  columns: {
    type: 'string',
    requiresArg: true,
    describe: 'columns of a captured trace: address=Addr:hex,op=Kind,bytes==64,time=Stamp:us',
  },
  ops: { type: 'string', requiresArg: true, describe: 'its words for operations: read=LD|load,write=ST' },
  delimiter: { type: 'string', requiresArg: true, describe: 'what stands between its cells: ; or | or tab' },
  'columns-file': { type: 'string', requiresArg: true, describe: 'YAML file with columns, ops, delimiter and clock' },
  clock: {
    type: 'string',
    requiresArg: true,
    describe: 'frequency of the clock that column cycle counts, for example 1.7GHz',
  },
  'skip-bad-rows': {
    type: 'string',
    default: '0',
    requiresArg: true,
    describe: 'bad rows of the trace to skip and count before one stops the run',
  },
} as const;

export interface ShapeArgs {
  readonly columns: string | undefined;
  readonly ops: string | undefined;
  readonly delimiter: string | undefined;
  readonly 'columns-file': string | undefined;
  readonly clock: string | undefined;
}

/** The shape the options give, and the clock; what stands on the command line goes before what stands in the file. */
export function shapeOf(args: ShapeArgs): { readonly shape: Shape; readonly clock: string | undefined } {
  const file = args['columns-file'];
  const kept = file === undefined ? undefined : shapeFile(read(file), file);
  const pick = (part: keyof ShapeText): string | undefined => args[part] ?? kept?.text[part];
  const text = { columns: pick('columns'), ops: pick('ops'), delimiter: pick('delimiter') };
  const clock = args.clock ?? kept?.clock;
  if (Object.values(text).every((part) => part === undefined)) return { shape: OWN_SHAPE, clock };
  const from = (part: keyof ShapeText) =>
    args[part] !== undefined || kept === undefined ? { file: `--${part}` } : kept.where(part);
  return { shape: parseShape(text, from), clock };
}

function read(file: string): string {
  try {
    return readFileSync(file, 'utf8');
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    const found = code === 'ENOENT' ? 'no such file' : code === 'EISDIR' ? 'a directory' : '';
    if (found === '') throw systemError(`${file}: cannot be read`, error as NodeJS.ErrnoException);
    throw new InputError({ where: { file }, found, expected: 'a YAML file with columns, ops, delimiter and clock' });
  }
}
