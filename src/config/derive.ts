import { domains, stackBytes } from './domains.js';
import type { Link, MemoryGroup, Package, TimingName } from './package.js';

/** Bandwidth ceilings, bytes a second, of one stack and its link. */
export interface Ceilings {
  readonly peak: number; // of the DRAM data buses
  readonly refreshDerated: number; // peak less the time all-bank refresh takes; per-bank refresh leaves other banks working
  readonly linkRead: number; // read data over the up link: payload rate less response headers of full requests
  readonly linkWrite: number; // write data over the down link, likewise
}

/** Share of the time that all-bank refresh takes: tRFCab / tREFI; 0 for per-bank refresh and none. */
export function refreshLoss({ refresh, timings }: MemoryGroup): number {
  return refresh.mode === 'all-bank' ? timings.tRFCab.ck / timings.tREFI.ck : 0;
}

export function ceilings(pkg: Package, link: Link): Ceilings {
  const [memory] = pkg.memory;
  const request = requestBytes(pkg, link.die);
  const share = (header: number): number => request / (request + header);
  return {
    peak: memory.peakBytesPerS,
    refreshDerated: memory.peakBytesPerS * (1 - refreshLoss(memory)),
    linkRead: link.payloadBytesPerS * share(link.responseHeaderBytes),
    linkWrite: link.payloadBytesPerS * share(link.requestHeaderBytes),
  };
}

/** Longest run of consecutive columns of one row in the address map, bytes: requests are cut at its multiples. */
export function pieceBytes(pkg: Package): number {
  const { atom_bytes: atom } = pkg.memory[0].organisation;
  let columns = 0;
  for (const { name, bits } of pkg.addressMap.fields) {
    if (name !== 'column') break;
    columns += bits;
  }
  let piece = atom * 2 ** columns;
  while (pkg.addressMap.granuleBytes % piece !== 0) piece /= 2;
  return piece;
}

/** The longest request that reaches a controller: what stays in one row of one granule. */
export function requestBytes(pkg: Package, die: number): number {
  return Math.min(pieceBytes(pkg), pkg.dies[die].requestBytes);
}

/**
 * Unloaded latency of a one-atom read, ps by stage, for each state the row may be found in. A request is taken by a controller
 * at a DRAM clock and its answer by a die at its own clock; what it waits for these edges depends on when it was sent.
 */
export interface UnloadedLatency {
  readonly clock_edges: number; // the most that both edges add to any total
  readonly down_link_transit: number;
  readonly bank_preparation: { readonly hit: number; readonly closed: number; readonly conflict: number };
  readonly data_transfer: number;
  readonly up_link_transit: number;
  readonly total: { readonly hit: number; readonly closed: number; readonly conflict: number };
}

export function unloadedLatency(pkg: Package, link: Link): UnloadedLatency {
  const [memory] = pkg.memory;
  const ps = (name: TimingName): number => memory.timings[name].ck * memory.clockPs;
  const flits = (bytes: number): number => Math.ceil(bytes / (link.flitBytes - link.flitOverheadBytes));
  const onLink = (bytes: number): number => Math.ceil(flits(bytes) * link.flitPs) + link.latencyPs;
  const down = onLink(link.requestHeaderBytes) + memory.baseDie.ingressPs;
  const up = memory.baseDie.egressPs + onLink(link.responseHeaderBytes + memory.organisation.atom_bytes);
  const data = Math.ceil(ps('RL') + memory.organisation.burst_ck * memory.clockPs);
  const preparation = { hit: 0, closed: Math.ceil(ps('tRCDRD')), conflict: Math.ceil(ps('tRP') + ps('tRCDRD')) };
  const total = (state: number): number => down + state + data + up;
  return {
    clock_edges: Math.ceil(memory.clockPs + pkg.dies[link.die].clockPs),
    down_link_transit: down,
    bank_preparation: preparation,
    data_transfer: data,
    up_link_transit: up,
    total: { hit: total(preparation.hit), closed: total(preparation.closed), conflict: total(preparation.conflict) },
  };
}

/** Bytes of the whole package. */
export function capacityBytes(pkg: Package): number {
  return domains(pkg).reduce((sum, domain) => sum + domain.capacity, 0);
}

export { stackBytes };
