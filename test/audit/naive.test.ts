import fc from 'fast-check';
import { expect, test } from 'vitest';
import { COMMANDS, type CommandName, RULE_NAMES } from '../../src/audit/index.js';
import { TIMING_NAMES } from '../../src/config/package.js';
import { audit, type Command, type Device, device } from './build.js';
import { naiveAudit, naiveEnd } from './naive.js';

const clocks = fc.oneof(fc.nat({ max: 6 }), fc.nat({ max: 30 }));
const bit = fc.nat({ max: 1 });

/** Devices that make no sense as well: what is short in real ones may be long here, so that every rule is the last one at times. */
const devices: fc.Arbitrary<Device> = fc.record({
  timings: fc.record(
    Object.fromEntries(TIMING_NAMES.map((name) => [name, name === 'tREFI' ? fc.integer({ min: 1, max: 80 }) : clocks])),
  ),
  organisation: fc.record({ burst_ck: fc.integer({ min: 1, max: 4 }) }),
  buses: fc.record({
    separate: fc.boolean(),
    actHalfCk: fc.integer({ min: 1, max: 4 }),
    preHalfCk: fc.integer({ min: 1, max: 3 }),
    refHalfCk: fc.integer({ min: 1, max: 3 }),
    columnHalfCk: fc.integer({ min: 1, max: 3 }),
  }),
  refresh: fc.record({
    mode: fc.constantFrom('off' as const, 'all-bank' as const, 'per-bank' as const),
    scope: fc.constantFrom('sid' as const, 'pseudo_channel' as const),
    postpone: fc.nat({ max: 2 }),
    pullIn: fc.nat({ max: 2 }),
    refpbInActivateWindow: fc.boolean(),
  }),
  activateWindowScope: fc.constantFrom('sid' as const, 'pseudo_channel' as const),
}) as fc.Arbitrary<Device>;

const names = fc.oneof(
  { weight: 4, arbitrary: fc.constant<CommandName>('ACT') },
  { weight: 3, arbitrary: fc.constantFrom<CommandName>('RD', 'WR', 'RDA', 'WRA', 'PRE') },
  { weight: 1, arbitrary: fc.constantFrom<CommandName>(...COMMANDS) },
);

interface Step {
  readonly gap: number; // half clocks since the command before
  readonly name: CommandName;
  readonly channel: number;
  readonly pc: number;
  readonly sid: number;
  readonly group: number;
  readonly bank: number;
  readonly row: number;
  readonly whole: boolean; // PREA of the whole pseudo-channel
}

const logs = (name: fc.Arbitrary<CommandName>): fc.Arbitrary<Step[]> =>
  fc.array(
    fc.record({
      gap: fc.oneof(fc.nat({ max: 4 }), fc.nat({ max: 12 }), fc.nat({ max: 120 })),
      name,
      channel: fc.oneof({ weight: 5, arbitrary: fc.constant(0) }, { weight: 1, arbitrary: bit }),
      pc: fc.oneof({ weight: 5, arbitrary: fc.constant(0) }, { weight: 1, arbitrary: bit }),
      sid: bit,
      group: bit,
      bank: bit,
      row: fc.oneof({ weight: 6, arbitrary: fc.constant(1) }, { weight: 1, arbitrary: fc.constant(2) }),
      whole: fc.boolean(),
    }),
    { maxLength: 30, size: 'max' },
  );

const steps = fc.oneof(
  { weight: 3, arbitrary: logs(names) },
  { weight: 1, arbitrary: logs(fc.constantFrom<CommandName>('REFpb', 'REFpb', 'REFpb', 'REFab', 'ACT')) },
);

function toLog(list: readonly Step[]): Command[] {
  let halfCk = 0;
  return list.map(({ gap, name, channel, pc, sid, group, bank, row, whole }) => {
    halfCk += gap;
    const many = ['PREA', 'REFab', 'RFMab'].includes(name);
    const column = /^(RD|WR)/.test(name);
    return {
      ck: halfCk / 2,
      name,
      stack: 0,
      channel,
      pc,
      sid: name === 'PREA' && whole ? -1 : sid,
      group: many ? -1 : group,
      bank: many ? -1 : bank,
      row: name === 'ACT' || column ? row : -1,
      column: column ? 0 : -1,
    };
  });
}

test('the fast checker and the naive one find the same, whatever the log and the device', () => {
  const seen = new Set<string>();
  fc.assert(
    fc.property(devices, steps, (change, list) => {
      const pkg = device(change);
      const log = toLog(list);
      const naive = naiveAudit(pkg, log);
      const report = audit(pkg, log);
      for (const { rule } of naive) seen.add(rule);
      const kept = report.kept
        .filter(({ command }) => command !== null)
        .map(({ rule, command, earlier, required_ck }) => ({
          rule: rule as string,
          line: command?.line,
          bound: required_ck === null ? null : required_ck + (earlier?.ck ?? 0),
        }));
      if (naive.length <= 100) expect(kept).toEqual(naive);
      const all = [...naive.map(({ rule }) => rule), ...naiveEnd(pkg, log)];
      expect(report.violations).toBe(all.length);
      for (const { rule, violations } of report.rules) {
        expect(`${rule} ${violations}`).toBe(`${rule} ${all.filter((name) => name === rule).length}`);
      }
    }),
    { numRuns: 4000, seed: 1 },
  );
  // the logs were such that every rule was broken somewhere; two are of the log, not of the device
  expect(RULE_NAMES.filter((rule) => !seen.has(rule))).toEqual(['time order', 'address range']);
}, 60_000);
