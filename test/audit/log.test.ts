import { describe, expect, test } from 'vitest';
import { auditLines, COMMANDS, createAudit, RULE_NAMES } from '../../src/audit/index.js';
import { audit, broken, type Command, cmd, device } from './build.js';

const pkg = device();

describe('order of time', () => {
  test('a channel going back is a violation, and its only one', () => {
    expect(broken(pkg, [cmd(10, 'ACT'), cmd(9.5, 'PRE', '1.0.0')])).toEqual({ 'time order': 1 });
    const [{ note, command }] = audit(pkg, [cmd(10, 'ACT'), cmd(9.5, 'PRE', '1.0.0')]).kept;
    expect(command?.line).toBe(3);
    expect(note).toBe('the command before it in this channel is at ck 10');
  });

  test('also between pseudo-channels, which share a log line of time; not between channels', () => {
    expect(broken(pkg, [cmd(10, 'ACT'), cmd(5, 'ACT', '0.0.0', { pc: 1 })])).toEqual({ 'time order': 1 });
    expect(broken(pkg, [cmd(10, 'ACT'), cmd(5, 'ACT', '0.0.0', { channel: 1 })])).toEqual({});
    expect(broken(pkg, [cmd(10, 'ACT'), cmd(10, 'RD', '0.0.0', { channel: 1 })])).toEqual({ 'no open row': 1 });
  });

  test('what the late command does still counts', () => {
    expect(broken(pkg, [cmd(10, 'ACT'), cmd(9, 'ACT', '0.1.0'), cmd(30, 'RD', '0.1.0')])).toEqual({ 'time order': 1 });
  });
});

test('channels may be mixed in any way: all interleavings of two logs find what the logs alone find', () => {
  const a = [cmd(0, 'ACT'), cmd(7, 'RD'), cmd(30, 'PRE'), cmd(38, 'ACT')]; // tRCDRD 8, tRP 9
  const b = [cmd(0, 'ACT', '1.0.0'), cmd(2.5, 'ACT', '1.0.1'), cmd(30, 'WR', '1.0.0')].map((c) => ({
    ...c,
    channel: 1,
  })); // tRRD_L 3
  const expected = { ...broken(pkg, a), ...broken(pkg, b) };
  expect(expected).toEqual({ tRCDRD: 1, tRP: 1, tRRD_L: 1 });
  let interleavings = 0;
  const mix = (log: Command[], i: number, j: number): void => {
    if (i === a.length && j === b.length) {
      expect(broken(pkg, log)).toEqual(expected);
      interleavings++;
    }
    if (i < a.length) mix([...log, a[i]], i + 1, j);
    if (j < b.length) mix([...log, b[j]], i, j + 1);
  };
  mix([], 0, 0);
  expect(interleavings).toBe((7 * 6 * 5) / (3 * 2)); // 7 over 3
});

describe('addresses out of range', () => {
  test.each([
    ['stack 1, the device has 0 to 0', cmd(0, 'ACT', '0.0.0', { stack: 1 })],
    ['channel 2, the device has 0 to 1', cmd(0, 'ACT', '0.0.0', { channel: 2 })],
    ['pseudo_channel 2, the device has 0 to 1', cmd(0, 'ACT', '0.0.0', { pc: 2 })],
    ['sid 2, the device has 0 to 1', cmd(0, 'ACT', '2.0.0')],
    ['sid 2, the device has 0 to 1', cmd(0, 'PREA', '2')],
    ['bank_group 2, the device has 0 to 1', cmd(0, 'REFpb', '0.2.0')],
    ['bank 2, the device has 0 to 1', cmd(0, 'PRE', '0.0.2')],
    ['row 16, the device has 0 to 15', cmd(0, 'ACT', '0.0.0', { row: 16 })],
    ['no row', cmd(0, 'ACT', '0.0.0', { row: -1 })],
    ['no bank', cmd(0, 'PRE', '0.1')],
    ['no column', cmd(10, 'RD', '0.0.0', { column: -1 })],
    ['column 8, the device has 0 to 7', cmd(10, 'RD', '0.0.0', { column: 8 })],
  ])('%s', (note, command) => {
    const report = audit(pkg, [cmd(0, 'PRE', '1.1.1', { channel: 1 }), command]);
    expect(report.kept.map((v) => [v.rule, v.note])).toEqual([['address range', note]]);
  });
  test('the last of each is in range', () => {
    const last = { channel: 1, pc: 1, row: 15 };
    expect(broken(pkg, [cmd(0, 'ACT', '1.1.1', last), cmd(8, 'RD', '1.1.1', { ...last, column: 7 })])).toEqual({});
  });
});

describe('report', () => {
  test('a clean log: how many commands of each kind, over what time, against how many rules', () => {
    const clean = audit(pkg, [cmd(2, 'ACT'), cmd(10, 'RD'), cmd(20, 'RD')]);
    // two command buses, not one; refresh off, so no pace to keep
    const apart = ['command bus', 'refresh gap', 'refresh owed', 'refresh ahead'];
    expect(auditLines(clean)).toEqual([
      `3 commands from ck 2 to ck 20 (18.0 ns): none breaks any of ${RULE_NAMES.length - apart.length} rules.`,
      '1 ACT, 2 RD.',
    ]);
    expect(clean.rules.filter(({ checked }) => !checked).map(({ rule }) => rule)).toEqual([
      ...apart.slice(1),
      apart[0],
    ]);
    const other = device({ buses: { separate: false }, refresh: { mode: 'per-bank' } });
    expect(
      audit(other, [])
        .rules.filter(({ checked }) => !checked)
        .map(({ rule }) => rule),
    ).toEqual(['row bus', 'column bus']);
  });

  test('without a command', () => {
    expect(auditLines(audit(pkg, []))).toEqual(['0 commands from ck 0 to ck 0 (0 ps): none breaks any of 31 rules.']);
  });

  test('what came, what it broke, what it is counted from', () => {
    const lines = auditLines(audit(pkg, [cmd(0, 'ACT'), cmd(7, 'RD'), cmd(20, 'RD', '0.1.0'), cmd(40, 'PRE')]));
    expect(lines).toEqual([
      '2 violations of 2 rules in 4 commands from ck 0 to ck 40 (40.0 ns).',
      '1 ACT, 2 RD, 1 PRE.',
      '',
      '            1  tRCDRD         ACT to RD, same bank',
      '            1  no open row    column command to a bank without an open row',
      '',
      'line 3: ck 7 RD stack 0 channel 0.0 sid 0 bank 0.0 column 0',
      '    tRCDRD: at least 8 ck, found 7',
      '    after line 2: ck 0 ACT stack 0 channel 0.0 sid 0 bank 0.0',
      'line 4: ck 20 RD stack 0 channel 0.0 sid 0 bank 1.0 column 0',
      '    no open row: the bank is closed',
    ]);
  });

  test('keeps the first hundred in full and the first of each rule, counts all', () => {
    const log: Command[] = [];
    for (let i = 0; i < 300; i++) log.push(cmd(10 * i, 'RD')); // bank never opened
    log.push(cmd(3000, 'ACT', '0.1.0'), cmd(3001.5, 'ACT', '1.1.0'), cmd(3015, 'RD'));
    const report = audit(pkg, log);
    expect(report.violations).toBe(302);
    expect(report.rules.filter((r) => r.violations > 0).map((r) => [r.rule, r.violations])).toEqual([
      ['tRRD_S', 1],
      ['no open row', 301],
    ]);
    expect(report.kept).toHaveLength(101);
    expect(report.kept[100]).toMatchObject({ rule: 'tRRD_S', command: { line: 303 } });
    const lines = auditLines(report, 3);
    expect(lines.at(-1)).toBe('... and 299 more.');
    // of three, one is the only one of its rule, wherever it stands
    expect(lines.filter((line) => line.startsWith('line')).map((line) => Number(line.split(/[ :]+/)[1]))).toEqual([
      2, 3, 303,
    ]);
    expect(auditLines(report, 0).at(-1)).toBe('... and 302 more.');
    expect(auditLines(report, 1000).at(-1)).toBe('... and 201 more.');
  });

  test('lines fit 100 columns, however large the numbers', () => {
    const wide = device({
      organisation: { stacks: 1000, channels: 64, pseudo_channels: 2, rows: 2 ** 20, columns: 128 },
      refresh: { mode: 'per-bank' },
    });
    const checker = createAudit(wide);
    for (let i = 0; i < 40; i++)
      checker.command(2 ** 40 + i, 999, 63, 1, 1, 1, 1, 2 ** 20 - 1, 127, i % COMMANDS.length, 2 ** 40, 2 ** 40 + i);
    const lines = auditLines(checker.finish(2 ** 41), 200);
    expect(lines.length).toBeGreaterThan(200);
    expect(lines.filter((line) => line.length > 100)).toEqual([]);
  });

  test('is plain data', () => {
    const report = audit(pkg, [cmd(0, 'ACT'), cmd(7, 'RD')]);
    expect(JSON.parse(JSON.stringify(report))).toEqual(report);
    expect(report).toMatchObject({
      format: 'penstock-audit',
      version: 1,
      ok: false,
      partial: false,
      package: { name: 'test', file: 'test.yaml', hash: '' },
      commands: 2,
      start_ck: 0,
      end_ck: 7,
      span_ps: 7 * 1000,
      violations: 1,
    });
    expect(report.commands_by_name).toMatchObject({ ACT: 1, RD: 1, WR: 0 });
    expect(report.rules.map(({ rule }) => rule)).toEqual(RULE_NAMES);
  });
});
