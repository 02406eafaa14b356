import type { Result, Standing } from '../analysis/index.js';
import { formatBandwidth, formatFlops, formatTime } from '../units.js';
import { LABELS } from './labels.js';
import { facts, type Ink, ink, plain, type TextStyle, table, wrap } from './style.js';

const NAME = 18; // columns
const REASONS = 3; // losses named a kernel
const LEAST = 0.001; // of the kernel's time: what is less goes unnamed

/** Each kernel against its bound and its own estimate, and what took the difference. */
export function rooflineReport(
  result: Result,
  standings: readonly Standing[],
  within: number,
  style: TextStyle,
): string {
  const paint = ink(style);
  const lines = [summary(standings, within, paint), ceilings(result, paint), kernels(standings, paint)];
  const why = standings.filter(({ losses }) => losses.length > 0).map((standing) => reasons(standing, paint));
  return `${[...lines, paint.chalk.bold('What took the difference to the bound'), ...why].join('\n')}\n`;
}

function summary(standings: readonly Standing[], within: number, { chalk, width }: Ink): string {
  const judged = standings.filter(({ verdict }) => verdict !== null);
  const hold = judged.filter(({ verdict }) => verdict === 'holds');
  const off = judged.filter(({ verdict }) => verdict !== 'holds').sort((a, b) => farness(b) - farness(a));
  const percent = `${Number((100 * within).toPrecision(3))} %`;
  if (judged.length === 0) {
    const far = [...standings].sort((a, b) => b.timesBound - a.timesBound)[0];
    const text =
      far === undefined
        ? 'No kernel ran.'
        : `No kernel has an estimate; farthest from its bound is ${plain(far.name, NAME)}, ${times(far.timesBound)} of its least time.`;
    return chalk.bold(wrap(text, width));
  }
  const worst = off[0];
  const text =
    `${hold.length} of ${judged.length} estimates hold within ${percent}` +
    (worst === undefined
      ? '.'
      : `; farthest off is ${plain(worst.name, NAME)}, which takes ${times(worst.timesEstimate ?? 0)} of its estimate: ${because(worst)}.`);
  return chalk.bold(wrap(text, width));
}

const farness = ({ timesEstimate }: Standing): number => Math.abs(Math.log(timesEstimate ?? 1));

function because({ losses, boundPs, estimatePs, verdict }: Standing): string {
  const short =
    estimatePs !== null && verdict === 'below the bound'
      ? `its bound alone is ${times(boundPs / estimatePs)} of it`
      : '';
  const [first] = losses;
  const loss = first === undefined ? '' : `mostly ${LABELS[first.name]}`;
  return [short, loss].filter((part) => part !== '').join(', and ') || 'nothing was lost';
}

function ceilings({ bandwidth, package: pkg }: Result, { chalk, width }: Ink): string {
  const formats = new Map<string, number>();
  for (const die of pkg.dies)
    for (const [name, rate] of Object.entries(die.peakFlops)) formats.set(name, (formats.get(name) ?? 0) + rate);
  const ridge = (rate: number): string => (rate / bandwidth.bound_bytes_per_s).toPrecision(3);
  const items = [
    `DRAM ${formatBandwidth(bandwidth.peak_bytes_per_s)}`,
    `refresh-derated ${formatBandwidth(bandwidth.refresh_derated_bytes_per_s)}`,
    `links, this mix ${formatBandwidth(bandwidth.link_ceiling_bytes_per_s)}`,
    ...[...formats].map(([name, rate]) => `${plain(name, 12)} ${formatFlops(rate)}, ridge at ${ridge(rate)} FLOP/B`),
  ];
  return `${chalk.bold('Ceilings of the package')}\n${facts(items, width, '  ')}`;
}

function kernels(standings: readonly Standing[], { chalk }: Ink): string {
  const head = ['Kernels', 'time', 'bound', 'by', 'x bound', 'estimate', 'x est.', 'the estimate'];
  const rows = standings.map((s) => [
    plain(s.name, NAME),
    formatTime(s.durationPs),
    formatTime(s.boundPs),
    s.boundBy === 'none' ? '-' : s.boundBy,
    times(s.timesBound),
    s.estimatePs === null ? '-' : formatTime(s.estimatePs),
    s.timesEstimate === null ? '-' : times(s.timesEstimate),
    s.verdict === null ? '-' : VERDICTS[s.verdict],
  ]);
  const [first, ...rest] = table(head, rows, [3, 7]).split('\n');
  return [chalk.bold(first.slice(2)), ...rest].join('\n');
}

const VERDICTS: Readonly<Record<NonNullable<Standing['verdict']>, string>> = {
  holds: 'holds',
  'too hopeful': 'is too hopeful',
  'too careful': 'is too careful',
  'below the bound': 'is below the bound',
};

function reasons({ name, losses, durationPs, boundPs }: Standing, { width }: Ink): string {
  const shown = losses.slice(0, REASONS).filter((loss) => loss.ps > 0);
  const saved = losses.filter((loss) => loss.ps < -LEAST * durationPs);
  const named = [...shown, ...saved];
  const items = named.map((loss) => `${LABELS[loss.name]} ${signed(loss.ps)}`);
  const rest = durationPs - boundPs - named.reduce((sum, loss) => sum + loss.ps, 0);
  if (Math.abs(rest) > LEAST * durationPs) items.push(`other ${signed(rest)}`);
  const lead = `  ${plain(name, NAME).padEnd(NAME)} ${signed(durationPs - boundPs).padStart(9)}  `;
  // lines break between the items
  const lines: string[] = [];
  let line = lead;
  for (const [i, item] of items.entries()) {
    const part = i < items.length - 1 ? `${item}, ` : item;
    if (line.trim() !== '' && line !== lead && line.length + part.trimEnd().length > width) {
      lines.push(line.trimEnd());
      line = ' '.repeat(lead.length);
    }
    line += part;
  }
  return [...lines, line].join('\n');
}

const signed = (ps: number): string => `${ps < 0 ? '-' : ''}${formatTime(Math.abs(ps))}`;

function times(ratio: number): string {
  return ratio >= 1000 ? '> 999 x' : `${ratio.toFixed(2)} x`;
}
