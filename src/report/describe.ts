import type { AddressBit, Description } from '../config/describe.js';
import { TIMING_NAMES } from '../config/package.js';
import { formatBandwidth, formatBytes, formatPercent, formatTime } from '../units.js';
import { facts, type Ink, ink, plain, prefixed, type TextStyle, table, wrap } from './style.js';

type Memory = Description['memory'][number];

/** A package as resolved, for people: ceilings, dies, memory with every timing and its source, links, address map. */
export function descriptionReport(description: Description, style: TextStyle): string {
  const paint = ink(style);
  const { chalk, width } = paint;
  const { name, file, hash, caution } = description;
  const sections = [
    `${chalk.bold(plain(name))} ${chalk.dim(`(${plain(file)}, ${hash.slice(0, 12)})`)}`,
    ...(caution === '' ? [] : [chalk.dim(wrap(plain(caution), width))]),
    facts(
      [
        `capacity ${formatBytes(description.capacity_bytes)}`,
        `peak ${formatBandwidth(description.peak_bytes_per_s)}`,
        `refresh-derated ${formatBandwidth(description.refresh_derated_bytes_per_s)}`,
        `link read ceiling ${formatBandwidth(description.link_ceiling_bytes_per_s)}`,
      ],
      width,
      '',
    ),
    `\n${chalk.bold('Compute dies')}\n${dies(description)}`,
    ...description.memory.map((memory) => memorySection(memory, paint)),
    `\n${chalk.bold('Links')}\n${links(description)}`,
    `\n${chalk.bold('Unloaded latency of a one-atom read')}${chalk.dim(edges(description))}\n${latency(description)}`,
    `\n${chalk.bold('Address map')}\n${addressMap(description, paint)}`,
  ];
  return `${sections.join('\n')}\n`;
}

function dies({ compute, domains }: Description): string {
  const rows = compute.map((die, d) => [
    plain(die.name, 16),
    String(die.engines),
    String(die.window),
    String(die.buffering),
    formatBytes(die.requestBytes),
    formatTime(die.clockPs),
    Object.entries(die.peakFlops)
      .map(([format, rate]) => `${plain(format)} ${prefixed(rate)}`)
      .join(', '),
    formatBytes(domains[d].capacity),
  ]);
  return table(['die', 'engines', 'window', 'tiles', 'request', 'clock', 'peak FLOP/s', 'memory'], rows, [6]);
}

function memorySection(memory: Memory, { chalk, width }: Ink): string {
  const { organisation: o, refresh, controller: c } = memory;
  const organisation = facts(
    [
      `${o.stacks} stacks of ${formatBytes(memory.stack_bytes)} and ${formatBandwidth(memory.peakBytesPerS)}`,
      `${o.channels} channels x ${o.pseudo_channels} pseudo-channels`,
      `${o.sids} stack IDs x ${o.bank_groups} bank groups x ${o.banks_per_group} banks`,
      `${o.rows} rows of ${o.columns} x ${o.atom_bytes} B`,
      `burst ${o.burst_ck} ck`,
      `clock ${formatTime(memory.clock_ps)}`,
    ],
    width,
    '  ',
  );
  const rules = facts(
    [
      refresh.mode === 'off'
        ? 'no refresh'
        : `${refresh.mode} refresh at ${refresh.temperatureC} C, ${formatPercent(memory.refresh_loss)} of the peak, up to ${refresh.postpone} postponed`,
      `queues ${c.readQueue} read, ${c.writeQueue} write`,
      `${c.scheduler}, at most ${c.hitCap} hits before an older conflict`,
      `${c.page} page`,
      `writes drained from ${c.drainHigh} to ${c.drainLow}`,
    ],
    width,
    '  ',
  );
  // a source that several timings share is written once
  const sources = [...new Set(TIMING_NAMES.map((name) => memory.timings[name].source))];
  const rows = TIMING_NAMES.map((name) => {
    const { ck, ns, source } = memory.timings[name];
    return [name, String(ck), formatNs(ns), `[${sources.indexOf(source) + 1}]`];
  });
  const timings = table(['timing', 'ck', 'ns', 'source'], rows);
  const legend = sources.map((source, i) => `  ${wrap(`[${i + 1}] ${plain(source)}`, width - 2, '      ')}`);
  const notes = memory.notes.map((note) => `  ${wrap(plain(note), width - 2, '  ')}`);
  return [
    `\n${chalk.bold(`Memory ${plain(memory.name)}: ${memory.device}`)}`,
    organisation,
    rules,
    ...notes,
    timings,
    ...legend,
  ].join('\n');
}

/** Nanoseconds to the picosecond, without trailing zeros. */
function formatNs(ns: number): string {
  return String(Number(ns.toFixed(3)));
}

function links({ links: all, compute }: Description): string {
  const rows = all.map((link) => [
    plain(link.name, 12),
    `${plain(compute[link.die].name, 12)} - stack ${link.stack}`,
    `${link.lanes} x ${Number((link.transfersPerS / 1e9).toPrecision(6))} GT/s`,
    formatBandwidth(link.rawBytesPerS),
    formatBandwidth(link.payloadBytesPerS),
    formatBandwidth(link.ceilings.linkRead),
    formatBandwidth(link.ceilings.linkWrite),
    formatTime(link.latencyPs),
  ]);
  return table(['link', 'joins', 'lanes', 'raw', 'payload', 'read', 'write', 'latency'], rows, [1]);
}

/** What the latencies leave out: waiting for the next clock edge. */
function edges({ links: all }: Description): string {
  const most = Math.max(...all.map((link) => link.unloaded_latency_ps.clock_edges));
  return `, and up to ${formatTime(most)} to meet DRAM and compute clock edges`;
}

function latency({ links: all }: Description): string {
  // links that are alike share a row
  const groups = new Map<string, number[]>();
  for (const link of all) {
    const key = JSON.stringify(link.unloaded_latency_ps);
    groups.set(key, [...(groups.get(key) ?? []), link.stack]);
  }
  const rows = [...groups.values()].map((stacks) => {
    const t = all[stacks[0]].unloaded_latency_ps;
    const { hit, closed, conflict } = t.bank_preparation;
    return [
      stacks.length === 1 ? String(stacks[0]) : `${stacks[0]}-${stacks[stacks.length - 1]}`,
      formatTime(t.down_link_transit),
      [hit, closed, conflict].map(formatTime).join(' / '),
      formatTime(t.data_transfer),
      formatTime(t.up_link_transit),
      [t.total.hit, t.total.closed, t.total.conflict].map(formatTime).join(' / '),
    ];
  });
  return table(['stacks', 'down link', 'bank: hit / closed / conflict', 'data', 'up link', 'total'], rows);
}

function addressMap({ address_map: map }: Description, { width }: Ink): string {
  const order = `  interleaved by ${formatBytes(map.granuleBytes)} over ${map.interleave.map((unit) => unit.replace('_', '-')).join(', then ')}${map.rotate ? ', each round turned by a hash' : ''}`;
  const fields = facts(runs(map.bits), width, '  ');
  const folds = map.bits
    .filter((bit) => bit.folded_into.length > 0)
    .map((bit) => `${bit.field} into ${bit.folded_into.join(' and ')}`);
  const folding = folds.length === 0 ? [] : ['  folded by XOR:', facts(folds, width, '    ')];
  return [order, '  address bits within a unit, lowest first:', fields, ...folding].join('\n');
}

/** Bits of one field that follow each other, as `bank_group.0-1 at 8-9`. */
function runs(bits: readonly AddressBit[]): string[] {
  const out: { field: string; first: string; last: string; from: number; to: number }[] = [];
  for (const { bit, field } of bits) {
    const [name, own = ''] = field.split('.');
    const open = out[out.length - 1];
    if (open !== undefined && open.field === name) {
      open.last = own;
      open.to = bit;
    } else {
      out.push({ field: name, first: own, last: own, from: bit, to: bit });
    }
  }
  const span = (a: string | number, b: string | number): string => (a === b ? String(a) : `${a}-${b}`);
  return out.map(
    ({ field, first, last, from, to }) => `${field}${first === '' ? '' : `.${span(first, last)}`} at ${span(from, to)}`,
  );
}
