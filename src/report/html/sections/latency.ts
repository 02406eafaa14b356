import type { Distribution, Result } from '../../../analysis/result-schema.js';
import { STACK_CLASSES, STAGES } from '../../../engine/recording.js';
import { formatCount, formatPercent, formatTime } from '../../../units.js';
import { LABELS, stageLabel } from '../../labels.js';
import { html, type Markup } from '../markup.js';
import { folded, table } from '../table.js';
import { legend, section } from './figure.js';

/** Mean read latency by stage, and the part in the controllers by what was waited for. */
export function latencySection({ read_latency: latency, latency_stack: stack, queue_wait: wait }: Result): Markup {
  const id = 'latency';
  const title = 'Where reads waited';
  if (latency.count === 0) return section({ id, title, reading: 'There were no reads.' });
  const stages = STAGES.map((name) => ({ key: name, label: stageLabel(name), ps: stack[`${name}_ps`] }));
  const causes = STACK_CLASSES.map((name) => ({ key: name, label: causeLabel(name), ps: wait[`${name}_ps`] }))
    .filter(({ ps }) => ps > 0)
    .sort((a, b) => b.ps - a.ps);
  const longest = stages.reduce((most, stage) => (stage.ps > most.ps ? stage : most));
  const reading =
    `A read took ${formatTime(stack.total_ps)} on the average, of which ${formatPercent(longest.ps / stack.total_ps)} were ${longest.label}. ` +
    `In its controller's queue it waited ${formatTime(wait.total_ps)}${causes.length > 0 ? `, most of it for ${causes[0].label}` : ''}.`;
  return section({
    id,
    title,
    reading,
    body: html`<div class="two"><div><h3>By stage</h3>${bars('Mean read latency by stage', stages, stack.total_ps, 'stage')}</div><div><h3>In the queue, by what it waited for</h3>${bars('Mean wait of a read in its queue, by cause', causes, wait.total_ps, 'cause')}</div></div>`,
  });
}

/** What a read waits for while the bus is used by others is their data. */
function causeLabel(name: (typeof STACK_CLASSES)[number]): string {
  if (name === 'read_data') return 'data of other reads';
  if (name === 'write_data') return 'data of writes';
  return LABELS[name];
}

interface Part {
  readonly key: string;
  readonly label: string;
  readonly ps: number;
}

/** A table whose rows carry bars: chart and table in one. */
function bars(caption: string, parts: readonly Part[], total: number, head: string): Markup {
  const most = Math.max(...parts.map(({ ps }) => ps), 0);
  const drawn = (ps: number, key: string): Markup =>
    html`<svg class="bar" viewBox="0 0 100 10" preserveAspectRatio="none" aria-hidden="true"><rect class="f-${key}" width="${(most > 0 ? (100 * ps) / most : 0).toFixed(2)}" height="10"/></svg>`;
  return table(
    caption,
    [{ head, text: true }, { head: '', text: true }, { head: 'mean' }, { head: 'share' }],
    [
      ...parts.map(({ key, label, ps }) => [
        label,
        drawn(ps, key),
        formatTime(ps),
        total > 0 ? formatPercent(ps / total) : '-',
      ]),
      ['total', '', formatTime(total), '100 %'],
    ],
  );
}

/** How many reads waited how long: the share of reads beyond a delay, whole and by stage. */
export function delaySection({ read_latency: latency, delay, write_delay }: Result): Markup {
  const id = 'delays';
  const title = 'Distribution of delays';
  if (latency.count === 0) return section({ id, title, reading: 'There were no reads.' });
  const head = [
    { head: 'delay', text: true as const },
    ...['mean', 'p50', 'p90', 'p99', 'p99.9', 'longest'].map((name) => ({ head: name })),
  ];
  const row = (name: string, d: Distribution) => [
    name,
    ...[d.mean_ps, d.p50_ps, d.p90_ps, d.p99_ps, d.p999_ps, d.max_ps].map(formatTime),
  ];
  const reads = table('Delays of reads', head, [
    ...STAGES.map((stage) => row(stageLabel(stage), delay[stage])),
    row('read latency', latency),
  ]);
  const writes = table(
    'Delays of writes, to their acknowledgement',
    head,
    STAGES.map((stage) => row(stageLabel(stage), write_delay[stage])),
  );
  return section({
    id,
    title,
    reading: `Of ${formatCount(latency.count)} reads half took up to ${formatTime(latency.p50_ps)}, one in a hundred more than ${formatTime(latency.p99_ps)}, one in a thousand more than ${formatTime(latency.p999_ps)}.`,
    controls: legend('delays', 'Delays, shown or hidden in the chart'),
    chart: {
      key: 'delays',
      label: 'Share of reads that waited longer than a delay, whole and by stage; the table below has percentiles',
    },
    body: html`${folded('Delays of reads as a table', reads)}${write_delay.window_wait.count > 0 && folded('Delays of writes', writes)}`,
  });
}
