import type { Result } from '../../../analysis/result-schema.js';
import { formatBytes, formatCount } from '../../../units.js';
import { html, type Markup } from '../markup.js';
import type { BankData } from '../page-data.js';
import { folded, table } from '../table.js';
import { section } from './figure.js';

/** Traffic, activates and conflicts of every bank, by stack and channel. */
export function bankSection({ bandwidth }: Result, { rows, columns, metrics }: BankData): Markup {
  const [bytes] = metrics;
  const width = columns.length;
  const most = bytes.values.reduce((top, value, i) => (value > bytes.values[top] ? i : top), 0);
  const total = bytes.values.reduce((sum, value) => sum + value, 0);
  const mean = total / Math.max(1, bytes.values.length);
  const idle = bytes.values.filter((value) => value === 0).length;
  const reading =
    total === 0
      ? 'No bank moved any byte.'
      : `The busiest bank (pseudo-channel ${rows[Math.floor(most / width)]}, bank ${columns[most % width]}) moved ${formatBytes(bytes.values[most])}, ${(bytes.values[most] / mean).toFixed(2)} times the mean of all banks.${idle > 0 ? ` ${formatCount(idle)} of ${formatCount(bytes.values.length)} banks moved nothing.` : ''}`;
  const spread = (values: readonly number[], row: number) => {
    const part = values.slice(row * width, (row + 1) * width);
    const sum = part.reduce((a, b) => a + b, 0);
    const top = part.reduce((at, value, i) => (value > part[at] ? i : at), 0);
    return { sum, least: Math.min(...part), most: part[top], top: columns[top] };
  };
  const lines = bandwidth.pseudo_channels.map((at, row) => {
    const [moved, activates, conflicts] = metrics.map(({ values }) => spread(values, row));
    return [
      rows[row],
      formatBytes(moved.sum),
      formatBytes(moved.least),
      formatBytes(moved.most),
      moved.top,
      formatCount(activates.sum),
      formatCount(activates.most),
      formatCount(conflicts.sum),
      formatCount(conflicts.most),
      formatCount(at.refreshes),
    ];
  });
  const heads = [
    'stack.channel.pseudo-channel',
    'bytes',
    'least of a bank',
    'most of a bank',
    'bank',
    'activates',
    'most of a bank',
    'conflicts',
    'most of a bank',
    'refreshes',
  ];
  const choice = metrics.map(({ key, label }) => html`<option value="${key}">${label}</option>`);
  return section({
    id: 'banks',
    title: 'Banks',
    reading,
    controls: html`<div class="tools"><label>Show <select data-metric>${choice}</select></label><span>rows: stack, channel and pseudo-channel; columns: ${columns.length} banks by ${columns[0].split('.').length === 3 ? 'stack ID, ' : ''}bank group and bank</span></div>`,
    chart: {
      key: 'banks',
      label: 'Heat map of all banks; the table below has the figures by pseudo-channel',
      size: 'map',
    },
    body: folded(
      'By pseudo-channel as a table',
      table(
        'Banks by pseudo-channel',
        heads.map((head, i) => (i === 0 ? { head, text: true as const } : { head })),
        lines,
      ),
    ),
  });
}
