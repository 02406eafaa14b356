import { beforeAll, describe, expect, it } from 'vitest';
import { buildResult, Delays, type Result, type Standing, standings } from '../../src/analysis/index.js';
import { type Package, parsePackage } from '../../src/config/index.js';
import { rooflineReport } from '../../src/report/index.js';
import { kernelTrace, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

async function standing(pkg: Package, rows: string, within = 0.1): Promise<{ result: Result; found: Standing[] }> {
  const text = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,estimate_us\n${rows}`;
  const trace = await kernelTrace(pkg, text);
  const delays = new Delays();
  const { recording } = await simulate(pkg, trace, { collectors: [delays] });
  const options = { replay: 'closed', seed: '1', untilPs: Number.POSITIVE_INFINITY } as const;
  const result = buildResult(pkg, trace, { version: '0', options, overrides: [] }, recording, delays);
  return { result, found: standings(result, within) };
}

const sum = ({ losses }: Standing): number => losses.reduce((all, loss) => all + loss.ps, 0);

describe('a kernel against its bound', () => {
  let result: Result;
  let found: Standing[];
  beforeAll(async () => {
    ({ result, found } = await standing(
      smallPackage('memory.0.refresh={ mode: all-bank }'),
      [
        // 4 MiB at 819.2 GB/s less 8.97 % of refresh: 5.62 us
        'stream,main,,0,4 MiB,0,sequential,,32 KiB,5.6',
        'walk,main,,0,64 KiB,0,chase granule=64B span=64MiB,,4 KiB,0.1',
        // 1 GFLOP at 100 TFLOP/s: 10 us, against 0.35 us for its bytes
        'product,main,bf16,1 GFLOP,256 KiB,0,sequential,,32 KiB,10',
        'hopeless,main,,0,4 MiB,0,sequential,,32 KiB,1',
        'careful,main,,0,1 MiB,0,sequential,,32 KiB,100',
        'unjudged,main,,0,256 KiB,256 KiB,uniform granule=64B span=64MiB,sequential,16 KiB,',
      ].join('\n'),
    ));
  });

  it('has losses that add up to what it took beyond the bound', () => {
    expect(found).toHaveLength(6);
    for (const one of found) {
      expect(Math.abs(sum(one) - (one.durationPs - one.boundPs))).toBeLessThan(1e-6 * one.durationPs + 1e-6);
      expect([...one.losses].sort((a, b) => b.ps - a.ps)).toEqual(one.losses);
      for (const loss of one.losses) if (loss.name !== 'refresh_put_off') expect(loss.ps).toBeGreaterThanOrEqual(0);
    }
  });

  it('has the bound of the roofline, by hand', () => {
    const at = (name: string) => found.find((one) => one.name === name) as Standing;
    // 16 channels x 2 x 32 B / (2 ck x 625 ps) = 819.2 GB/s; refresh takes 560 of 6240 ck
    expect(at('stream').boundPs).toBeCloseTo(((4 * 2 ** 20) / (819.2e9 * (1 - 560 / 6240))) * 1e12, -2);
    expect(at('product').boundPs).toBeCloseTo(10e6, -2);
    expect(at('product')).toMatchObject({ boundBy: 'compute' });
    expect(at('stream')).toMatchObject({ boundBy: 'dram' });
  });

  it('is judged by its estimate', () => {
    expect(Object.fromEntries(found.map((one) => [one.name, one.verdict]))).toEqual({
      stream: 'holds',
      walk: 'too hopeful',
      product: 'holds',
      hopeless: 'below the bound',
      careful: 'too careful',
      unjudged: null,
    });
  });

  it('says that a walk that waits for each answer had an empty window', () => {
    const walk = found.find((one) => one.name === 'walk') as Standing;
    expect(walk.timesBound).toBeGreaterThan(5);
    expect(['starved_window', 'other_kernels', 'starved_imbalance']).toContain(walk.losses[0].name);
  });

  it('is reported in lines of 100 columns, with the verdict first', () => {
    const lines = rooflineReport(result, found, 0.1, { colour: false, width: 100 }).split('\n');
    expect(lines[0]).toMatch(/^2 of 5 estimates hold within 10 %; farthest off is /);
    expect(lines.filter((line) => [...line].length > 100)).toEqual([]);
    expect(lines.some((line) => /hopeless .* is below the bound$/.test(line))).toBe(true);
  });
});

it('the time before a kernel began is not its own: what computed before keeps it', async () => {
  const pkg = parsePackage(
    `
penstock: 1
name: two
compute: [{ name: die, clock: 1 GHz, engines: 1, window: 64, request: 256 B, peak: { bf16: 1 TFLOP/s } }]
memory: [{ name: hbm, device: hbm3-6.4, stacks: 1, refresh: { mode: off } }]
links: [{ name: up, from: die, to: hbm.0, lanes: 512, rate: 16 GT/s, landing: 64 KiB }]
address_map: { interleave: [pseudo_channel, channel, stack], granule: 256 B, fields: [column:3, bank_group:2, column:2, bank:2, sid:1, row:14] }
`,
    'two.yaml',
  );
  // 100 us of compute, in which the data buses are idle, then a short stream
  const { result } = await standing(
    pkg,
    'think,main,bf16,100 MFLOP,64 KiB,0,sequential,,64 KiB,\nread,main,,0,64 KiB,0,sequential,,64 KiB,\n',
  );
  const [think, read] = result.kernels.map((kernel) => kernel.bandwidth_stack);
  const idle = (stack: Result['bandwidth_stack']): number => stack.total - stack.read_data;
  const buses = 32;
  expect(idle(think)).toBeGreaterThan(buses * 0.99 * 160_000); // 100 us of 1.6 GHz on each bus
  expect(idle(read)).toBeLessThan(buses * 400); // a request's round trip
});
