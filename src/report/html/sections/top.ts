import type { Result } from '../../../analysis/result-schema.js';
import { formatBandwidth, formatCount, formatPercent, formatTime } from '../../../units.js';
import { html, type Markup, type Piece } from '../markup.js';
import { together } from './figure.js';

/** The head of the page: what was run, and the verdict in one sentence. */
export function head(result: Result): Markup {
  const { provenance, package: pkg, verdict, checks, partial } = result;
  const failed = checks.filter((check) => !check.ok).length;
  return html`<header>
<p class="what">${pkg.name} · ${provenance.trace_file}</p>
<h1>${together(verdict.sentence)}</h1>
${failed > 0 && html`<p class="alarm" role="alert">${failed} of ${checks.length} self checks failed: this result must not be used.</p>`}
${partial && html`<p class="alarm">Partial: the run was stopped before the trace ended; requests under way are not counted.</p>`}
${pkg.caution !== '' && html`<p class="caution">${pkg.caution}</p>`}
</header>
`;
}

/** Headline figures: a value, and beside it what to hold it against. */
export function headline(result: Result): Markup {
  const { bandwidth: b, makespan_ps, read_latency: latency, compute, dram, queues, kernels } = result;
  const rows = dram.row_hits + dram.row_misses + dram.row_conflicts;
  const share = (part: number, of: number): string => (of > 0 ? formatPercent(part / of) : '-');
  const figures = [
    figure(
      'Achieved bandwidth',
      formatBandwidth(b.achieved_bytes_per_s),
      html`${share(b.achieved_bytes_per_s, b.peak_bytes_per_s)} of peak, ${share(b.achieved_bytes_per_s, b.bound_bytes_per_s)} of the bound`,
      meter(b.achieved_bytes_per_s / b.peak_bytes_per_s, b.bound_bytes_per_s / b.peak_bytes_per_s),
    ),
    figure(
      'Time',
      formatTime(makespan_ps),
      html`${formatCount(kernels.reduce((sum, kernel) => sum + kernel.launches, 0))} kernel launches, ${formatCount(latency.count)} reads`,
    ),
    figure(
      'Mean read latency',
      latency.count > 0 ? formatTime(latency.mean_ps) : 'no reads',
      html`p99 ${formatTime(latency.p99_ps)}, p99.9 ${formatTime(latency.p999_ps)}, longest ${formatTime(latency.max_ps)}`,
    ),
    figure(
      'Compute utilization',
      formatPercent(compute.utilization),
      compute.dies.map((die, i) => `${i > 0 ? ', ' : ''}${die.name} ${formatPercent(die.utilization)}`),
      meter(compute.utilization, 1),
    ),
    figure(
      'Row hits',
      share(dram.row_hits, rows),
      html`${share(dram.row_misses, rows)} misses, ${share(dram.row_conflicts, rows)} conflicts`,
    ),
    figure(
      'Read queue',
      `${queues.read.mean_entries.toFixed(1)} entries`,
      html`mean of a pseudo-channel, deepest ${queues.read.max_entries}; writes ${queues.write.mean_entries.toFixed(1)}`,
    ),
  ];
  return html`<section id="figures" aria-labelledby="figures-h"><h2 id="figures-h" class="hidden">Headline figures</h2><dl class="tiles">${figures}</dl></section>
`;
}

function figure(name: string, value: string, beside: Piece, drawn: Piece = ''): Markup {
  return html`<div><dt>${name}</dt><dd><strong>${value}</strong>${drawn}<span>${beside}</span></dd></div>`;
}

/** A level out of a whole, with a mark where the bound is. */
function meter(level: number, mark: number): Markup {
  const at = (part: number): string => (100 * Math.min(1, Math.max(0, part))).toFixed(2);
  return html`<svg class="meter" viewBox="0 0 100 4" preserveAspectRatio="none" aria-hidden="true"><rect class="room" width="100" height="4"/><rect class="level" width="${at(level)}" height="4"/>${mark < 1 && html`<rect class="mark" x="${at(mark)}" width="0.6" height="4"/>`}</svg>`;
}
