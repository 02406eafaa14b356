import type { Result } from '../../../analysis/result-schema.js';
import { type Package, TIMING_NAMES } from '../../../config/package.js';
import { formatBandwidth, formatBytes, formatFlops, formatPercent, formatTime } from '../../../units.js';
import { html, type Markup } from '../markup.js';
import { folded, pairs, table } from '../table.js';
import { section } from './figure.js';

/** The package as it was simulated, every override included. */
export function packageSection({ package: pkg, links: used }: Result): Markup {
  const [memory] = pkg.memory;
  const { organisation: o, refresh, controller: c } = memory;
  const reading = `${pkg.dies.length} compute ${pkg.dies.length === 1 ? 'die' : 'dies'}, ${o.stacks} ${o.stacks === 1 ? 'stack' : 'stacks'} of ${memory.device} with ${o.channels} channels of ${o.pseudo_channels} pseudo-channels each, ${formatBandwidth(memory.peakBytesPerS * o.stacks)} at most.`;
  const dies = table(
    'Compute dies',
    ['die', 'engines', 'window', 'tiles', 'request', 'clock', 'peak'].map(heading),
    pkg.dies.map((die) => [
      die.name,
      die.engines,
      die.window,
      die.buffering,
      formatBytes(die.requestBytes),
      formatTime(die.clockPs),
      Object.entries(die.peakFlops)
        .map(([format, rate]) => `${format} ${formatFlops(rate)}`)
        .join(', '),
    ]),
  );
  const links = table(
    'Links',
    ['link', 'joins', 'lanes', 'payload', 'latency', 'landing', 'down busy', 'up busy'].map(heading),
    pkg.links.map((link, s) => [
      link.name,
      `${pkg.dies[link.die].name} - stack ${link.stack}`,
      `${link.lanes} x ${Number((link.transfersPerS / 1e9).toPrecision(6))} GT/s`,
      formatBandwidth(link.payloadBytesPerS),
      formatTime(link.latencyPs),
      formatBytes(link.landingBytes),
      formatPercent(used[s].down.utilization),
      formatPercent(used[s].up.utilization),
    ]),
  );
  const facts = pairs([
    [
      'organisation',
      `${o.sids} stack IDs x ${o.bank_groups} bank groups x ${o.banks_per_group} banks, ${o.rows} rows of ${o.columns} x ${o.atom_bytes} B`,
    ],
    ['clock', `${formatTime(memory.clockPs)}, a burst ${o.burst_ck} ck`],
    [
      'refresh',
      refresh.mode === 'off'
        ? 'off'
        : `${refresh.mode}, at ${refresh.temperatureC} C, up to ${refresh.postpone} postponed`,
    ],
    [
      'controller',
      `${c.scheduler}, queues of ${c.readQueue} reads and ${c.writeQueue} writes, ${c.page} page, at most ${c.hitCap} hits before an older conflict, writes drained from ${c.drainHigh} to ${c.drainLow}`,
    ],
    ['base die', `ingress ${formatTime(memory.baseDie.ingressPs)}, egress ${formatTime(memory.baseDie.egressPs)}`],
    ['address map', addressMap(pkg)],
  ]);
  const timings = table(
    'DRAM timings',
    [{ head: 'timing', text: true }, { head: 'ck' }, { head: 'ns' }, { head: 'source', text: true }],
    TIMING_NAMES.map((name) => {
      const { ck, ns, source } = memory.timings[name];
      return [name, ck, Number(ns.toFixed(3)), source];
    }),
  );
  return section({
    id: 'package',
    title: `Package: ${pkg.name}`,
    reading,
    body: html`${dies}${links}${facts}${folded('DRAM timings with their sources', timings)}`,
  });
}

function heading(head: string, i: number): { readonly head: string; readonly text?: true } {
  return i === 0 || head === 'joins' || head === 'peak' ? { head, text: true } : { head };
}

function addressMap({ addressMap: map }: Package): string {
  const order = map.interleave.map((unit) => unit.replace('_', '-')).join(', then ');
  const fields = map.fields.map(({ name, bits }) => `${name}:${bits}`).join(', ');
  const folds = map.xor.map(({ target, bit, rowBits }) => `${target}.${bit} with row ${rowBits.join(', ')}`);
  return `${formatBytes(map.granuleBytes)} over ${order}; fields, lowest first: ${fields}${folds.length > 0 ? `; folded: ${folds.join('; ')}` : ''}`;
}

/** Where the figures come from, and whether they hold together. */
export function provenanceSection({ provenance: p, checks, dram }: Result): Markup {
  const failed = checks.filter((check) => !check.ok);
  const options = [
    `${p.options.replay} replay`,
    ...(p.options.until_ps === null ? [] : [`until ${formatTime(p.options.until_ps)}`]),
    `seed ${p.seed}`,
  ];
  const facts = pairs([
    ['program', `${p.program} ${p.version}`],
    ['package', html`${p.package_file} <code>${p.package_hash}</code>`],
    [
      'overrides',
      p.options.overrides.length === 0 ? 'none' : p.options.overrides.map((key) => html`<code>${key}</code> `),
    ],
    [
      'trace',
      html`${p.trace_file}, ${p.trace_rows} rows${p.skipped_rows > 0 && `, ${p.skipped_rows} bad rows skipped`} <code>${p.trace_hash}</code>`,
    ],
    ['options', options.join(', ')],
    ['clocks', `${dram.elapsed_ck} ck of each pseudo-channel accounted for`],
  ]);
  const all = table(
    'Self checks',
    [
      { head: 'check', text: true },
      { head: 'result', text: true },
      { head: 'got' },
      { head: 'expected' },
      { head: 'within' },
    ],
    checks.map(({ name, ok, got, expected, tolerance }) => [
      name,
      ok ? 'ok' : html`<strong class="bad">FAILED</strong>`,
      got,
      expected,
      tolerance,
    ]),
  );
  return section({
    id: 'provenance',
    title: 'Provenance and checks',
    reading:
      failed.length === 0
        ? `All ${checks.length} self checks passed. The same package, trace, seed and options give the same result to the byte.`
        : `${failed.length} of ${checks.length} self checks failed: ${failed.map(({ name }) => name).join('; ')}.`,
    body: html`${facts}${folded('Self checks as a table', all)}`,
  });
}
