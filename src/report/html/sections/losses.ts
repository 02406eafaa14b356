import { type Standing, standings } from '../../../analysis/losses.js';
import type { Result } from '../../../analysis/result-schema.js';
import { formatTime } from '../../../units.js';
import { LABELS } from '../../labels.js';
import { html, type Markup } from '../markup.js';
import { table } from '../table.js';
import { together } from './figure.js';

const WITHIN = 0.1; // of the time: so far off an estimate holds; as `penstock roofline` has it
const REASONS = 3; // losses named a kernel
const LEAST = 0.001; // of the kernel's time: what is less goes unnamed
const MOST = 1000; // kernels in the table

/** What each kernel's time beyond its bound went to, and whether its estimate holds. */
export function lossTable(result: Result): Markup {
  const found = standings(result, WITHIN);
  const shown = [...found].sort((a, b) => excess(b) - excess(a)).slice(0, MOST);
  const kept = new Set(shown);
  const rows = found
    .filter((standing) => kept.has(standing))
    .map((s) => [
      s.name,
      formatTime(s.durationPs),
      s.boundPs > 0 ? formatTime(s.boundPs) : '-',
      s.boundPs > 0 ? times(s.timesBound) : '-',
      s.timesEstimate === null ? '-' : times(s.timesEstimate),
      s.verdict === null ? '-' : s.verdict,
      together(reasons(s)),
    ]);
  const columns = [
    { head: 'kernel', text: true as const },
    { head: 'time' },
    { head: 'least by its bound' },
    { head: 'x bound' },
    { head: 'x estimate' },
    { head: 'the estimate', text: true as const },
    { head: 'what took the difference to the bound', text: true as const },
  ];
  return html`<h3>What took the difference</h3>${table(`Losses of each kernel; an estimate holds within ${100 * WITHIN} %`, columns, rows)}`;
}

const excess = ({ durationPs, boundPs }: Standing): number => durationPs - boundPs;

/** The largest losses, what refresh put off saved, and the rest, so that they add up. */
function reasons({ losses, durationPs, boundPs }: Standing): string {
  const named = losses.filter((loss, i) => (i < REASONS && loss.ps > 0) || loss.ps < -LEAST * durationPs);
  const rest = durationPs - boundPs - named.reduce((sum, { ps }) => sum + ps, 0);
  const parts = named.map(({ name, ps }) => `${LABELS[name]} ${signed(ps)}`);
  if (Math.abs(rest) > LEAST * durationPs) parts.push(`other ${signed(rest)}`);
  return parts.join(', ') || '-';
}

const signed = (ps: number): string => `${ps < 0 ? '-' : ''}${formatTime(Math.abs(ps))}`;

function times(ratio: number): string {
  return ratio >= 1000 ? '> 999' : ratio.toFixed(2);
}
