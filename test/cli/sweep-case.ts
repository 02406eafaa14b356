/** A small sweep for the tests: one die, one stack, runs of some tens of milliseconds. */
import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Folder } from './penstock.js';

const PACKAGE = `
penstock: 1
name: small
compute:
  - { name: die, clock: 1.6 GHz, engines: 4, window: 64, buffering: 2, request: 256 B, peak: { bf16: 100 TFLOP/s } }
memory:
  - name: hbm
    device: hbm3-6.4
    stacks: 1
    base_die: { ingress: 5 ns, egress: 5 ns }
links:
  - { name: link, from: die, to: hbm.0, lanes: 512, rate: 16 GT/s, latency: 3 ns, landing: 1 MiB }
address_map:
  interleave: [pseudo_channel, channel, stack]
  granule: 256 B
  fields: [column:3, bank_group:2, column:2, bank:2, sid:1, row:14]
`;
const KERNELS = `kernel,stream,format,flops,read,write,read_pattern,write_pattern
gather,main,,0,128 KiB,0,uniform granule=64B span=1GiB,
copy,main,,0,128 KiB,128 KiB,sequential,sequential
`;
const PLAN = `penstock_sweep: 1
name: small sweep
package: small.yaml
trace: kernels.csv
axes:
  rate: { set: links.link.rate, values: [2 GT/s, 8 GT/s, 16 GT/s] }
  queue: { set: memory.hbm.controller.read_queue, values: [4, 16, 64] }
where: rate > 2 GT/s or queue < 64
pareto: { bandwidth.achieved_bytes_per_s: up, read_latency.p99_ps: down }
cost: rate / 1 GT/s + queue / 16
`;

/** Writes package, trace and plan into the folder; gives the plan's name. `more` is put behind the plan. */
export function smallSweep(folder: Folder, more = '', name = 'plan.yaml'): string {
  writeFileSync(folder.at('small.yaml'), PACKAGE);
  writeFileSync(folder.at('kernels.csv'), KERNELS);
  writeFileSync(folder.at(name), PLAN + more);
  return folder.at(name);
}

/** Every file of a sweep's folder by its name. */
export function contents(folder: string): Record<string, string> {
  return Object.fromEntries(
    readdirSync(folder)
      .sort()
      .map((name) => [name, readFileSync(join(folder, name), 'latin1')]),
  );
}

/** Points that the lines of a sweep's folder hold, as a reader of whole lines sees them. */
export function pointsIn(folder: string): Map<number, string> {
  const points = new Map<number, string>();
  for (const [name, text] of Object.entries(contents(folder))) {
    if (!name.endsWith('.jsonl')) continue;
    for (const line of text.split('\n').slice(1, -1)) points.set(JSON.parse(line).point, line);
  }
  return points;
}
