import { describe, expect, test } from 'vitest';
import type { CommandName } from '../../src/audit/index.js';
import { audit, BURST, broken, CK, type Command, cmd, type Device, device, type Elsewhere } from './build.js';

/**
 * One row a separation: commands before, the command under test, the clock at which it may come as a sum, and the step of its
 * bus. At that clock the log is clean; one step sooner it breaks exactly that rule, exactly once.
 */
interface Case {
  readonly rule: string;
  readonly name: string;
  readonly before: readonly Command[];
  readonly next: readonly [name: CommandName, at?: string, where?: Elsewhere];
  readonly at: number;
  readonly step?: number; // ck; half a clock on the row bus, one on the column bus
  readonly needs?: Device;
}

const ACT0 = cmd(0, 'ACT');
const OTHER_GROUP = '0.1.0';
const SAME_GROUP = '0.0.1';
const OTHER_SID = '1.0.0';
/** Banks of both groups and both stack IDs open long since, so that only column rules are left. */
const OPEN = [cmd(0, 'ACT'), cmd(20, 'ACT', SAME_GROUP), cmd(40, 'ACT', OTHER_GROUP), cmd(60, 'ACT', OTHER_SID)];

const CASES: readonly Case[] = [
  {
    rule: 'tRC',
    name: 'ACT to ACT',
    before: [ACT0, cmd(20, 'PRE')], // tRAS 20; 20 + tRP 9 = 29 < 31
    next: ['ACT'],
    at: 0 + CK.tRC,
  },
  { rule: 'tRC', name: 'ACT to REFab', before: [ACT0, cmd(20, 'PRE')], next: ['REFab', ''], at: 0 + CK.tRC },
  { rule: 'tRC', name: 'ACT to REFpb', before: [ACT0, cmd(20, 'PRE')], next: ['REFpb'], at: 0 + CK.tRC },
  { rule: 'tRC', name: 'ACT to RFMpb', before: [ACT0, cmd(20, 'PRE')], next: ['RFMpb'], at: 0 + CK.tRC },
  { rule: 'tRAS', name: 'ACT to PRE', before: [ACT0], next: ['PRE'], at: 0 + CK.tRAS },
  { rule: 'tRAS', name: 'ACT to PREA', before: [ACT0], next: ['PREA', ''], at: 0 + CK.tRAS },
  { rule: 'tRAS', name: 'ACT to PREA of its SID', before: [ACT0], next: ['PREA', '0'], at: 0 + CK.tRAS },
  { rule: 'tRP', name: 'PRE to ACT', before: [ACT0, cmd(40, 'PRE')], next: ['ACT'], at: 40 + CK.tRP },
  { rule: 'tRP', name: 'PREA to ACT', before: [ACT0, cmd(40, 'PREA', '')], next: ['ACT'], at: 40 + CK.tRP },
  { rule: 'tRP', name: 'PRE to REFab', before: [ACT0, cmd(40, 'PRE')], next: ['REFab', ''], at: 40 + CK.tRP },
  { rule: 'tRP', name: 'PRE to RFMab', before: [ACT0, cmd(40, 'PRE')], next: ['RFMab', ''], at: 40 + CK.tRP },
  { rule: 'tRP', name: 'PRE to REFpb', before: [ACT0, cmd(40, 'PRE')], next: ['REFpb'], at: 40 + CK.tRP },
  { rule: 'tRCDRD', name: 'ACT to RD', before: [ACT0], next: ['RD'], at: 0 + CK.tRCDRD, step: 1 },
  { rule: 'tRCDRD', name: 'ACT to RDA', before: [ACT0], next: ['RDA'], at: 0 + CK.tRCDRD, step: 1 },
  { rule: 'tRCDWR', name: 'ACT to WR', before: [ACT0], next: ['WR'], at: 0 + CK.tRCDWR, step: 1 },
  { rule: 'tRCDWR', name: 'ACT to WRA', before: [ACT0], next: ['WRA'], at: 0 + CK.tRCDWR, step: 1 },
  { rule: 'tRTP', name: 'RD to PRE', before: [ACT0, cmd(30, 'RD')], next: ['PRE'], at: 30 + CK.tRTP },
  { rule: 'tRTP', name: 'RD to PREA', before: [ACT0, cmd(30, 'RD')], next: ['PREA', ''], at: 30 + CK.tRTP },
  { rule: 'tRTP', name: 'RDA to PREA', before: [ACT0, cmd(30, 'RDA')], next: ['PREA', ''], at: 30 + CK.tRTP },
  { rule: 'tWR', name: 'WR to PRE', before: [ACT0, cmd(30, 'WR')], next: ['PRE'], at: 30 + CK.WL + BURST + CK.tWR },
  {
    rule: 'tWR',
    name: 'WRA to PREA',
    before: [ACT0, cmd(30, 'WRA')],
    next: ['PREA', ''],
    at: 30 + CK.WL + BURST + CK.tWR,
  },
  { rule: 'tRRD_L', name: 'same bank group', before: [ACT0], next: ['ACT', SAME_GROUP], at: 0 + CK.tRRD_L },
  { rule: 'tRRD_S', name: 'other bank group', before: [ACT0], next: ['ACT', OTHER_GROUP], at: 0 + CK.tRRD_S },
  { rule: 'tRRD_S', name: 'other SID', before: [ACT0], next: ['ACT', OTHER_SID], at: 0 + CK.tRRD_S },
  {
    rule: 'tRRD_L',
    name: 'REFpb to ACT',
    before: [cmd(0, 'REFpb')],
    next: ['ACT', SAME_GROUP],
    at: 0 + 12,
    needs: { timings: { tRREFD: 10, tRRD_L: 12 } },
  },
  { rule: 'tRRD_L', name: 'ACT to REFpb', before: [ACT0], next: ['REFpb', SAME_GROUP], at: 0 + CK.tRRD_L },
  { rule: 'tRRD_S', name: 'ACT to REFpb', before: [ACT0], next: ['REFpb', OTHER_GROUP], at: 0 + CK.tRRD_S },
  {
    rule: 'tFAW',
    name: 'fifth ACT',
    before: [ACT0, cmd(3, 'ACT', OTHER_GROUP), cmd(6, 'ACT', OTHER_SID), cmd(9, 'ACT', '1.1.0')],
    next: ['ACT', SAME_GROUP],
    at: 0 + CK.tFAW,
  },
  {
    rule: 'tFAW',
    name: 'any four: counted from the second of five',
    before: [
      ACT0,
      cmd(20, 'ACT', OTHER_GROUP),
      cmd(23, 'ACT', OTHER_SID),
      cmd(26, 'ACT', '1.1.0'),
      cmd(29, 'ACT', SAME_GROUP),
    ],
    next: ['ACT', '1.1.1'],
    at: 20 + CK.tFAW,
  },
  {
    rule: 'tFAW',
    name: 'a REFpb among the four',
    before: [cmd(0, 'REFpb'), cmd(10, 'ACT', OTHER_GROUP), cmd(12, 'ACT', OTHER_SID), cmd(14, 'ACT', '1.1.0')],
    next: ['ACT', SAME_GROUP],
    at: 0 + 20,
    needs: { timings: { tFAW: 20 } },
  },
  {
    rule: 'tFAW',
    name: 'REFpb as the fifth',
    before: [ACT0, cmd(3, 'ACT', OTHER_GROUP), cmd(6, 'ACT', OTHER_SID), cmd(9, 'ACT', '1.1.0')],
    next: ['REFpb', SAME_GROUP],
    at: 0 + CK.tFAW,
  },
  {
    rule: 'tCCD_L',
    name: 'RD to RD',
    before: [...OPEN, cmd(80, 'RD')],
    next: ['RD', SAME_GROUP],
    at: 80 + CK.tCCD_L,
    step: 1,
  },
  {
    rule: 'tCCD_L',
    name: 'RD to RD, same bank',
    before: [...OPEN, cmd(80, 'RD')],
    next: ['RD'],
    at: 80 + CK.tCCD_L,
    step: 1,
  },
  {
    rule: 'tCCD_L',
    name: 'WR to WR',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['WR', SAME_GROUP],
    at: 80 + CK.tCCD_L,
    step: 1,
  },
  {
    rule: 'tCCD_S',
    name: 'RD to RD',
    before: [...OPEN, cmd(80, 'RD')],
    next: ['RD', OTHER_GROUP],
    at: 80 + 3, // longer than a burst, or the data bus would be in the way as well
    step: 1,
    needs: { timings: { tCCD_S: 3 } },
  },
  {
    rule: 'tCCD_S',
    name: 'WR to WR',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['WRA', OTHER_GROUP],
    at: 80 + 3,
    step: 1,
    needs: { timings: { tCCD_S: 3 } },
  },
  {
    rule: 'tCCD_R',
    name: 'RD to RD',
    before: [...OPEN, cmd(80, 'RD')],
    next: ['RD', OTHER_SID],
    at: 80 + CK.tCCD_R,
    step: 1,
  },
  {
    rule: 'tCCD_R',
    name: 'WR to WR',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['WR', OTHER_SID],
    at: 80 + CK.tCCD_R,
    step: 1,
  },
  ...(['RL', 'tCCD_L'] as const).map(
    (longest): Case => ({
      rule: longest === 'RL' ? 'tRTW' : 'tCCD_L',
      name: `RD to WR, same bank group, ${longest} longest`,
      before: [...OPEN, cmd(80, 'RD')],
      next: ['WR', SAME_GROUP],
      at: longest === 'RL' ? 80 + CK.RL + BURST - CK.WL + CK.tRTW : 80 + 11,
      step: 1,
      needs: { timings: { tCCD_L: longest === 'RL' ? CK.tCCD_L : 11 } },
    }),
  ),
  {
    rule: 'tRTW',
    name: 'RD to WR, other SID',
    before: [...OPEN, cmd(80, 'RD')],
    next: ['WR', OTHER_SID],
    at: 80 + CK.RL + BURST - CK.WL + CK.tRTW,
    step: 1,
  },
  {
    rule: 'tWTR_L',
    name: 'WR to RD',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['RD', SAME_GROUP],
    at: 80 + CK.WL + BURST + CK.tWTR_L,
    step: 1,
  },
  {
    rule: 'tWTR_S',
    name: 'WR to RD',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['RD', OTHER_GROUP],
    at: 80 + CK.WL + BURST + CK.tWTR_S,
    step: 1,
  },
  {
    rule: 'tWTR_S',
    name: 'WR to RD, other SID',
    before: [...OPEN, cmd(80, 'WR')],
    next: ['RD', OTHER_SID],
    at: 80 + CK.WL + BURST + CK.tWTR_S,
    step: 1,
  },
  { rule: 'tPPD', name: 'PRE to PRE', before: [...OPEN, cmd(90, 'PRE')], next: ['PRE', OTHER_SID], at: 90 + CK.tPPD },
  { rule: 'tPPD', name: 'PRE of a closed bank counts', before: [cmd(90, 'PRE')], next: ['PREA', ''], at: 90 + CK.tPPD },
  { rule: 'tRFCab', name: 'REFab to ACT', before: [cmd(0, 'REFab', '')], next: ['ACT', OTHER_SID], at: 0 + CK.tRFCab },
  { rule: 'tRFCab', name: 'REFab to REFab', before: [cmd(0, 'REFab', '')], next: ['REFab', ''], at: 0 + CK.tRFCab },
  { rule: 'tRFCab', name: 'REFab to REFpb', before: [cmd(0, 'REFab', '')], next: ['REFpb'], at: 0 + CK.tRFCab },
  { rule: 'tRFCab', name: 'REFab to PRE', before: [cmd(0, 'REFab', '')], next: ['PRE'], at: 0 + CK.tRFCab },
  { rule: 'tRFCab', name: 'RFMab to PREA', before: [cmd(0, 'RFMab', '')], next: ['PREA', '1'], at: 0 + CK.tRFCab },
  { rule: 'tRFCpb', name: 'REFpb to ACT', before: [cmd(0, 'REFpb')], next: ['ACT'], at: 0 + CK.tRFCpb },
  { rule: 'tRFCpb', name: 'REFpb to REFab', before: [cmd(0, 'REFpb')], next: ['REFab', ''], at: 0 + CK.tRFCpb },
  { rule: 'tRFCpb', name: 'REFpb to RFMpb', before: [cmd(0, 'REFpb')], next: ['RFMpb'], at: 0 + CK.tRFCpb },
  { rule: 'tRFCpb', name: 'RFMpb to PRE', before: [cmd(0, 'RFMpb')], next: ['PRE'], at: 0 + CK.tRFCpb },
  { rule: 'tRREFD', name: 'REFpb to REFpb', before: [cmd(0, 'REFpb')], next: ['REFpb', OTHER_SID], at: 0 + CK.tRREFD },
  { rule: 'tRREFD', name: 'RFMpb to REFpb', before: [cmd(0, 'RFMpb')], next: ['REFpb', SAME_GROUP], at: 0 + CK.tRREFD },
  {
    rule: 'tRREFD',
    name: 'REFpb to ACT elsewhere',
    before: [cmd(0, 'REFpb')],
    next: ['ACT', OTHER_SID],
    at: 0 + CK.tRREFD,
  },
  // own precharge: begins when tRAS, tRTP and write recovery have all passed, then tRP; each of the three is last once
  {
    rule: 'own precharge',
    name: 'RDA, tRAS last',
    before: [ACT0, cmd(8, 'RDA')], // 8 + tRTP 4 = 12 < tRAS 20; tRC 31 is made shorter than 20 + 9
    next: ['ACT'],
    at: 0 + CK.tRAS + CK.tRP,
    needs: { timings: { tRC: 28 } },
  },
  {
    rule: 'own precharge',
    name: 'RDA, tRTP last',
    before: [ACT0, cmd(30, 'RDA')],
    next: ['ACT'],
    at: 30 + CK.tRTP + CK.tRP,
  },
  {
    rule: 'own precharge',
    name: 'WRA',
    before: [ACT0, cmd(30, 'WRA')],
    next: ['ACT'],
    at: 30 + CK.WL + BURST + CK.tWR + CK.tRP,
  },
  {
    rule: 'own precharge',
    name: 'RDA soon after a write: recovery of the write last',
    before: [ACT0, cmd(30, 'WR'), cmd(39, 'RDA')], // the read is allowed at 30 + 5 + 2 + 2 = 39; 39 + tRTP 4 = 43 < 44
    next: ['ACT'],
    at: 30 + CK.WL + BURST + CK.tWR + CK.tRP,
    needs: { timings: { tWTR_L: 2 } },
  },
  {
    rule: 'own precharge',
    name: 'RDA to REFab',
    before: [ACT0, cmd(30, 'RDA')],
    next: ['REFab', ''],
    at: 30 + CK.tRTP + CK.tRP,
  },
  {
    rule: 'own precharge',
    name: 'WRA to REFpb',
    before: [ACT0, cmd(30, 'WRA')],
    next: ['REFpb'],
    at: 30 + CK.WL + BURST + CK.tWR + CK.tRP,
  },
];

describe.each(CASES)('$rule: $name', ({ rule, before, next: [name, at, where], at: soonest, step = 0.5, needs }) => {
  const pkg = device(needs);
  test('clean at the separation', () => {
    expect(broken(pkg, [...before, cmd(soonest, name, at, where)])).toEqual({});
  });
  test('broken one step sooner', () => {
    const log = [...before, cmd(soonest - step, name, at, where)];
    expect(broken(pkg, log)).toEqual({ [rule]: 1 });
    const [{ command, required_ck, found_ck, bound }] = audit(pkg, log).kept;
    expect(command).toMatchObject({ ck: soonest - step, command: name, line: log.length + 1 });
    expect(bound).toBe('at least');
    expect((required_ck as number) - (found_ck as number)).toBe(step);
  });
});

test('both commands are named in full', () => {
  const [violation] = audit(device(), [
    cmd(0, 'ACT', '1.0.1', { channel: 1, pc: 1, row: 7 }),
    cmd(7, 'RD', '1.0.1', { channel: 1, pc: 1, row: 7, column: 3 }),
  ]).kept;
  const place = { stack: 0, channel: 1, pseudo_channel: 1, sid: 1, bank_group: 0, bank: 1 };
  expect(violation).toEqual({
    rule: 'tRCDRD',
    command: { ck: 7, ...place, row: 7, column: 3, command: 'RD', line: 3 },
    earlier: { ck: 0, ...place, row: null, column: null, command: 'ACT', line: 2 },
    bound: 'at least',
    required_ck: 8,
    found_ck: 7,
    note: '',
  });
});

test('a command too near to several breaks the rule once, against the one that asks for the latest time', () => {
  const log = [cmd(0, 'ACT', '0.0.0'), cmd(3, 'ACT', '0.0.1'), cmd(4.5, 'ACT', '0.1.0'), cmd(6, 'ACT', '0.1.1')];
  // the last: tRRD_L 3 after 4.5, tRRD_S 2 after 3; the third: tRRD_S 2 after 3
  const report = audit(device(), log);
  expect(report.kept.map(({ rule, command, earlier }) => [rule, command?.line, earlier?.line])).toEqual([
    ['tRRD_S', 4, 3],
    ['tRRD_L', 5, 4],
  ]);
});
