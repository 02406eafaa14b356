import type { KernelResult, Result } from '../../analysis/result-schema.js';
import { formatBandwidth, formatPercent, formatTime } from '../../units.js';
import { facts, type Ink, plain, prefixed, table } from '../style.js';

const NAME = 18; // columns
const MOST = 20; // kernels on the page

/** Compute utilization in total and by die. */
export function computeSection({ compute }: Result, { chalk, width }: Ink): string {
  const dies = compute.dies.map((die) => {
    return `${plain(die.name, 24)} ${formatPercent(die.utilization)}, ${die.mean_outstanding_requests.toFixed(0)} requests in flight`;
  });
  const total = `${formatPercent(compute.utilization)} of engine time`;
  return `${chalk.bold('Compute utilization')}\n${facts([total, ...dies], width, '  ')}`;
}

/** Each kernel against its roofline. */
export function kernelSection({ kernels }: Result, { chalk }: Ink): string {
  const shown = kernels.length <= MOST ? kernels : longest(kernels);
  const estimates = shown.some((kernel) => kernel.estimate_ps !== null);
  const head = ['Kernels', 'time', 'bandwidth', 'FLOP/s', 'bound', 'by', 'reached', 'compute', 'x est.'];
  const cut = (cells: readonly string[]): readonly string[] => (estimates ? cells : cells.slice(0, -1));
  const text = table(cut(head), shown.map(row).map(cut), [5]);
  // the heading stands in the table's first line
  const [first, ...rest] = text.split('\n');
  const lines = [chalk.bold(first.slice(2)), ...rest];
  const more = kernels.length - shown.length;
  if (shown.some((kernel) => kernel.bound_by === 'dram' && (kernel.roofline_ratio ?? 0) > 1)) {
    lines.push('  above 100 %: refreshes of that time were postponed; the bound is that of a long run');
  }
  if (more > 0) lines.push(`  and ${more} shorter ones (--json has them all)`);
  return lines.join('\n');
}

function longest(kernels: readonly KernelResult[]): KernelResult[] {
  const least = [...kernels].sort((a, b) => b.duration_ps - a.duration_ps)[MOST - 1].duration_ps;
  return kernels.filter((kernel) => kernel.duration_ps >= least).slice(0, MOST);
}

function row(kernel: KernelResult): string[] {
  return [plain(kernel.name, NAME), ...(kernel.start_ps === null ? NOT_BEGUN : figures(kernel))];
}

const NOT_BEGUN = ['not begun', ...Array<string>(7).fill('-')];

function figures(kernel: KernelResult): string[] {
  const {
    attained_flops_per_s: flops,
    bound_flops_per_s: bound,
    roofline_ratio: ratio,
    estimate_ps: estimate,
  } = kernel;
  return [
    formatTime(kernel.duration_ps),
    formatBandwidth(kernel.attained_bytes_per_s),
    flops === null ? '-' : prefixed(flops),
    bound === null ? formatBandwidth(kernel.bound_bytes_per_s) : prefixed(bound),
    kernel.bound_by === 'none' ? '-' : kernel.bound_by,
    ratio === null ? '-' : formatPercent(ratio),
    formatPercent(kernel.compute_utilization),
    estimate === null || kernel.duration_ps === 0 ? '-' : times(kernel.duration_ps / estimate),
  ];
}

function times(ratio: number): string {
  return ratio >= 1000 ? '>999' : ratio.toFixed(2);
}
