import { parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';

/** A small package for tests: one die, one stack of HBM3 behind one fast link. Overrides are those of --set. */
const SMALL = `
penstock: 1
name: small
compute:
  - { name: die, clock: 1.6 GHz, engines: 4, window: 64, buffering: 2, request: 256 B, peak: { bf16: 100 TFLOP/s, fp8: 200 TFLOP/s } }
memory:
  - name: hbm
    device: hbm3-6.4
    stacks: 1
    refresh: { mode: off }
    base_die: { ingress: 5 ns, egress: 5 ns }
links:
  - { name: link, from: die, to: hbm.0, lanes: 512, rate: 16 GT/s, latency: 3 ns, landing: 1 MiB }
address_map:
  interleave: [pseudo_channel, channel, stack]
  granule: 256 B
  fields: [column:3, bank_group:2, column:2, bank:2, sid:1, row:14]
`;

export function smallPackage(...overrides: string[]): Package {
  return parsePackage(SMALL, 'small.yaml', overrides);
}

/** One pseudo-channel alone: everything queues for the same banks and buses. */
export function lonePackage(...overrides: string[]): Package {
  return parsePackage(SMALL, 'small.yaml', [
    'memory.0.organisation={ channels: 1, pseudo_channels: 1 }',
    'address_map.interleave=[stack, channel]',
    ...overrides,
  ]);
}
