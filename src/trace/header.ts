/** The header row of a trace: which kind of trace it is, and which cell of a row holds which column. */
import { InputError, nearest } from '../errors.js';

export type TraceKind = 'access' | 'kernel';

/** Columns of an access trace. At most one of the time columns may be there. */
export const ACCESS_COLUMNS = {
  required: ['op', 'address', 'bytes'],
  time: ['time_ps', 'time_ns', 'time_us', 'cycle'],
  optional: ['die', 'engine', 'kernel', 'tile', 'flops', 'after'],
} as const;

/** Columns of a kernel trace. A cell of a required column may still be empty where the column has a default. */
export const KERNEL_COLUMNS = {
  required: ['kernel', 'stream', 'format', 'flops', 'read', 'write', 'read_pattern', 'write_pattern'],
  optional: ['tile', 'die', 'repeat', 'estimate_us'],
} as const;

export interface Header {
  readonly kind: TraceKind;
  readonly names: readonly string[]; // as written, by position
  readonly line: number;
  readonly at: ReadonlyMap<string, number>; // position of each column
}

/** Understands a header row. Throws InputError for a column that is missing, unknown or there twice. */
export function readHeader(row: readonly string[], line: number, file: string): Header {
  const names = row.map((cell) => cell.trim());
  const kind = kindOf(names, line, file);
  const required: readonly string[] = kind === 'access' ? ACCESS_COLUMNS.required : KERNEL_COLUMNS.required;
  const optional: readonly string[] =
    kind === 'access' ? [...ACCESS_COLUMNS.time, ...ACCESS_COLUMNS.optional] : KERNEL_COLUMNS.optional;
  const known = [...required, ...optional];
  const where = { file, line };
  const at = new Map<string, number>();
  names.forEach((name, position) => {
    if (at.has(name)) {
      throw new InputError({
        where: { ...where, path: name },
        found: `column '${name}' twice`,
        expected: 'each column once',
        hint: 'remove or rename one of them',
      });
    }
    at.set(name, position);
  });
  for (const name of required) {
    if (at.has(name)) continue;
    const like = nearest(
      name,
      names.filter((other) => other !== '' && !known.includes(other)),
    );
    throw new InputError({
      where,
      found: `no column '${name}' among ${list(names)}`,
      expected: `the columns of ${article(kind)} trace: ${required.join(', ')}`,
      hint: like === undefined ? `add a column '${name}'` : `is '${like}' meant to be '${name}'? rename it`,
    });
  }
  for (const name of names) {
    if (known.includes(name)) continue;
    const like = name === '' ? undefined : nearest(name, known);
    throw new InputError({
      where: { ...where, path: name },
      found: name === '' ? 'a column without a name' : `unknown column '${name}'`,
      expected: `columns of ${article(kind)} trace: ${required.join(', ')}; optional ${optional.join(', ')}`,
      hint: like === undefined ? 'remove it' : `did you mean '${like}'?`,
    });
  }
  if (kind === 'access') {
    const times = ACCESS_COLUMNS.time.filter((name) => at.has(name));
    if (times.length > 1) {
      throw new InputError({
        where: { ...where, path: times[1] },
        found: `the time columns ${list(times)}`,
        expected: `at most one of ${ACCESS_COLUMNS.time.join(', ')}`,
        hint: 'keep one of them',
      });
    }
  }
  return { kind, names, line, at };
}

/** The kind whose own columns (those the other kind has not) are more. */
function kindOf(names: readonly string[], line: number, file: string): TraceKind {
  const score = (own: readonly string[]) => names.filter((name) => own.includes(name)).length;
  const access = score([...ACCESS_COLUMNS.required, ...ACCESS_COLUMNS.time, 'engine', 'after']);
  const kernel = score(['stream', 'format', 'read', 'write', 'read_pattern', 'write_pattern', 'repeat', 'estimate_us']);
  if (access > kernel) return 'access';
  if (kernel > access) return 'kernel';
  throw new InputError({
    where: { file, line },
    found: `a header row of neither kind of trace: ${list(names)}`,
    expected: `${ACCESS_COLUMNS.required.join(', ')} for accesses, or ${KERNEL_COLUMNS.required.join(', ')} for kernels`,
    hint: 'the first row that is no comment names the columns',
  });
}

function article(kind: TraceKind): string {
  return kind === 'access' ? 'an access' : 'a kernel';
}

/** Names in quotes, shortened when a file is no trace at all. */
function list(names: readonly string[]): string {
  const shown = names.slice(0, 16).map((name) => `'${name.length > 40 ? `${name.slice(0, 40)}…` : name}'`);
  return shown.join(', ') + (names.length > 16 ? `, … (${names.length} in all)` : '');
}
