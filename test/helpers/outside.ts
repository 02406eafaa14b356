import { parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import type { Recording } from '../../src/engine/index.js';
import { type LoggedCommand, type Sample, sum } from './engine.js';
import { lonePackage } from './packages.js';

/** Latency of a request from ready to done, ps: its stages added up. */
export const latencyOf = (sample: Sample): number => {
  const { op, bytes, donePs, ...stages } = sample;
  return sum(Object.values(stages));
};

/** Bytes moved over the DRAM data buses, a second of simulated time, over the whole run. */
export const movedPerS = ({ dram, makespanPs }: Recording, atomBytes = 32): number =>
  ((sum(dram.reads) + sum(dram.writes)) * atomBytes) / (makespanPs * 1e-12);

/** Commands of some kinds. */
export const only = (log: readonly LoggedCommand[], ...names: readonly string[]): LoggedCommand[] =>
  log.filter((c) => names.includes(c.command));

/** Commands a clock in the middle of a run: from the first of them past `skip` of the log to the last, ends not counted twice. */
export function rate(log: readonly LoggedCommand[], skip = 0.1): number {
  const from = Math.floor(log.length * skip);
  const last = log[log.length - 1 - from];
  return (log.length - 1 - 2 * from) / (last.ck - log[from].ck);
}

/** One pseudo-channel of a device and an engine that could ask for several times what it gives. */
export function lone(device: 'hbm3-6.4' | 'hbm2-1.8', ...overrides: string[]): Package {
  const hbm2 = [
    'memory.0.device=hbm2-1.8',
    'address_map.fields=[column:3, bank_group:2, column:2, bank:2, row:14]', // a single stack ID
  ];
  return lonePackage(
    'compute.0.engines=1',
    'compute.0.window=4096',
    'compute.0.issue_per_clock=4',
    ...(device === 'hbm2-1.8' ? hbm2 : []),
    ...overrides,
  );
}

/**
 * One pseudo-channel of the FPGA card with HBM2 of Wang, Huang, Zhang and Alonso, FCCM 2020: the user's engine and its 256-bit
 * port at 450 MHz. The paper does not part the way between port and memory; here it is one delay, `pipelinePs`, all on the way
 * down, and the link itself is fast.
 */
export function fpgaCard(pipelinePs: number, ...overrides: string[]): Package {
  return parsePackage(
    `
penstock: 1
name: card
compute:
  - { name: fpga, clock: 450 MHz, engines: 1, window: 256, issue_per_clock: 1, request: 32 B }
memory:
  - name: hbm
    device: hbm2-1.8
    stacks: 1
    organisation: { channels: 1, pseudo_channels: 1 }
    base_die: { ingress: ${pipelinePs} ps, egress: 1 ns }
links:
  - { name: port, from: fpga, to: hbm.0, lanes: 512, rate: 16 GT/s, latency: 1 ns, landing: 1 MiB }
address_map:
  interleave: [stack, channel]
  granule: 1 KiB
  fields: [bank_group:1, column:5, bank:2, bank_group:1, row:14] # the card's default: row, bank group, bank, column, bank group
`,
    'card.yaml',
    overrides,
  );
}
