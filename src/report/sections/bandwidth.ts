import type { Result } from '../../analysis/result-schema.js';
import { STACK_CLASSES } from '../../engine/recording.js';
import { formatBandwidth, formatPercent, formatTime } from '../../units.js';
import { LABELS } from '../labels.js';
import { bar, facts, type Ink } from '../style.js';

/** Achieved against peak. */
export function bandwidthSection({ bandwidth, links, makespan_ps }: Result, { chalk, width }: Ink): string {
  const share = bandwidth.achieved_bytes_per_s / bandwidth.peak_bytes_per_s;
  const ofBound = bandwidth.achieved_bytes_per_s / bandwidth.bound_bytes_per_s;
  const achieved = `${formatBandwidth(bandwidth.achieved_bytes_per_s)} achieved in ${formatTime(makespan_ps)}`;
  const ratios = `${formatPercent(share)} of peak, ${formatPercent(ofBound)} of the bound`;
  const busiest = (of: 'up' | 'down'): string => formatPercent(Math.max(...links.map((link) => link[of].utilization)));
  const rates = bandwidth.stacks.map((stack) => stack.achieved_bytes_per_s);
  return [
    chalk.bold('Bandwidth'),
    `  ${chalk.bold(achieved)}  ${chalk.green(bar(share, 18))}  ${ratios}`,
    facts(
      [
        `read ${formatBandwidth(bandwidth.read_bytes_per_s)}`,
        `write ${formatBandwidth(bandwidth.write_bytes_per_s)}`,
        `useful ${formatBandwidth(bandwidth.useful_bytes_per_s)}`,
        `a stack ${formatBandwidth(Math.min(...rates))} to ${formatBandwidth(Math.max(...rates))}`,
      ],
      width,
      '  ',
    ),
    facts(
      [
        `peak ${formatBandwidth(bandwidth.peak_bytes_per_s)}`,
        `refresh-derated ${formatBandwidth(bandwidth.refresh_derated_bytes_per_s)}`,
        `link ceiling for this mix ${formatBandwidth(bandwidth.link_ceiling_bytes_per_s)}`,
        `busiest link ${busiest('down')} down, ${busiest('up')} up`,
      ],
      width,
      '  ',
    ),
  ].join('\n');
}

const CELLS = 14; // columns of a bar
const LEAST_SHOWN = 0.001; // of all clocks: classes below this are shown as one

/** Where every clock of the data buses went, largest first after the data itself, in two columns. */
export function stackSection({ bandwidth_stack: stack, dram }: Result, { chalk }: Ink): string {
  const title = chalk.bold('Where the DRAM clocks went');
  if (stack.total === 0) return `${title}\n  ${dram.elapsed_ck === 0 ? 'no clock passed' : 'not recorded'}`;
  const parts = STACK_CLASSES.map((name) => ({ name, share: stack[name] / stack.total }));
  const data = parts.slice(0, 2);
  const losses = parts.slice(2).filter(({ share }) => share >= LEAST_SHOWN);
  losses.sort((a, b) => b.share - a.share);
  const cells = [...data, ...losses].map(({ name, share }) => {
    const paint = name.endsWith('_data') ? chalk.green : name.startsWith('starved') ? chalk.cyan : chalk.yellow;
    return cell(LABELS[name], paint(bar(share, CELLS)), share);
  });
  const small = parts.slice(2).filter(({ share }) => share > 0 && share < LEAST_SHOWN);
  const other = small.reduce((sum, { share }) => sum + share, 0);
  if (other > 0) cells.push(cell(`other (${small.length})`, bar(other, CELLS), other));
  const half = Math.ceil(cells.length / 2);
  const lines = cells
    .slice(0, half)
    .map((left, i) => `  ${left}${cells[half + i] === undefined ? '' : `     ${cells[half + i]}`}`);
  return [title, ...lines].join('\n');
}

function cell(label: string, drawn: string, share: number): string {
  return `${label.padEnd(22)} ${drawn} ${(100 * share).toFixed(1).padStart(5)} %`;
}
