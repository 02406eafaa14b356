import type { MemoryGroup, Package } from '../config/package.js';

/** The package's memory as counts, in the order indices nest: stack, channel, pseudo-channel, stack ID, bank group, bank. */
export interface System {
  readonly stacks: number;
  readonly channels: number; // per stack
  readonly pseudoChannels: number; // per channel
  readonly total: number; // pseudo-channels of the whole package
  readonly groups: number; // bank groups per pseudo-channel, over all stack IDs
  readonly groupsPerSid: number;
  readonly banksPerGroup: number;
  readonly banks: number; // per pseudo-channel, over all stack IDs
  readonly sids: number;
  readonly rows: number;
  readonly columns: number; // atoms per row
  readonly atomBytes: number;
}

/** The one memory group the engine models so far. */
export function memoryOf(pkg: Package): MemoryGroup {
  return pkg.memory[0];
}

export function systemOf(pkg: Package): System {
  const { organisation: o } = memoryOf(pkg);
  return {
    stacks: o.stacks,
    channels: o.channels,
    pseudoChannels: o.pseudo_channels,
    total: o.stacks * o.channels * o.pseudo_channels,
    groups: o.sids * o.bank_groups,
    groupsPerSid: o.bank_groups,
    banksPerGroup: o.banks_per_group,
    banks: o.sids * o.bank_groups * o.banks_per_group,
    sids: o.sids,
    rows: o.rows,
    columns: o.columns,
    atomBytes: o.atom_bytes,
  };
}
