import { describe, expect, test } from 'vitest';
import { type Result, resultProblems } from '../../src/analysis/index.js';
import { domains } from '../../src/config/index.js';
import { STAGES } from '../../src/engine/recording.js';
import { loadPackage, simulate } from '../../src/index.js';
import { jsonReport } from '../../src/report/index.js';
import { accessTrace, kernelTrace, type Row } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

const KERNELS = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat,estimate_us
product,main,bf16,2 GFLOP,1 MiB,256 KiB,block rows=32 width=256B pitch=4KiB,sequential,32 KiB,2,20
gather,main,,0,512 KiB,512 KiB,uniform granule=64B span=256MiB,sequential,16 KiB,1,
walk,side,,0,16 KiB,0,chase granule=64B span=16MiB,,4 KiB,1,
`;

const sum = (values: readonly number[]): number => values.reduce((a, b) => a + b, 0);

async function kernels(...overrides: string[]): Promise<Result> {
  const pkg = smallPackage('memory.0.refresh.mode=all-bank', ...overrides);
  return simulate(pkg, await kernelTrace(pkg, KERNELS), { seed: '5' });
}

describe('results of real runs', () => {
  test('are what the published definition says, with every check passed', async () => {
    const result = await kernels();
    expect(resultProblems(JSON.parse(jsonReport(result)))).toEqual([]);
    expect(result.checks.filter((check) => !check.ok)).toEqual([]);
    expect(result.partial).toBe(false);
  });

  test('are equal to the byte when the run is repeated', async () => {
    expect(jsonReport(await kernels())).toBe(jsonReport(await kernels()));
  });

  test('add up: kernels, places, stacks and stages', async () => {
    const {
      bandwidth,
      kernels: all,
      bandwidth_stack,
      dram,
      package: pkg,
      latency_stack,
      read_latency,
      makespan_ps,
    } = await kernels();
    expect(sum(all.map((kernel) => kernel.moved_bytes))).toBe(bandwidth.moved_bytes);
    expect(sum(all.map((kernel) => kernel.read_bytes))).toBe(2 * 2 ** 20 + 2 ** 19 + 2 ** 14); // product runs twice
    expect(bandwidth.moved_bytes).toBe((dram.reads + dram.writes) * 32);
    expect(sum(bandwidth.channels.map((channel) => channel.achieved_bytes_per_s))).toBeCloseTo(
      bandwidth.achieved_bytes_per_s,
      -3,
    );
    const { channels, pseudo_channels, burst_ck } = pkg.memory[0].organisation;
    expect(bandwidth_stack.total).toBe(channels * pseudo_channels * dram.elapsed_ck);
    expect(bandwidth_stack.read_data).toBe(dram.reads * burst_ck);
    expect(sum(STAGES.map((stage) => latency_stack[`${stage}_ps`]))).toBeCloseTo(read_latency.mean_ps, 3);
    expect(Math.max(...all.map((kernel) => kernel.end_ps ?? 0))).toBeLessThanOrEqual(makespan_ps);
  });

  test('compute utilization is compute time over engines x makespan', async () => {
    const { compute, kernels: all, makespan_ps } = await kernels();
    // 2 launches x 2 GFLOP at 100 TFLOP/s on all engines
    expect(compute.utilization).toBeCloseTo((2 * 2e9) / 100e12 / (makespan_ps / 1e12), 3);
    expect(all[0].flops).toBe(4e9);
    expect(all[0].roofline_ratio).toBeLessThanOrEqual(1);
  });

  test('a stream of reads over a narrow link is bound by that link, and the verdict says so', async () => {
    const pkg = smallPackage('links.0.lanes=64');
    const rows = Array.from({ length: 20_000 }, (_, i): Row => ({ op: 'R', address: i * 256, bytes: 256 }));
    const { verdict, bandwidth, links } = await simulate(pkg, accessTrace(rows));
    expect(verdict.binds).toBe('link');
    expect(verdict.sentence).toContain('Link bandwidth binds');
    expect(bandwidth.achieved_bytes_per_s).toBeLessThanOrEqual(bandwidth.link_ceiling_bytes_per_s);
    expect(bandwidth.achieved_bytes_per_s).toBeGreaterThan(0.95 * bandwidth.link_ceiling_bytes_per_s);
    expect(links[0].up.utilization).toBeGreaterThan(0.95);
  });

  test('one request at a time leaves the request window as what binds', async () => {
    const pkg = smallPackage('compute.0.window=1', 'compute.0.engines=1');
    const rows = Array.from({ length: 2000 }, (_, i): Row => ({ op: 'R', address: i * 256, bytes: 256 }));
    const { verdict } = await simulate(pkg, accessTrace(rows));
    expect(['starved_window', 'starved_imbalance']).toContain(verdict.binds);
  });

  test('short requests fill a link with headers: the link binds, far below its payload ceiling', async () => {
    const pkg = smallPackage('links.0.lanes=64');
    const rows = Array.from({ length: 20_000 }, (_, i): Row => ({ op: 'R', address: i * 256, bytes: 32 }));
    const { verdict, links, bandwidth } = await simulate(pkg, accessTrace(rows));
    expect(Math.max(links[0].up.utilization, links[0].down.utilization)).toBeGreaterThan(0.9);
    expect(bandwidth.achieved_bytes_per_s).toBeLessThan(0.9 * bandwidth.bound_bytes_per_s);
    expect(verdict.binds).toBe('link');
    expect(verdict.sentence).toContain('link of link was busy');
  });

  test('work on one die of two is judged by the stacks of that die', async () => {
    const pkg = loadPackage('configs/wagtail.yaml');
    const stacks = pkg.links.filter((link) => link.die === 0).length;
    const rows = Array.from({ length: 50_000 }, (_, i): Row => ({ op: 'R', address: i * 256, bytes: 256 }));
    // a few bytes on the other die do not put its stacks in use
    rows.push({ op: 'R', address: domains(pkg)[1].base, bytes: 256 });
    const { verdict, bandwidth } = await simulate(pkg, accessTrace(rows));
    expect(bandwidth.stacks.filter((stack) => stack.achieved_bytes_per_s > 0)).toHaveLength(stacks + 1);
    expect(verdict.sentence).toContain(`of the ${stacks} of ${pkg.links.length} stacks in use`);
    expect(verdict.distance_ratio).toBeCloseTo(
      (bandwidth.achieved_bytes_per_s / bandwidth.bound_bytes_per_s) * (pkg.links.length / stacks),
      3, // but for those bytes
    );
  });

  test('a kernel that fits one tile computes on one engine, and the verdict says that this binds', async () => {
    const pkg = smallPackage();
    const one = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat,estimate_us
one,main,bf16,10 GFLOP,4 KiB,0,sequential,,4 KiB,1,
`;
    const { verdict, compute, kernels: all } = await simulate(pkg, await kernelTrace(pkg, one));
    expect(compute.utilization).toBeCloseTo(1 / 4, 3); // one of four engines
    expect(verdict.sentence).toContain('Compute binds on some engines');
    // 4 x 10 GFLOP / 100 TFLOP/s = 400 us: an engine has a quarter of the die's peak
    expect(all[0].duration_ps / 400e6).toBeCloseTo(1, 2);
    expect(all[0].bound_by).toBe('compute');
  });
});
