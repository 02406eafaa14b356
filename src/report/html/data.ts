import type { Result } from '../../analysis/result-schema.js';
import { STACK_CLASSES, STAGES } from '../../engine/recording.js';
import { LABELS, stageLabel } from '../labels.js';
import { plain } from '../style.js';
import type { BankData, DelayData, KernelStacks, PageData, TimeData } from './page-data.js';
import { rooflineData } from './roofline-data.js';

export const MOST_KERNELS = 40; // kernels in a chart; the table has more
const MOST_SPANS = 4000; // kernels on the time axis

export function pageData(result: Result): PageData {
  const classes = STACK_CLASSES.filter((name) => result.bandwidth_stack[name] > 0);
  return {
    classes: classes.map((key) => ({ key, label: LABELS[key] })),
    kernelStacks: kernelStacks(result, classes),
    time: timeData(result, classes),
    delays: delayData(result),
    roofline: rooflineData(result),
    banks: bankData(result),
  };
}

type Classes = readonly (typeof STACK_CLASSES)[number][];

/** The longest kernels of a result, in the order of the result. */
export function longest(kernels: Result['kernels'], most: number): Result['kernels'] {
  if (kernels.length <= most) return kernels;
  const order = kernels.map((_, k) => k).sort((a, b) => kernels[b].duration_ps - kernels[a].duration_ps || a - b);
  const kept = new Set(order.slice(0, most));
  return kernels.filter((_, k) => kept.has(k));
}

function kernelStacks({ kernels }: Result, classes: Classes): KernelStacks {
  const shown = longest(
    kernels.filter((kernel) => kernel.bandwidth_stack.total > 0),
    MOST_KERNELS,
  );
  return {
    names: shown.map((kernel) => plain(kernel.name)),
    shares: shown.map(({ bandwidth_stack: stack }) => classes.map((name) => short(stack[name] / stack.total))),
  };
}

function timeData({ timeline, stack_timeline, bandwidth, kernels, makespan_ps }: Result, classes: Classes): TimeData {
  const seconds = (i: number): number => lengthOf(i, timeline.slice_ps, makespan_ps) / 1e12;
  const rate = (bytes: number, i: number): number => (seconds(i) > 0 ? short(bytes / seconds(i)) : 0);
  const slices = Math.max(timeline.read_bytes.length, timeline.write_bytes.length);
  const per = (column: readonly number[]) => Array.from({ length: slices }, (_, i) => rate(column[i] ?? 0, i));
  const columns = classes.map((name) => stack_timeline.classes[name]);
  const totals = columns[0]?.map((_, i) => columns.reduce((sum, column) => sum + column[i], 0)) ?? [];
  const spans = longest(
    kernels.filter(({ start_ps }) => start_ps !== null),
    MOST_SPANS,
  ).map(({ name, start_ps, end_ps }) => ({ name: plain(name), startPs: start_ps ?? 0, endPs: end_ps ?? 0 }));
  return {
    slicePs: timeline.slice_ps,
    read: per(timeline.read_bytes),
    write: per(timeline.write_bytes),
    bound: bandwidth.bound_bytes_per_s,
    stackSlicePs: stack_timeline.slice_ps,
    shares: columns.map((column) => column.map((ck, i) => (totals[i] > 0 ? short(ck / totals[i]) : 0))),
    kernels: spans,
    lanes: lanesOf(spans),
    endPs: makespan_ps,
  };
}

/** How long slice `i` lasts: the last one ends with the run. */
export function lengthOf(i: number, slicePs: number, endPs: number): number {
  return Math.max(0, Math.min(slicePs, endPs - i * slicePs));
}

/** The lowest lane free at each kernel's start, in order of the starts. */
function lanesOf(spans: readonly { readonly startPs: number; readonly endPs: number }[]): number[] {
  const order = spans.map((_, k) => k).sort((a, b) => spans[a].startPs - spans[b].startPs || a - b);
  const free: number[] = []; // by lane: when it is free again
  const lanes = new Array<number>(spans.length).fill(0);
  for (const k of order) {
    let lane = free.findIndex((at) => at <= spans[k].startPs);
    if (lane < 0) lane = free.length;
    free[lane] = spans[k].endPs;
    lanes[k] = lane;
  }
  return lanes;
}

function delayData({ delay_counts: counts, read_latency: latency }: Result): DelayData {
  // nothing to see below the least delay but 0, nor in stages nobody waited in
  const first = Math.max(
    0,
    counts.from_ps.findIndex((from, i) => i > 0 && from > 0 && STAGES.some((stage) => counts[stage][i] > 0)),
  );
  const beyond = (column: readonly number[]): number[] => {
    let left = latency.count;
    return column.map((n) => {
      const share = latency.count > 0 ? left / latency.count : 0;
      left -= n;
      return short(share);
    });
  };
  const names = ['read_latency', ...STAGES] as const;
  return {
    fromPs: counts.from_ps.slice(first),
    series: names.map((name) => ({
      label: name === 'read_latency' ? 'read latency' : stageLabel(name),
      beyond: beyond(counts[name]).slice(first),
    })),
  };
}

function bankData({ bandwidth, banks, package: pkg }: Result): BankData {
  const { sids, bank_groups, banks_per_group, atom_bytes } = pkg.memory[0].organisation;
  const groups = bank_groups * banks_per_group;
  return {
    rows: bandwidth.pseudo_channels.map((at) => `${at.stack}.${at.channel}.${at.pseudo_channel}`),
    columns: Array.from(
      { length: banks.per_pseudo_channel },
      (_, b) =>
        `${sids > 1 ? `${Math.floor(b / groups)}.` : ''}${Math.floor(b / banks_per_group) % bank_groups}.${b % banks_per_group}`,
    ),
    atomBytes: atom_bytes,
    metrics: [
      { key: 'bytes', label: 'bytes moved', values: banks.atoms.map((atoms) => atoms * atom_bytes) },
      { key: 'activates', label: 'activates', values: banks.activates },
      { key: 'conflicts', label: 'row conflicts', values: banks.row_conflicts },
    ],
  };
}

/** Four significant digits are all that a chart shows. */
export function short(value: number): number {
  return Number(value.toPrecision(4));
}
