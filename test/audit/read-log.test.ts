import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { COMMANDS, createLogReader } from '../../src/audit/index.js';
import { InputError } from '../../src/errors.js';
import { device } from './build.js';

const pkg = device();
const HEADER = 'ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,request';
const bytes = (text: string): Uint8Array => new TextEncoder().encode(text);

/** Reads `text` in pieces cut at `cuts`. */
function read(text: string, cuts: readonly number[] = [], of = pkg): number[][] {
  const rows: number[][] = [];
  const reader = createLogReader('log.csv', of, (...row) => rows.push(row));
  const all = bytes(text);
  const edges = [0, ...[...cuts].sort((a, b) => a - b), all.length];
  for (let i = 1; i < edges.length; i++) {
    const piece = all.slice(edges[i - 1], edges[i]);
    reader.push(piece);
    piece.fill(0x58); // the reader must not keep the caller's bytes
  }
  expect(reader.end()).toBe(rows.length);
  return rows;
}

const [ACT, RD, PREA, REFab] = ['ACT', 'RD', 'PREA', 'REFab'].map((name) =>
  (COMMANDS as readonly string[]).indexOf(name),
);

const LOG = `${HEADER}
0,0,1,1,1,0,1,15,,ACT,12
8,0,1,1,1,0,1,15,7,RD,12
30.5,0,1,1,,,,,,PREA,
40,0,1,1,,,,,,REFab,
`;
const ROWS = [
  [0, 0, 1, 1, 1, 0, 1, 15, -1, ACT, 12, 2],
  [16, 0, 1, 1, 1, 0, 1, 15, 7, RD, 12, 3],
  [61, 0, 1, 1, -1, -1, -1, -1, -1, PREA, -1, 4],
  [80, 0, 1, 1, -1, -1, -1, -1, -1, REFab, -1, 5],
];

describe('reads', () => {
  test('every column, half clocks, unused fields', () => expect(read(LOG)).toEqual(ROWS));
  test('carriage returns, a byte order mark, no last newline', () => {
    expect(read(`\u{feff}${LOG.replaceAll('\n', '\r\n')}`)).toEqual(ROWS);
    expect(read(LOG.trimEnd())).toEqual(ROWS);
  });
  test('comments and empty lines, which count as lines', () => {
    const lines = read(`# made by hand\n${HEADER}\n\n0,0,0,0,,,,,,PREA,\n# later\r\n\r\n9.0,0,0,0,,,,,,PREA,\n`);
    expect(lines.map((row) => [row[0], row[11]])).toEqual([
      [0, 4],
      [18, 7],
    ]);
  });
  test('columns in any order, and others left out', () => {
    const text =
      'note,command,ck,request,row,column,stack,channel,pseudo_channel,bank,bank_group,sid\n"x",RD,8,12,15,7,0,1,1,1,0,1\n';
    expect(read(text)).toEqual([[...ROWS[1].slice(0, 11), 2]]);
  });
  test('all commands', () => {
    const rows = read(`${HEADER}\n${COMMANDS.map((name, i) => `${i},0,0,0,0,0,0,0,0,${name},\n`).join('')}`);
    expect(rows.map((row) => row[9])).toEqual(COMMANDS.map((_, i) => i));
  });
  test('the only one of a kind need not be named', () => {
    const one = device({
      organisation: { channels: 1, pseudo_channels: 1, sids: 1, bank_groups: 1, banks_per_group: 1 },
    });
    expect(read(`${HEADER}\n0,,,,,,,3,,ACT,\n`, [], one)).toEqual([[0, 0, 0, 0, 0, 0, 0, 3, -1, ACT, -1, 2]]);
  });
  test('the same wherever the bytes are cut', () => {
    const text = LOG.replaceAll('\n', '\r\n');
    for (let cut = 0; cut <= text.length; cut++) expect(read(text, [cut])).toEqual(ROWS);
    expect(
      read(
        text,
        [...text].map((_, i) => i),
      ),
    ).toEqual(ROWS);
    fc.assert(
      fc.property(fc.array(fc.nat({ max: text.length }), { maxLength: 12 }), (cuts) => {
        expect(read(text, cuts)).toEqual(ROWS);
      }),
    );
  });
});

const row = (change: Readonly<Record<string, string>>): string => {
  const cells: Record<string, string> = {
    ck: '5',
    stack: '0',
    channel: '0',
    pseudo_channel: '0',
    sid: '0',
    bank_group: '0',
    bank: '0',
    row: '1',
    column: '2',
    command: 'RD',
    request: '3',
  };
  return HEADER.split(',')
    .map((name) => change[name] ?? cells[name])
    .join(',');
};

function failure(text: string, cuts: readonly number[] = [], of = pkg): string {
  try {
    read(text, cuts, of);
  } catch (error) {
    if (error instanceof InputError) return error.message;
    throw error;
  }
  return 'read without complaint';
}

describe('refuses, with file, line and cell', () => {
  test.each([
    [
      'unknown command',
      { command: 'RDX' },
      "log.csv:2:19: command: found 'RDX'; expected one of ACT, RD, RDA, WR, WRA, PRE, PREA, REFab, REFpb, RFMab, RFMpb. did you mean RD?",
    ],
    ['command in small letters', { command: 'act' }, 'did you mean ACT?'],
    ['no command', { command: '' }, "command: found ''"],
    ['stack', { stack: '1' }, 'log.csv:2: stack: found 1; expected 0: the package has one'],
    ['channel', { channel: '2' }, 'log.csv:2: channel: found 2; expected 0 to 1: the package has 2'],
    ['pseudo-channel', { pseudo_channel: '2' }, 'pseudo_channel: found 2'],
    ['no stack ID', { sid: '' }, 'log.csv:2: sid: found nothing; expected a value: RD needs it'],
    ['no bank group', { bank_group: '' }, 'bank_group: found nothing'],
    ['no bank', { bank: '' }, 'bank: found nothing'],
    ['no column', { column: '' }, 'column: found nothing'],
    ['no row', { row: '', command: 'ACT' }, 'row: found nothing; expected a value: ACT needs it'],
    ['no time', { ck: '' }, 'ck: found nothing'],
    ['no channel', { channel: '' }, 'channel: found nothing'],
    [
      'quarter clocks',
      { ck: '5.25' },
      "log.csv:2:1: ck: found '5.25'; expected clocks from 0 to 2^51, whole or ending in .5",
    ],
    ['half and a bit', { ck: '5.51' }, "ck: found '5.51'"],
    ['bare point', { ck: '5.' }, "ck: found '5.'"],
    ['point first', { ck: '.5' }, "ck: found '.5'"],
    ['negative time', { ck: '-5' }, "ck: found '-5'"],
    ['exponent', { ck: '1e3' }, "ck: found '1e3'"],
    ['time beyond all measure', { ck: '9007199254740993' }, "ck: found '9007199254740993'"],
    [
      'words',
      { bank: 'two' },
      "log.csv:2:13: bank: found 'two'; expected a whole number from 0, or nothing where unused",
    ],
    ['half a row', { row: '1.5' }, "row: found '1.5'"],
    ['number and more', { column: '2x' }, "column: found '2x'"],
    ['a request too long', { request: '99999999999999999999' }, "request: found '99999999999999999999'"],
    ['a request in words', { request: 'a' }, "log.csv:2:22: request: found 'a'"],
    ['NUL bytes', { row: '\0\0' }, "row: found '\\u0000\\u0000'"],
    ['quotes', { row: '"1"' }, 'row: found \'\\"1\\"\''],
  ])('%s', (_, change, message) => {
    expect(failure(`${HEADER}\n${row(change)}\n`)).toContain(message);
  });

  test('short and long rows', () => {
    expect(failure(`${HEADER}\n${row({})}\n5,0,0\n`)).toBe(
      'log.csv:3: found a row of 3 cells; expected 11, as in the header',
    );
    expect(failure(`${HEADER}\n${row({})},9\n`)).toBe(
      'log.csv:2: found a row of 12 cells; expected 11, as in the header',
    );
    expect(failure(`${HEADER}\n5\n`)).toBe('log.csv:2: found a row of 1 cell; expected 11, as in the header');
    expect(failure(LOG.slice(0, -8))).toBe('log.csv:5: found a row of 9 cells; expected 11, as in the header');
  });

  test('a REFab without its stack ID where it closes one', () => {
    const perSid = device({ refresh: { scope: 'sid' } });
    expect(failure(LOG, [], perSid)).toBe('log.csv:5: sid: found nothing; expected a value: REFab needs it');
  });

  test('logs without commands', () => {
    for (const text of ['', '\n\n', '# nothing\n']) expect(failure(text)).toMatch(/^log.csv: found an empty file/);
    expect(failure(`${HEADER}\n`)).toMatch(/^log.csv: found a header and no command/);
    expect(failure(HEADER)).toMatch(/^log.csv: found a header and no command/);
  });

  test('headers', () => {
    expect(failure(`${HEADER.replace('bank_group', 'bankgroup')}\n${row({})}\n`)).toContain(
      "log.csv:1: bank_group: found no such column in the header, but 'bankgroup'; expected ck,stack,",
    );
    expect(failure(`op,address,bytes\nR,0,64\n`)).toContain(
      'log.csv:1: ck: found no such column in the header; expected',
    );
    expect(failure(`${HEADER},row\n${row({})},1\n`)).toBe('log.csv:1: row: found the column twice; expected it once');
    expect(failure('\x1f\x8b\x08\0\0\n')).toContain('log.csv:1: ck: found no such column in the header');
  });

  test('lines without end, in one piece or many, before they fill the memory', () => {
    const long = 'x'.repeat(70_000);
    const message = (line: number) =>
      `log.csv:${line}: found a line of more than 65536 bytes; expected a row of a command log`;
    expect(failure(long)).toBe(message(1));
    expect(failure(`${long}\n`)).toBe(message(1));
    expect(failure(`${LOG}${long}`)).toBe(message(6));
    expect(
      failure(
        `${LOG}${long}`,
        Array.from({ length: 60 }, (_, i) => 1000 * (i + 1)),
      ),
    ).toBe(message(6));
  });

  test('the line is right after cuts', () => {
    const text = `${LOG}${row({ bank: 'x' })}\n`;
    for (let cut = 0; cut <= text.length; cut++) expect(failure(text, [cut])).toMatch(/^log.csv:6:13: bank: found 'x'/);
  });
});
