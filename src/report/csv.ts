import type { Result } from '../analysis/result-schema.js';
import { STACK_CLASSES, STAGES } from '../engine/recording.js';

/** A value of a table; null is an empty cell. */
type Value = string | number | null;

interface Table {
  readonly head: readonly string[];
  rows(result: Result): Iterable<readonly Value[]>;
}

const RATES = ['achieved_bytes_per_s', 'read_bytes_per_s', 'write_bytes_per_s'] as const;
const DELAYS = ['count', 'mean_ps', 'p50_ps', 'p90_ps', 'p99_ps', 'p999_ps', 'max_ps'] as const;
const KERNEL = [
  'launches',
  'requests',
  'start_ps',
  'end_ps',
  'duration_ps',
  'format',
  'flops',
  'read_bytes',
  'write_bytes',
  'useful_bytes',
  'moved_bytes',
  'moved_read_bytes',
  'moved_write_bytes',
  'intensity_useful',
  'intensity_moved',
  'bound_by',
  'bound_flops_per_s',
  'attained_flops_per_s',
  'bound_bytes_per_s',
  'attained_bytes_per_s',
  'roofline_ratio',
  'compute_utilization',
  'mean_read_latency_ps',
  'estimate_ps',
] as const satisfies readonly (keyof Result['kernels'][number])[];
const PSEUDO_CHANNEL = [
  'stack',
  'channel',
  'pseudo_channel',
  ...RATES,
  'row_hits',
  'row_misses',
  'row_conflicts',
  'activates',
  'refreshes',
  'read_queue_mean_entries',
  'write_queue_mean_entries',
] as const satisfies readonly (keyof Result['bandwidth']['pseudo_channels'][number])[];
const CK = [...STACK_CLASSES, 'total'] as const;

/** The cells of `of` under these keys. */
function picked<K extends string>(of: Readonly<Record<K, Value>>, keys: readonly K[]): Value[] {
  return keys.map((key) => of[key]);
}

/** The tables of a result by file name. Columns are named as in the result document: a name ends in its unit. */
const TABLES = {
  'kernels.csv': {
    head: ['kernel', 'dies', ...KERNEL],
    rows: ({ kernels }) => kernels.map((kernel) => [kernel.name, kernel.dies.join(' '), ...picked(kernel, KERNEL)]),
  },
  'bandwidth-stack.csv': {
    head: ['of', 'name', ...CK.map((name) => `${name}_ck`)],
    rows: ({ bandwidth_stack, bandwidth, kernels }) => [
      ['run', '', ...picked(bandwidth_stack, CK)],
      ...bandwidth.stacks.map(({ stack, bandwidth_stack: ck }) => ['stack', stack, ...picked(ck, CK)]),
      ...kernels.map(({ name, bandwidth_stack: ck }) => ['kernel', name, ...picked(ck, CK)]),
    ],
  },
  'delays.csv': {
    head: ['op', 'stage', ...DELAYS],
    rows: ({ delay, write_delay, read_latency }) => [
      ...STAGES.map((stage) => ['read', stage, ...picked(delay[stage], DELAYS)]),
      ['read', 'total', ...picked(read_latency, DELAYS)],
      ...STAGES.map((stage) => ['write', stage, ...picked(write_delay[stage], DELAYS)]),
    ],
  },
  'pseudo-channels.csv': {
    head: PSEUDO_CHANNEL,
    rows: ({ bandwidth }) => bandwidth.pseudo_channels.map((at) => picked(at, PSEUDO_CHANNEL)),
  },
  'banks.csv': {
    head: ['stack', 'channel', 'pseudo_channel', 'sid', 'bank_group', 'bank', 'atoms', 'activates', 'row_conflicts'],
    rows: bankRows,
  },
  'timeline.csv': {
    head: ['from_ps', 'to_ps', 'read_bytes', 'write_bytes'],
    rows: ({ timeline: { slice_ps, read_bytes, write_bytes }, makespan_ps }) =>
      read_bytes.map((bytes, i) => [...slice(i, slice_ps, makespan_ps), bytes, write_bytes[i] ?? 0]),
  },
  'stack-timeline.csv': {
    head: ['from_ps', 'to_ps', ...STACK_CLASSES.map((name) => `${name}_ck`)],
    rows: ({ stack_timeline: { slice_ps, classes }, makespan_ps }) =>
      classes.read_data.map((_, i) => [
        ...slice(i, slice_ps, makespan_ps),
        ...STACK_CLASSES.map((name) => classes[name][i]),
      ]),
  },
} as const satisfies Readonly<Record<string, Table>>;

export type TableName = keyof typeof TABLES;
export const TABLE_NAMES = Object.keys(TABLES) as readonly TableName[];

function* bankRows({ banks, bandwidth, package: pkg }: Result): Generator<readonly Value[]> {
  const { bank_groups, banks_per_group } = pkg.memory[0].organisation;
  for (const [p, { stack, channel, pseudo_channel }] of bandwidth.pseudo_channels.entries()) {
    for (let bank = 0; bank < banks.per_pseudo_channel; bank++) {
      const at = p * banks.per_pseudo_channel + bank;
      const group = Math.floor(bank / banks_per_group);
      const place = [Math.floor(group / bank_groups), group % bank_groups, bank % banks_per_group];
      const counts = [banks.atoms[at], banks.activates[at], banks.row_conflicts[at]];
      yield [stack, channel, pseudo_channel, ...place, ...counts];
    }
  }
}

/** From when to when slice `i` goes; the last one ends with the run. */
function slice(i: number, slicePs: number, endPs: number): [from: number, to: number] {
  return [i * slicePs, Math.max(i * slicePs, Math.min((i + 1) * slicePs, endPs))];
}

/** The first line of a table, without its end. */
export function tableHead(name: TableName): string {
  return TABLES[name].head.join(',');
}

/** A table of a result as CSV (RFC 4180, lines end in a line feed), numbers in full. */
export function csvTable(result: Result, name: TableName): string {
  const lines = [tableHead(name)];
  const { rows }: Table = TABLES[name];
  for (const row of rows(result)) lines.push(row.map(cell).join(','));
  return `${lines.join('\n')}\n`;
}

function cell(value: Value): string {
  if (value === null) return '';
  if (typeof value === 'number') return String(value);
  return /[",\r\n]/.test(value) ? `"${value.replaceAll('"', '""')}"` : value;
}
