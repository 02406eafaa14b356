import type { Result } from '../../../analysis/result-schema.js';
import { formatBandwidth, formatTime } from '../../../units.js';
import { html, type Markup } from '../markup.js';
import type { PageData } from '../page-data.js';
import { folded, table } from '../table.js';
import { section } from './figure.js';

const ZOOMS = [
  ['in', 'Zoom in'],
  ['out', 'Zoom out'],
  ['left', 'Earlier'],
  ['right', 'Later'],
  ['all', 'Whole run'],
] as const;

/** Kernels, bandwidth and the bandwidth stack over time, on one axis that zooms. */
export function timeSection({ bandwidth, makespan_ps }: Result, { time, classes }: PageData): Markup {
  const total = time.read.map((read, i) => read + time.write[i]);
  const most = total.reduce((top, rate, i) => (rate > total[top] ? i : top), 0);
  const at = (i: number): string => formatTime(i * time.slicePs);
  const reading =
    total.length === 0
      ? 'No byte crossed a DRAM data bus.'
      : `Bandwidth was highest at ${at(most)}: ${formatBandwidth(total[most])}, against ${formatBandwidth(bandwidth.achieved_bytes_per_s)} over the whole run of ${formatTime(makespan_ps)}. Each point is a mean over ${formatTime(time.slicePs)}.`;
  const buttons = ZOOMS.map(([key, name]) => html`<button type="button" data-zoom="${key}">${name}</button>`);
  const rates = table(
    'Bandwidth over time',
    [{ head: 'from' }, { head: 'read' }, { head: 'write' }],
    total.map((_, i) => [at(i), formatBandwidth(time.read[i]), formatBandwidth(time.write[i])]),
  );
  const shares = table(
    'Bandwidth stack over time, per cent of the clocks',
    [{ head: 'from' }, ...classes.map(({ label }) => ({ head: label }))],
    (time.shares[0] ?? []).map((_, i) => [
      formatTime(i * time.stackSlicePs),
      ...time.shares.map((column) => (100 * column[i]).toFixed(1)),
    ]),
  );
  return section({
    id: 'time',
    title: 'Over time',
    reading,
    controls: html`<div class="tools" role="group" aria-label="Time axis" aria-controls="time">${buttons}<output data-zoomed aria-live="polite"></output></div>`,
    chart: {
      key: 'time',
      label: 'Kernels, bandwidth and bandwidth stack over time; the tables below have the figures',
      size: 'tall',
    },
    body: html`${folded('Bandwidth over time as a table', rates)}${folded('The stack over time as a table', shares)}`,
  });
}
