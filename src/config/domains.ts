import type { Domain, MemoryGroup, Package } from './package.js';

/** Bytes of one stack. */
export function stackBytes({ organisation: o }: MemoryGroup): number {
  return (
    o.channels * o.pseudo_channels * o.sids * o.bank_groups * o.banks_per_group * o.rows * o.columns * o.atom_bytes
  );
}

/** Each compute die's own range of the address space: dies in order, one contiguous range each. */
export function domains(pkg: Package): Domain[] {
  const bytes = stackBytes(pkg.memory[0]);
  let base = 0;
  return pkg.dies.map((_, die) => {
    const stacks = pkg.links.filter((link) => link.die === die).map((link) => link.stack);
    const domain = { die, base, capacity: bytes * stacks.length, stacks };
    base += domain.capacity;
    return domain;
  });
}
