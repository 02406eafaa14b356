import { describe, expect, test } from 'vitest';
import { type Standing, verdict } from '../../src/analysis/verdict.js';
import { STACK_CLASSES, type StackClass } from '../../src/engine/recording.js';

function standing(over: Partial<Standing>, parts: Partial<Record<StackClass, number>> = {}): Standing {
  return {
    partial: false,
    achieved: 0.4e12,
    bound: 1e12,
    limit: 'dram',
    computeUtilization: 0.1,
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
      'No single limit dominates: 400.0 GB/s is 40.0 % of the refresh-derated DRAM peak; most DRAM clocks were lost to ' +
        'the row cycle (17.0 %), column gaps (17.0 %) and bus turnaround (15.0 %).',
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
