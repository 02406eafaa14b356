/** The header row of a trace: which kind of trace it is, and which cell of a row holds which column. */
import { InputError, nearest } from '../errors.js';
import { ACCESS_COLUMNS, KERNEL_COLUMNS } from './columns.js';
import { OWN_SHAPE, type Shape } from './shape.js';

export type TraceKind = 'access' | 'kernel';

export interface Header {
  readonly kind: TraceKind;
  readonly names: readonly string[]; // as written, by position
  readonly line: number;
  readonly at: ReadonlyMap<string, number>; // position of each column; from names.length on: values
  readonly values: readonly string[]; // cells that every row has behind those of the file
  readonly hex: boolean; // addresses are hexadecimal without 0x
  readonly shape: Shape;
}

const TIME_UNITS: Readonly<Record<string, string>> = {
  ps: 'time_ps',
  ns: 'time_ns',
  us: 'time_us',
  ms: 'time_ms',
  s: 'time_s',
  cycle: 'cycle',
};

/** Understands a header row. Throws InputError for a column that is missing, unknown or there twice. */
export function readHeader(row: readonly string[], line: number, file: string, shape: Shape = OWN_SHAPE): Header {
  const names = row.map((cell) => cell.trim());
  if (shape !== OWN_SHAPE) return capturedHeader(names, line, file, shape);
  const kind = kindOf(names, line, file);
  const required: readonly string[] = kind === 'access' ? ACCESS_COLUMNS.required : KERNEL_COLUMNS.required;
  const optional: readonly string[] =
    kind === 'access' ? [...ACCESS_COLUMNS.time, ...ACCESS_COLUMNS.optional] : KERNEL_COLUMNS.optional;
  const known = [...required, ...optional];
  const where = { file, line };
  const at = new Map<string, number>();
  names.forEach((name, position) => {
    if (at.has(name)) throw twice(name, where);
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
  return { kind, names, line, at, values: [], hex: false, shape };
}

function twice(name: string, where: { readonly file: string; readonly line: number }): InputError {
  return new InputError({
    where: { ...where, path: name },
    found: `column '${name}' twice`,
    expected: 'each column once',
    hint: 'remove or rename one of them',
  });
}

/** The header of a captured trace: the columns its shape names, then those with our own names; all others are passed over. */
function capturedHeader(names: readonly string[], line: number, file: string, shape: Shape): Header {
  const where = { file, line };
  const at = new Map<string, number>();
  const values: string[] = [];
  let hex = false;
  for (const [column, source] of shape.columns) {
    const unit = source.kind === 'column' ? source.unit : '';
    const name = column === 'time' ? (TIME_UNITS[unit] ?? 'time_ps') : column;
    if (source.kind === 'value') {
      at.set(name, names.length + values.length);
      values.push(source.text);
      continue;
    }
    const position = names.indexOf(source.name);
    if (position < 0) {
      const like = nearest(source.name, names);
      throw new InputError({
        where,
        found: `no column '${source.name}' among ${list(names)}`,
        expected: `the column that is our '${column}'`,
        hint: like === undefined ? 'names are those of the header row' : `did you mean '${like}'?`,
      });
    }
    if (names.lastIndexOf(source.name) !== position) throw twice(source.name, where);
    at.set(name, position);
    if (unit === 'hex') hex = true;
  }
  const timed = Object.values(TIME_UNITS).some((name) => at.has(name));
  for (const name of [...ACCESS_COLUMNS.required, ...ACCESS_COLUMNS.optional, ...(timed ? [] : ACCESS_COLUMNS.time)]) {
    const position = names.indexOf(name);
    if (at.has(name) || position < 0) continue;
    if (names.lastIndexOf(name) !== position) throw twice(name, where);
    at.set(name, position);
  }
  for (const name of ACCESS_COLUMNS.required) {
    if (at.has(name)) continue;
    throw new InputError({
      where,
      found: `no column '${name}' among ${list(names)}`,
      expected: `all of ${ACCESS_COLUMNS.required.join(', ')}`,
      hint: `say which column it is (${name}=…), or one value for all rows (${name}==…)`,
    });
  }
  return { kind: 'access', names, line, at, values, hex, shape };
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
