import { describe, expect, test } from 'vitest';
import { BURST, broken, CK, cmd, device } from './build.js';

const pkg = device(); // separate buses: ACT 1.5 ck, PRE and refresh 0.5, columns 1
const OTHER = { pc: 1 };

describe('row bus, shared by the pseudo-channels of a channel', () => {
  test.each([
    ['ACT holds it 1.5 ck', cmd(0, 'ACT'), 1.5],
    ['PRE holds it 0.5 ck', cmd(0, 'PRE'), 0.5],
    ['PREA holds it 0.5 ck', cmd(0, 'PREA', ''), 0.5],
    ['REFab holds it 0.5 ck', cmd(0, 'REFab', ''), 0.5],
    ['REFpb holds it 0.5 ck', cmd(0, 'REFpb'), 0.5],
    ['RFMpb holds it 0.5 ck', cmd(0, 'RFMpb'), 0.5],
  ])('%s', (_, first, hold) => {
    for (const name of ['ACT', 'PRE', 'REFpb'] as const) {
      expect(broken(pkg, [first, cmd(0 + hold, name, '0.0.0', OTHER)])).toEqual({});
      expect(broken(pkg, [first, cmd(0 + hold - 0.5, name, '0.0.0', OTHER)])).toEqual({ 'row bus': 1 });
    }
  });

  test('a short command inside a long one does not free it', () => {
    const log = [cmd(0, 'ACT'), cmd(0.5, 'PRE', '0.0.0', OTHER), cmd(1, 'REFpb', '0.0.0', OTHER)];
    expect(broken(pkg, log)).toEqual({ 'row bus': 2 });
  });

  test('another channel has its own', () => {
    expect(broken(pkg, [cmd(0, 'ACT'), cmd(0, 'ACT', '0.0.0', { channel: 1 })])).toEqual({});
  });
});

describe('column bus', () => {
  const open = [cmd(0, 'ACT'), cmd(2, 'ACT', '0.0.0', OTHER)];
  test('one command a clock for both pseudo-channels', () => {
    expect(broken(pkg, [...open, cmd(20, 'RD'), cmd(21, 'WR', '0.0.0', OTHER)])).toEqual({});
    expect(broken(pkg, [...open, cmd(20, 'RD'), cmd(20, 'WR', '0.0.0', OTHER)])).toEqual({ 'column bus': 1 });
  });
  test('a row command may come with a column command', () => {
    expect(broken(pkg, [...open, cmd(30, 'RD'), cmd(30, 'PRE', '0.0.0', OTHER)])).toEqual({});
  });
  test('column commands begin on whole clocks', () => {
    expect(broken(pkg, [...open, cmd(20.5, 'RD')])).toEqual({ 'clock edge': 1 });
    expect(broken(pkg, [...open, cmd(20.5, 'WRA')])).toEqual({ 'clock edge': 1 });
  });
});

test('one command bus for all where the device has one', () => {
  const one = device({ buses: { separate: false, actHalfCk: 4, preHalfCk: 2, refHalfCk: 2, columnHalfCk: 2 } });
  const open = [cmd(0, 'ACT'), cmd(2, 'ACT', '0.0.0', OTHER)];
  expect(broken(one, [...open, cmd(30, 'RD'), cmd(31, 'PRE', '0.0.0', OTHER)])).toEqual({});
  expect(broken(one, [...open, cmd(30, 'RD'), cmd(30, 'PRE', '0.0.0', OTHER)])).toEqual({ 'command bus': 1 });
  expect(broken(one, [...open, cmd(30, 'PRE'), cmd(30, 'RD', '0.0.0', OTHER)])).toEqual({ 'command bus': 1 });
  expect(broken(one, [cmd(0, 'ACT'), cmd(1.5, 'ACT', '0.0.0', OTHER)])).toEqual({ 'command bus': 1 });
});

describe('data bus', () => {
  const open = [cmd(0, 'ACT'), cmd(20, 'ACT', '0.1.0'), cmd(40, 'ACT', '1.0.0')];
  test('bursts follow each other without a gap', () => {
    expect(broken(pkg, [...open, cmd(60, 'RD'), cmd(60 + BURST, 'RD', '0.1.0')])).toEqual({});
    const long = device({ organisation: { burst_ck: 5 } }); // longer than every tCCD
    expect(broken(long, [...open, cmd(60, 'RD'), cmd(60 + 5, 'RD', '0.1.0')])).toEqual({});
    expect(broken(long, [...open, cmd(60, 'RD'), cmd(60 + 4, 'RD', '0.1.0')])).toEqual({ 'data bus': 1 });
    expect(broken(long, [...open, cmd(60, 'WR'), cmd(60 + 4, 'WR', '1.0.0')])).toEqual({ 'data bus': 1 });
  });

  test('a write may meet the data of a read that is not the last one', () => {
    // RD 60 -> data 69 to 71, RD 64 -> 73 to 75; WR 64 + ... : at 65 its data begin at 65 + WL 5 = 70, inside the first burst
    const log = [...open, cmd(60, 'RD'), cmd(64, 'RD'), cmd(65, 'WR', '0.1.0')];
    expect(broken(device({ timings: { tCCD_S: 1 } }), log)).toEqual({ 'data bus': 1, tRTW: 1 });
    // between the two bursts, 71 to 73, there is room for its two clocks: only the turnaround is broken
    const between = [...open, cmd(60, 'RD'), cmd(64, 'RD'), cmd(71 - CK.WL, 'WR', '0.1.0')];
    expect(broken(pkg, between)).toEqual({ tRTW: 1 });
  });

  test('a read may meet the data of a write', () => {
    // WL 14 as long as RL 14 - 0; no turnaround asked for: WR 60 -> data 70 to 72, RD 61 + RL 9 = 70
    const odd = device({ timings: { WL: 10, tWTR_S: -13, tWTR_L: -13 } });
    expect(broken(odd, [...open, cmd(60, 'WR'), cmd(62, 'RD', '0.1.0')])).toEqual({ 'data bus': 1 });
    expect(broken(odd, [...open, cmd(60, 'WR'), cmd(63, 'RD', '0.1.0')])).toEqual({});
  });
});
