import { formatBandwidth, formatPercent, formatTime } from '../units.js';
import { bar, facts, type Ink, ink, plain, type TextStyle, table, wrap } from './style.js';

/** A re-run with limits lifted, as the study hands it over. */
interface Row {
  readonly label: string;
  readonly makespan_ps: number;
  readonly saved_ps: number;
  readonly saved_ratio: number;
  readonly achieved_bytes_per_s: number;
  readonly binds: string;
}

/** What the report needs of a WhatIf; the study's own type has more. */
export interface WhatIfFigures {
  readonly partial: boolean;
  readonly makespan_ps: number;
  readonly data_ps: number;
  readonly binds: string;
  readonly sentence: string;
  readonly lifted: readonly Row[];
  readonly everything: Row | null;
  readonly pairs: readonly (Row & { readonly together_ps: number })[];
  readonly idle: readonly string[];
}

export interface WhatIfSource {
  readonly packageFile: string;
  readonly traceFile: string;
  readonly overrides: readonly string[];
}

const CELLS = 12; // columns of a bar
const MOST_PAIRS = 10;
const WORTH = 0.001; // of the run: a pair that gains less together is not shown

/** What the run would save with one limit lifted at a time, most first. */
export function whatIfReport(found: WhatIfFigures, source: WhatIfSource, style: TextStyle): string {
  const paint = ink(style);
  const { chalk, width } = paint;
  const head = facts(
    [
      'penstock whatif',
      plain(source.packageFile),
      plain(source.traceFile),
      ...source.overrides.map((text) => plain(text)),
    ],
    width,
    '',
  );
  const lines = [
    chalk.dim(head),
    chalk.bold(wrap(headline(found), width)),
    wrap(`As it is: ${found.sentence}`, width),
    rows(found, paint),
    ...pairs(found, paint),
  ];
  if (found.idle.length > 0) lines.push(wrap(`Not a limit of this package: ${found.idle.join(', ')}.`, width));
  if (found.partial) lines.push(chalk.yellow('Partial: interrupted; what had not been run is missing.'));
  return `${lines.join('\n')}\n`;
}

function headline({ lifted, everything, makespan_ps }: WhatIfFigures): string {
  const [first, second] = lifted;
  if (first === undefined) return 'No limit was lifted.';
  const all = everything === null ? '' : `; all of them together ${saved(everything)}`;
  if (first.saved_ratio < WORTH) return `No limit saves anything by itself${all} of ${formatTime(makespan_ps)}.`;
  const then =
    second !== undefined && second.saved_ratio >= WORTH
      ? `, then ${second.label} (${formatPercent(second.saved_ratio)})`
      : '';
  return `Lifting ${first.label} would save most: ${saved(first)} of ${formatTime(makespan_ps)}${then}${all}.`;
}

function saved({ saved_ps, saved_ratio }: Row): string {
  return `${signedTime(saved_ps)} (${signedPercent(saved_ratio)})`;
}

function rows({ lifted, everything, makespan_ps, data_ps, binds }: WhatIfFigures, { chalk, width }: Ink): string {
  const row = (name: string, r: Row): string[] => [
    name,
    formatTime(r.makespan_ps),
    signedTime(r.saved_ps),
    signedPercent(r.saved_ratio),
    chalk.green(bar(r.saved_ratio, CELLS)),
    formatBandwidth(r.achieved_bytes_per_s),
    bound(r.binds),
  ];
  // what changes next to nothing shares a line
  const shown = lifted.filter(({ saved_ratio }) => Math.abs(saved_ratio) >= WORTH);
  const idle = lifted.filter((r) => !shown.includes(r)).map(({ label }) => label);
  const body = [
    ['as it is', formatTime(makespan_ps), '', '', ' '.repeat(CELLS), '', bound(binds)],
    ...shown.map((r) => row(r.label, r)),
    ...(everything === null ? [] : [row('all of these', everything)]),
    ['data alone, at peak', formatTime(data_ps), '', '', '', '', ''],
  ];
  const rest =
    idle.length === 0 ? [] : [wrap(`  less than ${formatPercent(WORTH)} each: ${idle.join(', ')}`, width, '  ')];
  const text = table(['Without', 'time', 'saved', '', '', 'bandwidth', 'then binds'], body, [4, 6]);
  const [first, ...lines] = text.split('\n');
  return [chalk.bold(first.slice(2)), ...lines, ...rest].join('\n');
}

function pairs({ pairs: all, makespan_ps }: WhatIfFigures, { chalk }: Ink): string[] {
  if (all.length === 0) return [];
  const shown = all.filter(({ together_ps }) => together_ps >= WORTH * makespan_ps).slice(0, MOST_PAIRS);
  if (shown.length === 0) return [chalk.bold('No two limits save more together than each alone.')];
  const body = shown.map((pair) => [
    pair.label,
    formatTime(pair.makespan_ps),
    signedTime(pair.saved_ps),
    signedPercent(pair.saved_ratio),
    signedTime(pair.together_ps),
  ]);
  const [first, ...rest] = table(['Two that help each other', 'time', 'saved', '', 'beyond each alone'], body).split(
    '\n',
  );
  return [[chalk.bold(first.slice(2)), ...rest].join('\n')];
}

function signedTime(ps: number): string {
  return ps < 0 ? `-${formatTime(-ps)}` : formatTime(ps);
}

function signedPercent(ratio: number): string {
  return ratio < 0 ? `-${formatPercent(-ratio)}` : formatPercent(ratio);
}

const bound = (binds: string): string =>
  binds === 'nothing' ? 'no single limit' : binds.replace('starved_', '').replaceAll('_', ' ');
