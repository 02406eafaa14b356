import { describe, expect, test } from 'vitest';
import { buildResult, type Origin, type Result, resultJsonSchema, resultProblems } from '../../src/analysis/index.js';
import { STACK_CLASSES, STAGES } from '../../src/engine/recording.js';
import { jsonReport } from '../../src/report/index.js';
import { delaysOf, type Made, made } from './recording.js';

const ORIGIN: Origin = {
  version: '9.9.9',
  options: { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY },
  overrides: ['a=1'],
};

function resultOf({ pkg, trace, recording, delays }: Made = made()): Result {
  return buildResult(pkg, trace, ORIGIN, recording, delays);
}

function failing(change: (parts: Made) => Made): string[] {
  return resultOf(change(made()))
    .checks.filter((check) => !check.ok)
    .map((check) => check.name);
}

describe('result', () => {
  test('bandwidth is moved bytes over the makespan, useful beside it', () => {
    const { bandwidth } = resultOf();
    expect(bandwidth.achieved_bytes_per_s).toBe((4096 + 2048) / 1e-6);
    expect(bandwidth.read_bytes_per_s).toBe(4096 / 1e-6);
    expect(bandwidth.useful_bytes_per_s).toBe((2048 + 2048) / 1e-6);
    expect(bandwidth.stacks).toHaveLength(1);
    expect(bandwidth.channels).toHaveLength(16);
    expect(bandwidth.pseudo_channels).toHaveLength(32);
    expect(bandwidth.channels[3]).toEqual({
      stack: 0,
      channel: 3,
      achieved_bytes_per_s: (2 * (4 + 2) * 32) / 1e-6, // two pseudo-channels, four reads and two writes each, 32 B
      read_bytes_per_s: (2 * 4 * 32) / 1e-6,
      write_bytes_per_s: (2 * 2 * 32) / 1e-6,
    });
    const parts = bandwidth.pseudo_channels.reduce((sum, pc) => sum + pc.achieved_bytes_per_s, 0);
    expect(parts).toBeCloseTo(bandwidth.achieved_bytes_per_s, 0);
  });

  test('the bandwidth stack adds up to all clocks of all pseudo-channels', () => {
    const { bandwidth_stack: stack } = resultOf();
    expect(stack.total).toBe(32 * 1600);
    expect(STACK_CLASSES.reduce((sum, name) => sum + stack[name], 0)).toBe(stack.total);
    expect(stack.refresh).toBe(32 * 160);
  });

  test('the latency stack adds up to the mean read latency', () => {
    const { latency_stack, read_latency } = resultOf();
    expect(read_latency).toMatchObject({ count: 2, mean_ps: (38_700 + 22_010) / 2, max_ps: 38_700 });
    expect(STAGES.reduce((sum, stage) => sum + latency_stack[`${stage}_ps`], 0)).toBeCloseTo(read_latency.mean_ps, 6);
    expect(latency_stack.total_ps).toBe(read_latency.mean_ps);
  });

  test('compute utilization, in total, by die and by kernel', () => {
    const { compute, kernels } = resultOf();
    expect(compute.utilization).toBe(0.5);
    expect(compute.dies).toEqual([{ name: 'die', utilization: 0.5, mean_outstanding_requests: 82_740 / 1e6 }]);
    expect(kernels[1].compute_utilization).toBe((4 * 500_000) / (4 * 800_000)); // from 200 ns to 1,000 ns
  });

  test('kernels against their rooflines and estimates', () => {
    const [gather, product] = resultOf().kernels;
    expect(gather).toMatchObject({
      duration_ps: 800_000,
      estimate_ps: 500_000,
      flops: 0,
      bound_by: 'dram',
      bound_flops_per_s: null,
    });
    expect(gather.attained_bytes_per_s).toBe(4096 / 0.8e-6);
    expect(gather.mean_read_latency_ps).toBe((38_700 + 22_010) / 2);
    expect(product.intensity_moved).toBe(5e7 / 2048);
    expect(product.bound_flops_per_s).toBe(100e12); // 24,414 FLOP/B is far above the ridge
    expect(product.attained_flops_per_s).toBe(5e7 / 0.8e-6);
    expect(product.roofline_ratio).toBeCloseTo(62.5e12 / 100e12, 12);
    expect([product.mean_read_latency_ps, product.estimate_ps]).toEqual([null, null]);
  });

  test('queues, links and DRAM counters', () => {
    const { queues, links, dram, pkg } = { ...resultOf(), pkg: made().pkg };
    expect(queues.read).toEqual({ mean_entries: 0.5, max_entries: 31 });
    expect(queues.stacks[0].write).toEqual({ mean_entries: 0.25, max_entries: 2 });
    expect(links[0].up.utilization).toBeCloseTo((40 * pkg.links[0].flitPs) / 1e6, 12);
    expect(dram).toMatchObject({
      reads: 128,
      writes: 64,
      row_hits: 64,
      row_conflicts: 32,
      refreshes: 32,
      forwarded_reads: 1,
    });
  });

  test('equal runs give equal bytes, and the document is what its definition says', () => {
    const text = jsonReport(resultOf());
    expect(jsonReport(resultOf())).toBe(text);
    expect(resultProblems(JSON.parse(text))).toEqual([]);
    expect(JSON.parse(text)).toEqual(JSON.parse(JSON.stringify(resultOf())));
  });

  test('the definition refuses what is not a result', () => {
    const { makespan_ps: _, ...without } = JSON.parse(jsonReport(resultOf()));
    expect(resultProblems(without)).toEqual(['makespan_ps: Invalid input: expected number, received undefined']);
    expect(resultProblems({ ...without, makespan_ps: 1, extra: 1 })).toHaveLength(1);
  });

  test('the published schema names every key scripts rely on, each with a type', () => {
    const schema = resultJsonSchema() as { required: string[]; properties: Record<string, { required?: string[] }> };
    const required = (name: string) => schema.properties[name].required;
    expect(schema.required).toEqual(Object.keys(resultOf()));
    expect(required('bandwidth_stack')).toEqual([...STACK_CLASSES, 'total']);
    expect(required('delay')).toEqual([...STAGES]);
  });
});

describe('checks', () => {
  test('a sound run passes all, the engine’s own first', () => {
    const { checks } = resultOf();
    expect(checks.every((check) => check.ok)).toBe(true);
    expect(checks[0].name).toBe('bytes asked are answered');
    expect(checks.length).toBeGreaterThan(10);
  });

  const recording =
    (change: (r: Made['recording']) => Partial<Made['recording']>) =>
    (parts: Made): Made => ({
      ...parts,
      recording: { ...parts.recording, ...change(parts.recording) },
    });

  test.each<[string, (parts: Made) => Made, string]>([
    [
      'a lost sample',
      recording((r) => ({ kernels: [{ ...r.kernels[0], requests: 3 }, r.kernels[1]] })),
      'samples are as many as requests',
    ],
    [
      'a byte too many',
      recording((r) => ({ kernels: [{ ...r.kernels[0], readBytes: 2049 }, r.kernels[1]] })),
      'bytes of samples are those of kernels',
    ],
    [
      'windows that held more',
      recording(() => ({ engineWindowPs: Float64Array.of(82_741, 0, 0, 0) })),
      "Little's law, stages after issue (request x ps)",
    ],
    [
      'an engine busier than time',
      recording(() => ({ engineComputePs: Float64Array.of(1.1e6, 0, 0, 0) })),
      'busiest engine above the makespan (ps)',
    ],
    [
      'a link busier than time',
      recording((r) => ({ links: [{ ...r.links[0], flitsUp: 1e6 }] })),
      'busiest link above the makespan (ps)',
    ],
    [
      'more payload than flits',
      recording((r) => ({ links: [{ ...r.links[0], payloadBytesDown: 1e6 }] })),
      'link payload above what its flits hold (bytes)',
    ],
    [
      'a forwarded read too many',
      recording((r) => ({ dram: { ...r.dram, forwarded: new Float64Array(32).fill(1) } })),
      'reads served from write queues',
    ],
    [
      'more bytes than the buses carry',
      recording((r) => ({ kernels: [{ ...r.kernels[0], movedReadBytes: 1e9 }, r.kernels[1]] })),
      'bytes moved above the DRAM peak',
    ],
    [
      'a delay below zero',
      (parts) => ({ ...parts, delays: delaysOf([[1, 1, 64, [0, 0, -3, 0, 0, 0, 0, 0]]]) }),
      'least stage delay below zero (ps)',
    ],
    [
      'a clock lost from the stack',
      (parts) => {
        parts.recording.bandwidthStack[5] -= 1;
        return parts;
      },
      'bandwidth stack adds up to pseudo-channels x elapsed clocks',
    ],
    [
      'data the buses did not carry',
      (parts) => {
        parts.recording.bandwidthStack[0] += 1;
        parts.recording.bandwidthStack[2] -= 1;
        return parts;
      },
      'data clocks of the bandwidth stack are those of the bursts',
    ],
  ])('%s is found', (_, change, name) => {
    expect(failing(change)).toContain(name);
  });

  test('a run cut short is not held to equalities across the cut', () => {
    const cut = recording((r) => ({ partial: true, kernels: [{ ...r.kernels[0], requests: 3 }, r.kernels[1]] }));
    expect(failing(cut)).toEqual([]);
  });
});
