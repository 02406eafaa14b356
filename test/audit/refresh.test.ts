import { describe, expect, test } from 'vitest';
import { audit, broken, CK, type Command, cmd, device } from './build.js';

const [POSTPONE, PULL_IN] = [2, 1]; // of the test device
const I = CK.tREFI; // 400
const GAP = (POSTPONE + 1) * I;
const oneOf = { channels: 1, pseudo_channels: 1 };
const allBank = device({ refresh: { mode: 'all-bank' }, organisation: oneOf });
const all = (ck: number, at = ''): Command => cmd(ck, 'REFab', at);

describe('all-bank refreshes', () => {
  test('every tREFI, and later by as many as may be postponed', () => {
    expect(broken(allBank, [all(I), all(2 * I), all(3 * I)])).toEqual({});
    expect(broken(allBank, [all(0), all(GAP)])).toEqual({});
    expect(broken(allBank, [all(0), all(GAP + 0.5)])).toEqual({ 'refresh gap': 1 });
  });

  test('from the start of the log to the first', () => {
    expect(broken(allBank, [all(GAP)])).toEqual({});
    expect(broken(allBank, [all(GAP + 0.5)])).toEqual({ 'refresh gap': 1 });
  });

  test('from the last to the end of the log', () => {
    expect(broken(allBank, [all(100)], 100 + GAP)).toEqual({});
    expect(broken(allBank, [all(100)], 100 + GAP + 0.5)).toEqual({ 'refresh gap': 1 });
    const [{ command, earlier, required_ck, found_ck, bound }] = audit(allBank, [all(100)], 2000).kept;
    expect({ command, bound, required_ck, found_ck }).toEqual({
      command: null,
      bound: 'at most',
      required_ck: GAP,
      found_ck: 2000 - 100,
    });
    expect(earlier).toMatchObject({ ck: 100, command: 'REFab', line: 2 });
  });

  test('without an end, to the last command of the pseudo-channel', () => {
    const late = [all(0), cmd(GAP + 100, 'ACT')];
    expect(broken(allBank, late)).toEqual({ 'refresh gap': 1 });
    expect(broken(device({ refresh: { mode: 'all-bank' } }), [all(0), cmd(GAP, 'ACT')])).toEqual({});
  });

  test('with an end, also where no command came: each pseudo-channel is named', () => {
    const two = device({ refresh: { mode: 'all-bank' }, organisation: { channels: 1 } });
    const { violations, kept } = audit(two, [all(0)], GAP + 100);
    expect(violations).toBe(2);
    expect(kept.map(({ note }) => note)).toEqual([
      'stack 0 channel 0 pseudo-channel 0',
      'stack 0 channel 0 pseudo-channel 1',
    ]);
    expect(kept[1].earlier).toBeNull();
  });

  test('postponed ones are owed: the nth comes by (n + postpone) x tREFI', () => {
    // gaps of 2 x tREFI are each allowed, but every one adds to what is owed
    const log = [all(2 * I), all(4 * I), all(5 * I)]; // (1 + 2), (2 + 2), (3 + 2)
    expect(broken(allBank, log)).toEqual({});
    expect(broken(allBank, [...log.slice(0, 2), all(5 * I + 0.5)])).toEqual({ 'refresh owed': 1 });
    expect(broken(allBank, log, 6 * I)).toEqual({});
    expect(broken(allBank, log, 6 * I + 0.5)).toEqual({ 'refresh owed': 1 });
  });

  test('pulled in by as many as may be: the nth not before (n - 1 - pull-in) x tREFI', () => {
    const two = [all(0), all(100)]; // the first is due from 0 on; the second from 400 on, one may be ahead
    expect(broken(allBank, [...two, all((3 - 1 - PULL_IN) * I)])).toEqual({});
    expect(broken(allBank, [...two, all((3 - 1 - PULL_IN) * I - 0.5)])).toEqual({ 'refresh ahead': 1 });
  });

  test('of each stack ID apart where one closes one', () => {
    const perSid = device({ refresh: { mode: 'all-bank', scope: 'sid' }, organisation: oneOf });
    expect(broken(perSid, [all(0, '0'), all(400, '0'), all(800, '0'), all(1200, '0')], 1200)).toEqual({});
    expect(broken(perSid, [all(0, '0'), all(400, '0'), all(800, '0'), all(1200, '0')], 1201)).toEqual({
      'refresh gap': 1,
    });
    expect(broken(perSid, [all(0, '0'), all(400, '0'), all(800, '0'), all(1200.5, '1')])).toEqual({ 'refresh gap': 1 });
  });

  test('RFM pays nothing that is due', () => {
    expect(broken(allBank, [cmd(600, 'RFMab', ''), all(GAP + 0.5)])).toEqual({ 'refresh gap': 1 });
  });

  test('refresh off: none are missed', () => {
    expect(broken(device(), [cmd(10 * GAP, 'ACT'), all(20 * GAP, '')], 30 * GAP)).toEqual({ 'open row': 1 });
    expect(broken(device(), [all(0), all(50), all(100)])).toEqual({});
  });
});

describe('per-bank refreshes', () => {
  const one = { ...oneOf, sids: 1 };
  const perBank = device({ refresh: { mode: 'per-bank' }, organisation: one });
  const BANKS = ['0.0.0', '0.0.1', '0.1.0', '0.1.1'];
  const set = (ck: number, order = BANKS): Command[] => order.map((bank, i) => cmd(ck + 50 * i, 'REFpb', bank));

  test('every bank once, in any order, before any twice', () => {
    expect(broken(perBank, [...set(0), ...set(400, [...BANKS].reverse()), ...set(800)])).toEqual({});
    expect(broken(perBank, [...set(0).slice(0, 3), cmd(400, 'REFpb', '0.0.0')])).toEqual({ 'refresh order': 1 });
    expect(broken(perBank, [...set(0), cmd(400, 'REFpb', '0.1.1'), cmd(450, 'REFpb', '0.1.1')])).toMatchObject({
      'refresh order': 1,
    });
  });

  test('the earlier refresh of the bank is named', () => {
    const [{ rule, command, earlier }] = audit(perBank, [...set(0).slice(0, 2), cmd(400, 'REFpb', '0.0.0')]).kept;
    expect([rule, command?.line, earlier?.line]).toEqual(['refresh order', 4, 2]);
  });

  test('stack IDs have sets of their own', () => {
    const two = device({ refresh: { mode: 'per-bank' }, organisation: oneOf });
    const other = BANKS.map((bank) => bank.replace('0', '1'));
    const first = [...set(0), ...set(200, other).slice(0, 2)];
    expect(broken(two, [...first, ...set(400)])).toEqual({});
    expect(broken(two, [...first, cmd(400, 'REFpb', '1.0.0')])).toEqual({ 'refresh order': 1 });
  });

  test('an all-bank refresh begins the sets anew', () => {
    expect(broken(device(), [...set(0).slice(0, 2), all(200), ...set(400)])).toEqual({});
  });

  test('each bank within the gap', () => {
    const last = (ck: number): Command[] => [...set(0), ...set(GAP, BANKS.slice(0, 3)), cmd(ck, 'REFpb', '0.1.1')];
    expect(broken(perBank, last(150 + GAP))).toEqual({});
    expect(broken(perBank, last(150 + GAP + 0.5))).toEqual({ 'refresh gap': 1 });
  });

  test('each bank that waits too long at the end is named', () => {
    const report = audit(perBank, set(0), GAP + 100.5);
    // refreshed at 0, 50, 100 and 150: three have waited longer than the gap
    expect(report.kept.map(({ rule, note }) => [rule, note])).toEqual([
      ['refresh gap', 'stack 0 channel 0 pseudo-channel 0 sid 0 group 0 bank 0'],
      ['refresh gap', 'stack 0 channel 0 pseudo-channel 0 sid 0 group 0 bank 1'],
      ['refresh gap', 'stack 0 channel 0 pseudo-channel 0 sid 0 group 1 bank 0'],
    ]);
  });

  test('not counted in tRRD and tFAW where the device does not', () => {
    const apart = device({ refresh: { refpbInActivateWindow: false } });
    expect(broken(apart, [cmd(0, 'ACT'), cmd(1.5, 'REFpb', '0.0.1')])).toEqual({});
    expect(broken(device(), [cmd(0, 'ACT'), cmd(1.5, 'REFpb', '0.0.1')])).toEqual({ tRRD_L: 1 });
  });

  test('a command to a bank that is refreshing', () => {
    expect(broken(device(), [cmd(0, 'REFpb'), cmd(20, 'RD')])).toEqual({ tRFCpb: 1, 'no open row': 1 });
    expect(broken(device(), [cmd(0, 'REFpb'), cmd(20, 'PRE')])).toEqual({ tRFCpb: 1 });
    expect(broken(device(), [cmd(0, 'REFpb'), cmd(20, 'PREA', '1')])).toEqual({});
  });
});
