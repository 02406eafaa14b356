import type { Distribution, Result } from '../../analysis/result-schema.js';
import { STAGES } from '../../engine/recording.js';
import { formatCount, formatPercent, formatTime } from '../../units.js';
import { stageLabel } from '../labels.js';
import { facts, type Ink, table } from '../style.js';

/** Read latency with the delay of every stage: the means add up to the mean latency. */
export function latencySection(
  { read_latency: latency, delay, write_delay, queues, dram }: Result,
  { chalk, width }: Ink,
): string {
  const lines = [chalk.bold('Read latency and queueing delay')];
  if (latency.count === 0) {
    lines.push('  no reads');
  } else {
    const row = (name: string, d: Distribution, share: string): string[] => [
      name,
      ...[d.mean_ps, d.p50_ps, d.p90_ps, d.p99_ps, d.p999_ps, d.max_ps].map(formatTime),
      share,
    ];
    const rows = STAGES.map((stage) =>
      row(
        stageLabel(stage),
        delay[stage],
        latency.mean_ps > 0 ? formatPercent(delay[stage].mean_ps / latency.mean_ps) : '',
      ),
    );
    const head = [`${formatCount(latency.count)} reads`, 'mean', 'p50', 'p90', 'p99', 'p99.9', 'max', 'of mean'];
    lines.push(table(head, [...rows, row('total', latency, '')]));
  }
  const writes = write_delay.window_wait.count;
  const hits = dram.row_hits + dram.row_misses + dram.row_conflicts;
  const notes = [
    `queue entries a pseudo-channel: read ${entries(queues.read)}, write ${entries(queues.write)}`,
    ...(writes > 0
      ? [`writes acknowledged after ${formatTime(STAGES.reduce((sum, s) => sum + write_delay[s].mean_ps, 0))}`]
      : []),
    ...(hits > 0
      ? [
          `rows: ${part(dram.row_hits, hits)} hit, ${part(dram.row_misses, hits)} miss, ${part(dram.row_conflicts, hits)} conflict`,
        ]
      : []),
  ];
  return [...lines, facts(notes, width, '  ')].join('\n');
}

function entries({ mean_entries, max_entries }: Result['queues']['read']): string {
  return `${mean_entries.toFixed(1)} (most ${max_entries})`;
}

function part(count: number, of: number): string {
  return formatPercent(count / of);
}
