/** What is not the same about two runs, before any figure: package, trace, options, program. */
import type { Result } from '../analysis/index.js';

const MOST_KEYS = 12; // of a package, named one by one
const UNTOLD = ['file', 'hash', 'caution']; // where a package comes from is not what it is

/** One line each; empty when the runs were of one package and one trace with the same options. */
export function differencesOf(baseline: Result, result: Result): string[] {
  const [one, other] = [baseline.provenance, result.provenance];
  const lines: string[] = [];
  if (one.package_hash !== other.package_hash) {
    const keys = [...differing('', baseline.package, result.package)];
    const more = keys.length > MOST_KEYS ? `, and ${keys.length - MOST_KEYS} more` : '';
    const named = keys.length === 0 ? 'its hash alone' : keys.slice(0, MOST_KEYS).join(', ') + more;
    lines.push(`the package is another (${short(one.package_hash)} -> ${short(other.package_hash)}): ${named}`);
  }
  if (one.trace_hash !== other.trace_hash) {
    const rows = one.trace_rows === other.trace_rows ? '' : `, ${one.trace_rows} -> ${other.trace_rows} rows`;
    lines.push(`the trace is another (${short(one.trace_hash)} -> ${short(other.trace_hash)}${rows})`);
  }
  if (one.skipped_rows !== other.skipped_rows) {
    lines.push(`rows of the trace were skipped: ${one.skipped_rows} -> ${other.skipped_rows}`);
  }
  if (one.seed !== other.seed) lines.push(`the seed is another: ${one.seed} -> ${other.seed}`);
  for (const option of ['replay', 'until_ps'] as const) {
    if (one.options[option] === other.options[option]) continue;
    lines.push(`${option} is another: ${one.options[option] ?? 'none'} -> ${other.options[option] ?? 'none'}`);
  }
  if (one.version !== other.version) lines.push(`the program is another: ${one.version} -> ${other.version}`);
  return lines;
}

const short = (hash: string): string => hash.slice(0, 12);

/** Every value that differs, as `path before -> after`; what one side lacks is said so. */
function* differing(path: string, one: unknown, other: unknown): Generator<string> {
  if (isBranch(one) && isBranch(other) && Array.isArray(one) === Array.isArray(other)) {
    for (const key of new Set([...Object.keys(one), ...Object.keys(other)])) {
      if (path === '' && UNTOLD.includes(key)) continue;
      yield* differing(path === '' ? key : `${path}.${key}`, one[key], other[key]);
    }
  } else if (JSON.stringify(one) !== JSON.stringify(other)) yield `${path} ${word(one)} -> ${word(other)}`;
}

function isBranch(value: unknown): value is Readonly<Record<string, unknown>> {
  return typeof value === 'object' && value !== null;
}

function word(value: unknown): string {
  if (value === undefined) return 'nothing';
  const text = typeof value === 'string' ? value : JSON.stringify(value);
  return text.length > 40 ? `${text.slice(0, 39)}…` : text;
}
