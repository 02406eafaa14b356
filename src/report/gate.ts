import { formatTime } from '../units.js';
import { fails, type GateCause, type GateComparison, type GateRow, type GateTable } from './gate-table.js';
import { LABELS } from './labels.js';
import { showQuantity } from './quantity.js';
import { type Ink, ink, plain, type TextStyle, table, wrap } from './style.js';

const MOST_ROWS = 30; // the rest is in the JSON and the Markdown

/** A gate in a terminal: the verdict, what is not the same about the runs, what moved, and where the time went. */
export function gateReport(gate: GateTable, style: TextStyle): string {
  const paint = ink(style);
  return `${gate.comparisons.map((comparison) => section(gate, comparison, paint)).join('\n\n')}\n`;
}

function section(gate: GateTable, comparison: GateComparison, { chalk, width }: Ink): string {
  const { rows, differences, verdict } = comparison;
  const colour = verdict === 'worse' ? chalk.red : verdict === 'better' ? chalk.green : chalk;
  const lines = [colour.bold(wrap(gateSentence(gate, comparison), width))];
  for (const difference of differences) lines.push(`  ${wrap(plain(difference), width - 2, '    ')}`);
  const moved = sorted(rows.filter((row) => row.verdict !== 'same'));
  if (moved.length > 0) {
    const shown = moved
      .slice(0, MOST_ROWS)
      .map((row) => [row.verdict, row.kernel === null ? 'run' : plain(row.kernel, 24), row.figure, ...gateCells(row)]);
    const [head, ...rest] = table(HEAD, shown, [1, 2]).split('\n');
    lines.push('', chalk.dim(head), ...rest.map((line, i) => (fails(moved[i].verdict) ? chalk.red(line) : line)));
    if (moved.length > MOST_ROWS) lines.push(chalk.dim(`  and ${moved.length - MOST_ROWS} more`));
  }
  const causes = comparison.causes.map((cause) => `  ${wrap(plain(gateCause(cause)), width - 2, '    ')}`);
  if (causes.length > 0) lines.push('', chalk.bold('Where the time went'), ...causes);
  return lines.join('\n');
}

const HEAD = ['verdict', 'kernel', 'figure', 'baseline', 'now', 'change', 'allowed'];

/** The verdict on one candidate in one sentence. */
export function gateSentence({ baseline }: GateTable, { candidate, rows, verdict }: GateComparison): string {
  const count = (of: GateRow['verdict']): number => rows.filter((row) => row.verdict === of).length;
  const names = `${plain(candidate)} against ${plain(baseline)}`;
  const parts = (['missing', 'worse', 'better', 'changed', 'new'] as const)
    .map((of) => [of, count(of)] as const)
    .filter(([, n]) => n > 0)
    .map(([of, n]) => `${n} ${of}`);
  if (parts.length === 0) return `Same: ${names}: all ${rows.length} figures are within their tolerances.`;
  const word = { worse: 'Worse', better: 'Better', same: 'Same', changed: 'Changed' }[verdict];
  return `${word}: ${names}: ${parts.join(', ')}, ${count('same')} of ${rows.length} figures the same.`;
}

/** Why a kernel takes longer or shorter, in one sentence. */
export function gateCause({ kernel, class: name, moved_ps, total_ps }: GateCause): string {
  const sign = (ps: number): string => `${ps < 0 ? '-' : '+'}${formatTime(Math.abs(ps))}`;
  const who = kernel === null ? 'run' : kernel;
  return `${who}: ${LABELS[name]} moved most, ${sign(moved_ps)} of ${sign(total_ps)} in all (mean of the pseudo-channels)`;
}

/** Baseline, candidate, change and what is allowed, as text. */
export function gateCells({
  kind,
  share,
  baseline,
  candidate,
  change,
  allowed,
  figure,
}: GateRow): [string, string, string, string] {
  if (figure === 'kernel') {
    const word = (side: number | null): string => (side === null ? 'absent' : 'present');
    return [word(baseline), word(candidate), '', ''];
  }
  const show = (value: number | null): string => (value === null ? 'none' : showQuantity(value, kind, share));
  const percent = change === null ? '' : signed(100 * change);
  const limit =
    baseline === null || baseline === 0 ? show(allowed) : `${number((100 * allowed) / Math.abs(baseline))} %`;
  return [show(baseline), show(candidate), percent, allowed === 0 ? 'nothing' : limit];
}

/** Failures first, then what is better, then the rest; in each the greatest change first. */
export function sorted(rows: readonly GateRow[]): GateRow[] {
  const rank = { missing: 0, worse: 1, better: 2, changed: 3, new: 4, same: 5 };
  const size = (row: GateRow): number => Math.abs(row.change ?? Number.POSITIVE_INFINITY);
  return rows
    .map((row, i) => ({ row, i }))
    .sort((a, b) => rank[a.row.verdict] - rank[b.row.verdict] || order(size(b.row), size(a.row)) || a.i - b.i)
    .map(({ row }) => row);
}

const order = (a: number, b: number): number => (a === b ? 0 : a - b);

const signed = (percent: number): string => `${percent < 0 ? '-' : '+'}${number(Math.abs(percent))} %`;

/** Three significant digits. */
const number = (value: number): string => String(Number(value.toPrecision(3)));
