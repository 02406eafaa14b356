import type { ProfileResult } from '../analysis/index.js';
import { formatBandwidth, formatBytes, formatCount, formatPercent, formatTime } from '../units.js';
import { bar, facts, type Ink, ink, plain, type TextStyle, table } from './style.js';

const MOST = 12; // kernels on the page
const CELLS = 20; // columns of a bar

/** What is in a trace, for people. */
export function profileReport(profile: ProfileResult, style: TextStyle): string {
  const paint = ink(style);
  const parts = [mix(profile, paint), order(profile, paint), reuse(profile, paint), bits(profile, paint)];
  if (profile.spread !== null) parts.push(spread(profile.spread, paint));
  if (profile.kernels.length > 1 || profile.kernels.some(({ flops }) => flops > 0)) parts.push(kernels(profile, paint));
  return `${parts.join('\n')}\n`;
}

function mix(p: ProfileResult, { chalk, width }: Ink): string {
  const { footprint } = p;
  const lines = `${footprint.exact ? '' : 'about '}${formatBytes(footprint.bytes)} in ${formatCount(footprint.lines)} lines of ${footprint.line_bytes} B`;
  const error = footprint.exact ? [] : [`footprint estimated, standard error ${formatPercent(footprint.error)}`];
  const times =
    p.span_ps === null || p.burstiness === null
      ? ['no recorded times']
      : [
          `over ${formatTime(p.span_ps)}`,
          ...(p.span_ps > 0 ? [`${formatBandwidth((p.bytes / p.span_ps) * 1e12)} on the average`] : []),
          `busiest 64th ${p.burstiness.toFixed(2)} times the mean`,
        ];
  const items = [
    `${formatCount(p.rows)} accesses of ${plain(p.trace_file)}`,
    ...(p.skipped_rows > 0 ? [`${formatCount(p.skipped_rows)} bad rows skipped`] : []),
    `${formatBytes(p.bytes)} asked for`,
    `${formatPercent(p.reads / p.rows)} reads`,
    ...times,
    `footprint ${lines}`,
    ...error,
  ];
  return `${chalk.bold('What is in it')}\n${facts(items, width, '  ')}`;
}

function order(p: ProfileResult, { chalk, width }: Ink): string {
  const sizes = p.sizes.map(({ bytes, share }) => `${formatBytes(bytes)} ${formatPercent(share)}`);
  const strides = p.strides.map(
    ({ bytes, share }) => `${bytes < 0 ? '-' : '+'}${formatBytes(Math.abs(bytes))} ${formatPercent(share)}`,
  );
  return [
    chalk.bold('Order'),
    facts([`${formatPercent(p.sequential_share)} begin where the one before ended`], width, '  '),
    facts([`sizes ${sizes[0] ?? '-'}`, ...sizes.slice(1)], width, '  '),
    facts([`strides ${strides[0] ?? '-'}`, ...strides.slice(1)], width, '  '),
  ].join('\n');
}

/** Reuse distances in steps of 16, so that they fit a page. */
function reuse({ reuse: { cold_share, buckets, samples } }: ProfileResult, { chalk }: Ink): string {
  const steps = new Map<number, number>();
  for (const { lines, share } of buckets) {
    const step = 16 ** Math.floor(Math.log2(lines) / 4);
    steps.set(step, (steps.get(step) ?? 0) + share);
  }
  const rows = [...steps].map(([step, share]) => [`below ${formatBytes(16 * step * 64)}`, share] as const);
  const line = (label: string, share: number): string =>
    `  ${label.padEnd(18)} ${bar(share, CELLS)} ${(100 * share).toFixed(1).padStart(5)} %`;
  return [
    chalk.bold(`Reuse: what else is touched before a line is touched again (${formatCount(samples)} sampled touches)`),
    ...rows.map(([label, share]) => line(label, share)),
    line('never before', cold_share),
  ].join('\n');
}

/** A column a bit: how often it changes from row to row, from 0 to 9 tenths; - where it never does. */
function bits({ bits: all }: ProfileResult, { chalk }: Ink): string {
  const digit = (share: number): string => (share === 0 ? '-' : String(Math.min(9, Math.floor(10 * share))));
  const high = [...all].reverse();
  return [
    chalk.bold('Address bits, highest first: tenths of rows in which each changes, - never'),
    `  bit ${high.map(({ bit }) => (bit % 10 === 0 ? String(bit / 10) : ' ')).join('')}`,
    `      ${high.map(({ toggles }) => digit(toggles)).join('')}`,
  ].join('\n');
}

function spread(s: NonNullable<ProfileResult['spread']>, { chalk, width }: Ink): string {
  const rows = (['stacks', 'channels', 'pseudo_channels', 'banks'] as const).map((name) => {
    const e = s[name];
    return [
      name.replace('_', '-'),
      formatCount(e.places),
      e.effective.toFixed(1),
      formatPercent(e.effective / e.places),
      `${(e.max_share / e.mean_share).toFixed(2)} x`,
    ];
  });
  const [first, ...rest] = table(
    ['Spread over', 'places', 'as many even ones as', 'of all', 'busiest to mean'],
    rows,
  ).split('\n');
  const hot = s.hot_rows.map(({ place, share }) => `${place} ${formatPercent(share)}`);
  return [
    chalk.bold(first.slice(2)),
    ...rest,
    facts(
      [`${formatPercent(s.row_hit_share)} would find their row open, in this order and with no other traffic`],
      width,
      '  ',
    ),
    facts(hot.length === 0 ? [] : [`hottest rows: ${hot[0]}`, ...hot.slice(1)], width, '  '),
  ].join('\n');
}

function kernels({ kernels: all }: ProfileResult, { chalk }: Ink): string {
  const shown = [...all].sort((a, b) => b.bytes - a.bytes).slice(0, MOST);
  const rows = shown.map((k) => [
    plain(k.name, 24),
    formatCount(k.rows),
    formatBytes(k.bytes),
    k.flops_per_byte === null ? '-' : `${k.flops_per_byte.toPrecision(3)} FLOP/B`,
  ]);
  const [first, ...rest] = table(['Kernels', 'accesses', 'bytes', 'intensity'], rows).split('\n');
  const more = all.length - shown.length;
  return [chalk.bold(first.slice(2)), ...rest, ...(more > 0 ? [`  and ${more} smaller ones`] : [])].join('\n');
}
