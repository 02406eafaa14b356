import { describe, expect, test } from 'vitest';
import type { Standing } from '../../src/analysis/standing.js';
import { verdict } from '../../src/analysis/verdict.js';
import { STACK_CLASSES, type StackClass } from '../../src/engine/recording.js';

function standing(over: Partial<Standing>, parts: Partial<Record<StackClass, number>> = {}): Standing {
  return {
    partial: false,
    achieved: 0.4e12,
    bound: 1e12,
    limit: 'dram',
    stacksInUse: 6,
    stacks: 6,
    computeUtilization: 0.1,
    busiestEngine: 0.2,
    busiestLink: { name: 'west.0', direction: 'up', utilization: 0.5 },
    linksAlike: 1,
    stack: STACK_CLASSES.map((name) => parts[name] ?? 0),
    ...over,
  };
}

describe('verdict', () => {
  test('a ceiling that is nearly reached binds', () => {
    expect(verdict(standing({ achieved: 0.95e12 }))).toEqual({
      sentence: 'DRAM bandwidth binds: 950.0 GB/s is 95.0 % of the refresh-derated DRAM peak.',
      binds: 'dram',
      distance_ratio: 0.95,
    });
    expect(verdict(standing({ achieved: 0.95e12, limit: 'link' })).sentence).toBe(
      'Link bandwidth binds: 950.0 GB/s is 95.0 % of the link payload ceiling.',
    );
  });

  test('passing the refresh-derated peak is explained', () => {
    expect(verdict(standing({ achieved: 1.05e12 })).sentence).toContain('(refreshes were postponed)');
  });

  test('engines that compute nearly all the time bind', () => {
    const { binds, distance_ratio } = verdict(
      standing({ computeUtilization: 0.9 }, { starved_compute: 60, read_data: 40 }),
    );
    expect([binds, distance_ratio]).toEqual(['compute', 0.9]);
  });

  test('a link that is busy nearly always binds, however little of it is payload', () => {
    const busiestLink = { name: 'west.0', direction: 'up', utilization: 0.997 } as const;
    // waits for rows are on the path of a lone request: what they cost shows behind a full link too
    expect(verdict(standing({ busiestLink }, { read_data: 7, row_cycle: 63 }))).toEqual({
      sentence:
        'Link bandwidth binds: the up link of west.0 was busy for 99.7 % of the time; 400.0 GB/s is 40.0 % of the ' +
        'refresh-derated DRAM peak.',
      binds: 'link',
      distance_ratio: 0.4,
    });
    expect(verdict(standing({ busiestLink, linksAlike: 6 })).sentence).toContain('and 5 more nearly as long');
  });

  test('one engine that computes nearly always binds, though the others had nothing to do', () => {
    const { binds, sentence } = verdict(
      standing({ busiestEngine: 0.99, computeUtilization: 0.03 }, { starved_drain: 90 }),
    );
    expect(binds).toBe('compute');
    expect(sentence).toContain('one computed for 99.0 % of the time, all for 3.00 %');
  });

  test('stacks without work are said to be left out', () => {
    expect(verdict(standing({ achieved: 0.95e12, stacksInUse: 3 })).sentence).toBe(
      'DRAM bandwidth binds: 950.0 GB/s is 95.0 % of the refresh-derated DRAM peak of the 3 of 6 stacks in use.',
    );
    expect(verdict(standing({ stacksInUse: 3 }, { read_data: 1, starved_window: 9 })).sentence).toContain(
      '90.0 % of the DRAM clocks of the stacks in use',
    );
  });

  test('otherwise the largest cause binds when it stands out', () => {
    const { binds, sentence } = verdict(standing({}, { read_data: 40, starved_window: 40, row_cycle: 20 }));
    expect(binds).toBe('starved_window');
    expect(sentence).toContain('request window');
    expect(sentence).toContain('40.0 %');
  });

  test('when nothing stands out it says so, with the largest three', () => {
    const { binds, sentence } = verdict(
      standing({}, { read_data: 40, refresh: 11, row_cycle: 17, turnaround: 15, column_gap: 17 }),
    );
    expect(binds).toBe('nothing');
    expect(sentence).toBe(
      'No single limit dominates: 400.0 GB/s is 40.0 % of the refresh-derated DRAM peak; the largest losses of DRAM clocks ' +
        'are the row cycle (17.0 %), column gaps (17.0 %) and bus turnaround (15.0 %).',
    );
  });

  test('a large cause beside one nearly as large is not named alone', () => {
    expect(verdict(standing({}, { read_data: 40, row_cycle: 32, turnaround: 28 })).binds).toBe('nothing');
  });

  test('no traffic, no stack and a partial run are said', () => {
    expect(verdict(standing({ achieved: 0 })).sentence).toBe('Nothing binds: no byte crossed a DRAM data bus.');
    expect(verdict(standing({})).sentence).toMatch(/^What binds was not recorded/);
    expect(verdict(standing({ partial: true, achieved: 0.95e12 })).sentence).toMatch(
      /^Stopped before the trace ended; so far: DRAM/,
    );
  });
});
