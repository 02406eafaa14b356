import { describe, expect, test } from 'vitest';
import { describePackage, loadPackage } from '../../src/config/index.js';
import { TIMING_NAMES } from '../../src/config/package.js';
import { STAGES } from '../../src/engine/index.js';
import { descriptionReport } from '../../src/report/index.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

const text = (...overrides: string[]): string =>
  descriptionReport(describePackage(smallPackage(...overrides)), { colour: false, width: 100 });

describe('description of a package', () => {
  test('every timing stands there in ck and ns with its source', () => {
    const lines = text().split('\n');
    const { timings } = smallPackage().memory[0];
    for (const name of TIMING_NAMES) {
      const cells =
        lines
          .find((line) => line.trim().startsWith(`${name} `))
          ?.trim()
          .split(/ {2,}/) ?? [];
      expect(cells.slice(0, 2)).toEqual([name, String(timings[name].ck)]);
      expect(Number(cells[2])).toBeCloseTo(timings[name].ns, 3);
      const source = lines.findIndex((line) => line.startsWith(`  ${cells[3]} `));
      const words = lines
        .slice(source, source + 3)
        .join(' ')
        .replaceAll(/ +/g, ' ');
      expect(words).toContain(timings[name].source);
    }
  });

  test('at most 100 columns', () => {
    const demo = descriptionReport(describePackage(loadPackage('configs/wagtail.yaml')), { colour: false, width: 100 });
    const lengths = `${text()}${demo}`.split('\n').map((line) => [...line].length);
    expect(Math.max(...lengths)).toBeLessThanOrEqual(100);
  });

  test('says capacity, peak, unloaded latency and the address map', () => {
    const all = text();
    expect(all).toContain('capacity 16.0 GiB');
    expect(all).toContain('peak 819.2 GB/s');
    expect(all).toContain('no refresh');
    expect(all).toContain('column.0-2 at 5-7');
    expect(all).toContain('row.0-13');
    expect(all).toContain('hit / closed / conflict');
  });

  test('unloaded latency is what a lone read then takes, to within the clock edges', async () => {
    for (const overrides of [
      [],
      ['links.0.lanes=8', 'links.0.flit=32 B', 'links.0.flit_overhead=2 B'], // 48 B of answer in two flits of 30 B
      ['links.0.request_header=700 B', 'compute.0.clock=0.7 GHz', 'memory.0.clock=1.1 GHz'],
      ['links.0.latency=0 ns', 'memory.0.base_die={ ingress: 0.3 ns, egress: 17 ns }', 'links.0.flit=64 B'],
    ]) {
      const pkg = smallPackage(...overrides);
      const { total, clock_edges: edges } = describePackage(pkg).links[0].unloaded_latency_ps;
      const { samples } = await simulate(
        pkg,
        // a closed row, the same row, another row of that bank, each when all is quiet
        accessTrace(
          [0, 32, 2 ** 20].map((address): Row => ({ op: 'R', address, bytes: 32, engine: 0, after: address && 1 })),
        ),
        { keepSamples: true },
      );
      const took = samples.map((sample) => STAGES.reduce((sum, stage) => sum + sample[stage], 0) - sample.window_wait);
      for (const [i, state] of (['closed', 'hit', 'conflict'] as const).entries()) {
        expect(took[i]).toBeGreaterThanOrEqual(total[state]);
        expect(took[i]).toBeLessThanOrEqual(total[state] + edges);
      }
    }
  });

  test('follows overrides', () => {
    expect(text('memory.0.refresh.mode=all-bank')).toContain('all-bank refresh');
    expect(text('links.0.latency=9 ns')).toContain('9.00 ns');
  });
});
