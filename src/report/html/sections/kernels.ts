import type { KernelResult, Result } from '../../../analysis/result-schema.js';
import { formatBandwidth, formatBytes, formatCount, formatFlops, formatPercent, formatTime } from '../../../units.js';
import { longest } from '../data.js';
import { html, type Markup } from '../markup.js';
import type { RooflineData } from '../page-data.js';
import { type Cell, type Column, cell, folded, table } from '../table.js';
import { section } from './figure.js';
import { lossTable } from './losses.js';

const MOST = 2000; // kernels in the table

/** Kernels under the ceilings of the package, and how much of its bound each reached. */
export function rooflineSection(result: Result, { points, roofs, slopes, reached }: RooflineData): Markup {
  const { kernels, bandwidth } = result;
  const without = kernels.filter(({ flops }) => flops === 0).length;
  const reading = [
    points.length > 0
      ? `${points.length} ${points.length === 1 ? 'kernel computes' : 'kernels compute'} and ${points.length === 1 ? 'stands' : 'stand'} in the plot: the filled mark is what was attained, the ring its bound, the triangle what the trace estimated.`
      : 'No kernel computes, so none stands in the plot.',
    without > 0 ? ` ${without} move data only; they are set against the bandwidth bound below.` : '',
  ];
  const ceilings = table(
    'Ceilings of the whole package',
    [{ head: 'ceiling', text: true }, { head: 'rate' }, { head: 'meets the memory bound at' }],
    [
      ...slopes.map(({ label, bytesPerS }) => [label, formatBandwidth(bytesPerS), '']),
      ...roofs.map(({ label, flopsPerS }) => [
        label,
        formatFlops(flopsPerS),
        `${formatCount(Number((flopsPerS / bandwidth.bound_bytes_per_s).toPrecision(3)))} FLOP/B`,
      ]),
    ],
  );
  const places = table(
    'Kernels in the roofline plot',
    [
      { head: 'kernel', text: true },
      { head: 'FLOP/B moved' },
      { head: 'attained' },
      { head: 'bound' },
      { head: 'by', text: true },
      { head: 'estimated' },
    ],
    points.map((at) => [
      at.name,
      formatCount(Number(at.intensity.toPrecision(3))),
      formatFlops(at.attained),
      formatFlops(at.bound),
      at.by,
      at.estimate === null ? '-' : formatFlops(at.estimate),
    ]),
  );
  const ratios = table(
    'Share of its bound each kernel reached',
    [{ head: 'kernel', text: true }, { head: 'reached' }, { head: 'as estimated' }],
    reached.map(({ name, ratio, estimate }) => [
      name,
      formatPercent(ratio),
      estimate === null ? '-' : formatPercent(estimate),
    ]),
  );
  return section({
    id: 'roofline',
    title: 'Roofline',
    reading,
    chart: {
      key: 'roofline',
      label: 'Roofline plot: kernels under the ceilings; the tables below have the figures',
    },
    body: html`${folded('The plot as tables', html`${places}${ceilings}`)}
<h3>Share of its bound each kernel reached</h3><div class="plot rows" data-chart="reached" role="img" aria-label="Share of its bound each kernel reached, and what its estimate meant; the table below has the figures"></div>${folded('Shares of the bounds as a table', ratios)}${lossTable(result)}`,
  });
}

interface Shown extends Column {
  readonly of: (kernel: KernelResult) => Cell;
}

const number = (value: number | null, show: (value: number) => string): Cell =>
  value === null ? cell('-', null) : cell(show(value), value);

const COLUMNS: readonly Shown[] = [
  { head: 'kernel', text: true, of: ({ name }) => name },
  { head: 'launches', of: ({ launches }) => number(launches, formatCount) },
  { head: 'start', of: ({ start_ps }) => number(start_ps, formatTime) },
  { head: 'time', of: ({ duration_ps, start_ps }) => number(start_ps === null ? null : duration_ps, formatTime) },
  { head: 'moved', title: 'bytes over the DRAM data buses', of: ({ moved_bytes }) => number(moved_bytes, formatBytes) },
  { head: 'bandwidth', of: ({ attained_bytes_per_s }) => number(attained_bytes_per_s, formatBandwidth) },
  { head: 'format', text: true, of: ({ format }) => (format === '' ? '-' : format) },
  { head: 'FLOP/s', of: ({ attained_flops_per_s }) => number(attained_flops_per_s, formatFlops) },
  {
    head: 'FLOP/B',
    title: 'FLOP per moved byte',
    of: ({ intensity_moved }) => number(intensity_moved, (value) => formatCount(Number(value.toPrecision(3)))),
  },
  {
    head: 'bound',
    of: ({ bound_flops_per_s: flops, bound_bytes_per_s: bytes }) =>
      flops === null ? number(bytes, formatBandwidth) : number(flops, formatFlops),
  },
  { head: 'by', text: true, title: 'which ceiling the bound is', of: ({ bound_by }) => bound_by },
  { head: 'reached', title: 'attained over bound', of: ({ roofline_ratio }) => number(roofline_ratio, formatPercent) },
  {
    head: 'compute',
    title: 'compute utilization',
    of: ({ compute_utilization }) => number(compute_utilization, formatPercent),
  },
  { head: 'read latency', title: 'mean', of: ({ mean_read_latency_ps }) => number(mean_read_latency_ps, formatTime) },
  { head: 'estimate', of: ({ estimate_ps }) => number(estimate_ps, formatTime) },
  {
    head: 'x estimate',
    title: 'time over estimate',
    of: ({ estimate_ps, duration_ps }) =>
      number(estimate_ps === null ? null : duration_ps / estimate_ps, (value) => value.toFixed(2)),
  },
];

/** Every kernel's figures, in a table that sorts by any column. */
export function kernelSection({ kernels }: Result): Markup {
  const shown = longest(kernels, MOST);
  const fewer = kernels.length - shown.length;
  const postponed = shown.some((kernel) => kernel.bound_by === 'dram' && (kernel.roofline_ratio ?? 0) > 1);
  const reading = [
    'Press a heading to sort by it, again for the other direction.',
    postponed ? ' Above 100 %: refreshes of that time were postponed; the bound is that of a long run.' : '',
    fewer > 0 ? ` The ${fewer} shortest kernels are left out.` : '',
  ];
  const rows = shown.map((kernel) => COLUMNS.map(({ of }) => of(kernel)));
  return section({
    id: 'kernels',
    title: 'Kernels',
    reading,
    body: html`${table('Kernels', COLUMNS, rows, { sortable: true, id: 'kernel-table' })}<p class="hidden" role="status" id="sorted"></p>`,
  });
}
