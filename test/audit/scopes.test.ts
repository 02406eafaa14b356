import { describe, expect, test } from 'vitest';
import { broken, CK, cmd, device } from './build.js';

const pkg = device();
const ELSEWHERE = [
  ['other pseudo-channel', { pc: 1 }],
  ['other channel', { channel: 1 }],
  ['other stack', { stack: 1 }],
] as const;

describe.each(ELSEWHERE)('the %s is not concerned', (_, where) => {
  const two = device({ organisation: { stacks: 2 } });

  test('by activations, columns, precharges', () => {
    const here = [cmd(0, 'ACT'), cmd(3, 'ACT', '0.1.0'), cmd(6, 'ACT', '1.0.0'), cmd(9, 'ACT', '1.1.0')]; // a full tFAW
    const there = cmd(10.5, 'ACT', '0.0.0', where); // after 9 + 1.5 of ACT on the row bus, before 0 + tFAW 14
    // WR 18: data 23 to 25, RD of the other at 19, long before WL + burst + tWTR; its data are on a bus of its own
    const columns = [
      cmd(18, 'WR'),
      cmd(19, 'RD', '0.0.0', where),
      cmd(20, 'PRE', '1.0.0'),
      cmd(30.5, 'PRE', '0.0.0', where),
    ];
    expect(broken(two, [...here, there, ...columns])).toEqual({
      tRAS: 1, // of the PRE at 20: the bank's own ACT was at 6
    });
  });

  test('by refreshes', () => {
    expect(broken(two, [cmd(0, 'REFab', ''), cmd(1, 'REFpb', '0.0.0', where), cmd(11, 'ACT', '0.1.0', where)])).toEqual(
      {},
    );
    expect(broken(two, [cmd(0, 'REFpb'), cmd(0.5, 'ACT', '0.0.0', where)])).toEqual({});
  });

  test('by open rows', () => {
    expect(broken(two, [cmd(0, 'ACT'), cmd(2, 'ACT', '0.0.0', where), cmd(10, 'RD', '0.0.0', where)])).toEqual({});
    expect(broken(two, [cmd(0, 'ACT'), cmd(10, 'RD', '0.0.0', where)])).toEqual({ 'no open row': 1 });
    expect(broken(two, [cmd(0, 'ACT'), cmd(10, 'REFab', '', where)])).toEqual({});
  });
});

describe('activate windows per stack ID', () => {
  const perSid = device({ activateWindowScope: 'sid' });
  const four = [cmd(0, 'ACT'), cmd(3, 'ACT', '0.1.0'), cmd(6, 'ACT', '0.0.1'), cmd(9, 'ACT', '0.1.1')];

  test('another stack ID has a tFAW and a tRRD of its own', () => {
    const fifth = cmd(10.5, 'ACT', '1.0.0'); // 9 + 1.5 on the row bus; 9 + tRRD_S 2 = 11 and 0 + tFAW 14 across stack IDs
    expect(broken(perSid, [...four, fifth])).toEqual({});
    expect(broken(pkg, [...four, fifth])).toEqual({ tRRD_S: 1, tFAW: 1 });
  });

  test('within one the rules hold', () => {
    const perBank = device({ activateWindowScope: 'sid', organisation: { banks_per_group: 4 } });
    expect(broken(perBank, [...four, cmd(0 + CK.tFAW, 'ACT', '0.0.2')])).toEqual({});
    expect(broken(perBank, [...four, cmd(0 + CK.tFAW - 0.5, 'ACT', '0.0.2')])).toEqual({ tFAW: 1 });
    expect(broken(perSid, [cmd(0, 'ACT'), cmd(CK.tRRD_S - 0.5, 'ACT', '0.1.0')])).toEqual({ tRRD_S: 1 });
  });
});

describe('scope of an all-bank refresh', () => {
  const perSid = device({ refresh: { scope: 'sid' } });

  test('one stack ID: the other goes on', () => {
    expect(broken(perSid, [cmd(0, 'ACT', '1.0.0'), cmd(2, 'REFab', '0'), cmd(8, 'RD', '1.0.0')])).toEqual({});
    expect(broken(perSid, [cmd(2, 'REFab', '0'), cmd(2 + CK.tRFCab, 'ACT')])).toEqual({});
    expect(broken(perSid, [cmd(2, 'REFab', '0'), cmd(1.5 + CK.tRFCab, 'ACT')])).toEqual({ tRFCab: 1 });
  });

  test('pseudo-channel: all stack IDs wait, whatever the log says in sid', () => {
    expect(broken(pkg, [cmd(0, 'ACT', '1.0.0'), cmd(40, 'REFab', '0')])).toEqual({ 'open row': 1 });
    expect(broken(pkg, [cmd(2, 'REFab', '0'), cmd(1.5 + CK.tRFCab, 'ACT', '1.0.0')])).toEqual({ tRFCab: 1 });
  });

  test('needs its stack ID where it closes one only', () => {
    expect(broken(perSid, [cmd(0, 'REFab', '')])).toEqual({ 'address range': 1 });
  });
});

describe('PREA', () => {
  const rows = [cmd(0, 'ACT'), cmd(10, 'ACT', '0.1.1'), cmd(20, 'ACT', '1.0.1')];

  test('closes every bank of the pseudo-channel, or of the stack ID it names', () => {
    const all = [...rows, cmd(40, 'PREA', '')];
    expect(broken(pkg, [...all, cmd(51, 'REFab', '')])).toEqual({}); // 20 + tRC 31 = 51 > 40 + tRP 9
    expect(broken(pkg, [...rows, cmd(40, 'PREA', '0'), cmd(51, 'REFab', '')])).toEqual({ 'open row': 1 });
    expect(broken(pkg, [...rows, cmd(40, 'PREA', '0'), cmd(49, 'RD', '1.0.1')])).toEqual({});
    expect(broken(pkg, [...all, cmd(49, 'RD', '1.0.1')])).toEqual({ 'no open row': 1 });
  });

  test('waits for the latest of them: one bank too young breaks tRAS once', () => {
    expect(broken(pkg, [...rows, cmd(20 + CK.tRAS, 'PREA', '')])).toEqual({});
    expect(broken(pkg, [...rows, cmd(20 + CK.tRAS - 0.5, 'PREA', '')])).toEqual({ tRAS: 1 });
    expect(broken(pkg, [...rows, cmd(20 + CK.tRAS - 0.5, 'PREA', '0')])).toEqual({});
  });
});

describe('a precharge of a closed bank', () => {
  test('is no fault, and does not begin tRP again', () => {
    const closed = [cmd(0, 'ACT'), cmd(30, 'PRE'), cmd(38, 'PRE')];
    expect(broken(pkg, [...closed, cmd(30 + CK.tRP, 'ACT')])).toEqual({});
    expect(broken(pkg, [cmd(0, 'PRE'), cmd(1, 'ACT')])).toEqual({});
  });

  test('after an own precharge has begun is one too', () => {
    const log = [cmd(0, 'ACT'), cmd(30, 'RDA'), cmd(30 + CK.tRTP, 'PREA', '')];
    expect(broken(pkg, [...log, cmd(30 + CK.tRTP + CK.tRP, 'ACT')])).toEqual({});
  });
});

test('after RDA the row is gone at once', () => {
  expect(broken(pkg, [cmd(0, 'ACT'), cmd(30, 'RDA'), cmd(34, 'RD')])).toEqual({ 'no open row': 1 });
});

test('a read of an earlier row does not hold the own precharge of a later one', () => {
  // row 1: ACT 0, RD 20, PRE 24; row 2: ACT 33, WRA 39 begins to precharge at 39 + 5 + 2 + 7 = 53, ACT at 53 + 9 = 62
  const log = [cmd(0, 'ACT'), cmd(20, 'RD'), cmd(24, 'PRE'), cmd(33, 'ACT'), cmd(39, 'WRA')];
  expect(broken(pkg, [...log, cmd(64, 'ACT')])).toEqual({}); // 33 + tRC 31 = 64
});

test('RAS is the longer of two limits for a row read once', () => {
  // RD 8 would allow PRE at 12, tRAS asks for 20
  expect(broken(pkg, [cmd(0, 'ACT'), cmd(8, 'RD'), cmd(12, 'PRE')])).toEqual({ tRAS: 1 });
});

describe('rows', () => {
  const open = [cmd(0, 'ACT', '0.0.0', { row: 5 })];
  test.each([
    ['RD of a closed bank', [cmd(0, 'RD')], 'no open row'],
    ['WRA of a closed bank', [cmd(0, 'WRA')], 'no open row'],
    ['RD of another row', [...open, cmd(20, 'RD', '0.0.0', { row: 6 })], 'other row'],
    ['WR of another row', [...open, cmd(20, 'WR', '0.0.0', { row: 4 })], 'other row'],
    ['ACT of an open bank', [...open, cmd(40, 'ACT')], 'open row'],
    ['REFab with an open bank', [...open, cmd(40, 'REFab', '')], 'open row'],
    ['RFMab with an open bank', [...open, cmd(40, 'RFMab', '')], 'open row'],
    ['REFpb of an open bank', [...open, cmd(40, 'REFpb')], 'open row'],
  ])('%s', (_, log, rule) => {
    expect(broken(pkg, log)).toEqual({ [rule]: 1 });
  });
  test('the row of a column command may be left out', () => {
    expect(broken(pkg, [...open, cmd(20, 'RD'), cmd(24, 'RD', '0.0.0', { row: 5 })])).toEqual({});
  });
  test('REFpb of a bank beside an open one', () => {
    expect(broken(pkg, [...open, cmd(40, 'REFpb', '0.0.1')])).toEqual({});
  });
});
