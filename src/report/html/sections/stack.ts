import type { BandwidthStack, Result } from '../../../analysis/result-schema.js';
import { STACK_CLASSES } from '../../../engine/recording.js';
import { formatCount, formatPercent } from '../../../units.js';
import { LABELS } from '../../labels.js';
import { longest, MOST_KERNELS } from '../data.js';
import { html, type Markup } from '../markup.js';
import { cell, folded, table } from '../table.js';
import { legend, section } from './figure.js';

const MOST_ROWS = 1000; // kernels in the table

/** Where the clocks of the data buses went: for the run, by kernel, by stack. */
export function stackSection({ bandwidth_stack: stack, kernels, bandwidth }: Result): Markup {
  const id = 'stack';
  const title = 'Where the DRAM clocks went';
  if (stack.total === 0)
    return section({ id, title, reading: 'Not recorded: no clock passed, or attribution was off.' });
  const used = STACK_CLASSES.filter((name) => stack[name] > 0);
  const data = (stack.read_data + stack.write_data) / stack.total;
  const losses = used.filter((name) => !name.endsWith('_data')).sort((a, b) => stack[b] - stack[a]);
  const leading = losses.slice(0, 3).map((name) => `“${LABELS[name]}” ${formatPercent(stack[name] / stack.total)}`);
  const reading =
    `Data crossed the DRAM data buses for ${formatPercent(data)} of their clocks` +
    `${leading.length > 0 ? `; the largest losses are ${leading.join(', ')}` : ''}. Every clock of every pseudo-channel is in exactly one class.`;
  const shown = longest(
    kernels.filter((kernel) => kernel.bandwidth_stack.total > 0),
    MOST_KERNELS,
  ).length;
  const columns = [{ head: 'of all clocks', text: true as const }, ...used.map((name) => ({ head: LABELS[name] }))];
  const row = (name: string, of: BandwidthStack) => [
    name,
    ...used.map((part) => (of.total > 0 ? cell(percent(of[part] / of.total), of[part]) : '-')),
  ];
  const rows = [
    row('whole run', stack),
    ...bandwidth.stacks.map((at) => row(`stack ${at.stack}`, at.bandwidth_stack)),
    ...longest(kernels, MOST_ROWS).map((kernel) => row(kernel.name, kernel.bandwidth_stack)),
  ];
  const whole = table(
    'Bandwidth stack of the run, in clocks of all pseudo-channels',
    [{ head: 'class', text: true }, { head: 'clocks' }, { head: 'share' }],
    [
      ...used.map((name) => [LABELS[name], formatCount(stack[name]), percent(stack[name] / stack.total)]),
      ['total', formatCount(stack.total), '100 %'],
    ],
  );
  return section({
    id,
    title,
    reading,
    controls: html`${bar(stack, used)}${legend('stacks', 'Classes of the bandwidth stack, shown or hidden in the charts by kernel and over time')}<h3>By kernel</h3>`,
    chart: {
      key: 'stacks',
      label: `Bandwidth stack of ${shown} kernels, as shares of their clocks; the table below has the figures`,
      size: 'rows',
    },
    body: html`${folded('The stack as a table', whole)}${folded('By stack and kernel as a table', table('Bandwidth stack by stack and kernel', columns, rows))}`,
  });
}

/** One bar for the whole run, drawn without the page's program. */
function bar(stack: BandwidthStack, used: readonly (typeof STACK_CLASSES)[number][]): Markup {
  let x = 0;
  const parts = used.map((name) => {
    const width = (1000 * stack[name]) / stack.total;
    const part = html`<rect class="f-${name}" x="${x.toFixed(2)}" width="${width.toFixed(2)}" height="40"><title>${LABELS[name]} ${percent(stack[name] / stack.total)}</title></rect>`;
    x += width;
    return part;
  });
  return html`<svg class="whole" viewBox="0 0 1000 40" preserveAspectRatio="none" role="img" aria-label="Bandwidth stack of the whole run; the table below has the figures">${parts}</svg>`;
}

function percent(share: number): string {
  return `${(100 * share).toFixed(1)} %`;
}
