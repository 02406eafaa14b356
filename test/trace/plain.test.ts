import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { fourDigits, fourHexDigits } from '../../src/trace/digits.js';
import { type AccessTrace, openTrace, parseShape, shapeFile, type TraceOptions } from '../../src/trace/index.js';

/** Everything a trace says when it is read in chunks of `size` bytes: its rows and facts, or its error. */
async function said(text: string, options: TraceOptions, size = 1 << 20): Promise<unknown> {
  const bytes = Buffer.from(text);
  async function* input() {
    for (let i = 0; i < bytes.length; i += size) yield bytes.subarray(i, i + size);
  }
  try {
    const trace = (await openTrace('-', { ...options, input: input() })) as AccessTrace;
    const rows: unknown[] = [];
    for await (const { count, ...columns } of trace.batches())
      for (let i = 0; i < count; i++)
        rows.push(Object.entries(columns).map(([name, values]) => [name, values === null ? null : values[i]]));
    return { rows, names: [...trace.kernelNames], rowCount: trace.facts().rows, skipped: trace.facts().skippedRows };
  } catch (error) {
    return (error as Error).message;
  }
}

const HEADER = ['op', 'address', 'bytes', 'time_ns', 'die', 'engine', 'kernel', 'tile', 'flops', 'after'];
const GEOMETRY = [
  { base: 0, capacity: 2 ** 20, engines: 4, requestBytes: 256 },
  { base: 2 ** 20, capacity: 2 ** 21, engines: 8, requestBytes: 256 },
];

/** Cells good and bad, with blanks round them now and then. */
const cell = (...good: string[]): fc.Arbitrary<string> =>
  fc
    .tuple(
      fc.oneof(
        { weight: 40, arbitrary: fc.constantFrom(...good) },
        {
          weight: 1,
          arbitrary: fc.constantFrom(
            '',
            '-1',
            '1e3',
            '1.5',
            '.5',
            '3.',
            '0x10',
            'zz',
            '99999999999999999999',
            '2147483648',
            '4294967296',
            '\u00a0',
            'é',
            '0x',
            'R W',
          ),
        },
      ),
      fc.constantFrom('', '', '', '', ' ', '\t', '  '),
      fc.constantFrom('', '', '', '', ' ', '\t'),
    )
    .map(([text, before, behind]) => before + text + behind);
const row = fc.tuple(
  cell('R', 'w', 'read', 'WRITE'),
  cell('0', '0x1F0', '1048576', '0xfffc0', '64', '007', '0XabC', '0x0000000000001234', '000001048999'),
  cell('64', '1', '256', '0064'),
  cell('5', '5.25', '6.0001', '5.50', '7', '123456', '1234567890.5', '12345678901', '123456789012345678'),
  cell('', '', '0', '1', 'east', 'west'),
  cell('', '0', '3'),
  cell('', 'load', 'store', 'a b'),
  cell('', '7', '8'),
  cell('', '0', '1e6', '12.5'),
  cell('', '0', '1', '1024'),
);
const line = fc.oneof(
  { weight: 30, arbitrary: row.map((cells) => cells.join(',')) },
  { weight: 1, arbitrary: row.map(([op, ...cells]) => [`"${op}"`, ...cells].join(',')) },
  {
    weight: 1,
    arbitrary: row.map((cells) => cells.map((cell, i) => (i === 6 ? `"a, ""b""\n${cell}"` : cell)).join(',')),
  },
  { weight: 1, arbitrary: fc.constantFrom('# a "comment"', 'R,0,64,5,,,"open', 'R,"0"x,64,5,,,,,,') },
  { weight: 1, arbitrary: fc.constantFrom('', '   ', '# a comment', ' # another', 'R,0', ',,,,,,,,,', '\r') },
);
const text = fc
  .tuple(fc.array(line, { maxLength: 12 }), fc.constantFrom('\n', '\r\n'), fc.boolean())
  .map(([lines, end, ended]) => lines.join(end) + (ended ? end : ''));

describe('four digits at once', () => {
  const word = (text: string): number => Buffer.from(text, 'latin1').readInt32LE();
  const bytes = Array.from({ length: 256 }, (_, byte) => String.fromCharCode(byte));

  it('have the value of the text, and anything else has none', () => {
    // each byte in each place, beside digits at the ends of their ranges
    for (const byte of bytes)
      for (const others of ['0000', '9999', 'aFfA', '09af'])
        for (let place = 0; place < 4; place++) {
          const text = others.slice(0, place) + byte + others.slice(place + 1);
          expect(fourDigits(word(text)), text).toBe(/^\d{4}$/.test(text) ? Number(text) : -1);
          expect(fourHexDigits(word(text)), text).toBe(/^[\da-f]{4}$/i.test(text) ? Number(`0x${text}`) : -1);
        }
    for (let n = 0; n < 10_000; n++) expect(fourDigits(word(String(n).padStart(4, '0')))).toBe(n);
    for (let n = 0; n < 65_536; n += 7) expect(fourHexDigits(word(n.toString(16).padStart(4, '0')))).toBe(n);
  });
});

describe('bytes and fast-csv', () => {
  it('read the same rows from the same text, or refuse it in the same words, however the bytes come', async () => {
    // a quote in the header sends the whole text through fast-csv
    const quoted = ['"op"', ...HEADER.slice(1)].join(',');
    await fc.assert(
      fc.asyncProperty(
        text,
        fc.constantFrom(0, 2),
        fc.integer({ min: 1, max: 200 }),
        async (body, skipBadRows, size) => {
          const options = { skipBadRows, dieNames: ['west', 'east'], geometry: GEOMETRY };
          const byBytes = await said(`${HEADER.join(',')}\n${body}`, options);
          expect(await said(`${quoted}\n${body}`, options)).toEqual(byBytes);
          expect(await said(`${HEADER.join(',')}\n${body}`, options, size)).toEqual(byBytes);
        },
      ),
      { seed: 5, numRuns: 3000 },
    );
  });

  it('read the same from a captured shape', async () => {
    const where = (part: string) => ({ file: part });
    await fc.assert(
      fc.asyncProperty(
        fc.array(fc.tuple(cell('ld', 'ST', 'pf'), cell('1f0', '0x40', '0ABC'), cell('12', '13.5', '14')), {
          maxLength: 8,
        }),
        fc.constantFrom(';', '|', '\t'),
        async (rows, delimiter) => {
          const shape = parseShape(
            {
              columns: 'op=Kind,address=Addr:hex,bytes==64,time=Stamp:cycle',
              ops: 'read=LD|PF,write=ST',
              delimiter: delimiter === '\t' ? 'tab' : delimiter,
            },
            where,
          );
          const body = rows.map((cells) => [...cells, 'more'].join(delimiter)).join('\n');
          const [plain, quoted] = ['Kind', '"Kind"'].map((kind) => [kind, 'Addr', 'Stamp', 'Rest'].join(delimiter));
          const options = { shape, cyclePs: 500 };
          const fixed = await said(`${plain}\n${body}`, options);
          expect(await said(`${quoted}\n${body}`, options)).toEqual(fixed);
          if (typeof fixed === 'string') return; // a refusal names other columns below
          // and as if the size had been a column
          const sized = parseShape(
            { columns: 'op=Kind,address=Addr:hex,bytes=Size,time=Stamp:cycle', ops: 'read=LD|PF,write=ST', delimiter },
            where,
          );
          const withSize = await said(
            `${plain}${delimiter}Size\n${rows.map((cells) => [...cells, 'more', '64'].join(delimiter)).join('\n')}`,
            { shape: sized, cyclePs: 500 },
          );
          expect(withSize).toEqual(fixed);
        },
      ),
      { seed: 6, numRuns: 500 },
    );
  });
});

describe('a captured shape', () => {
  const where = (part: string) => ({ file: `--${part}` });
  const shape = parseShape(
    { columns: 'op=Kind,address=Addr:hex,bytes=Size,time=Stamp:ms', ops: 'read=LD|load,write=ST' },
    where,
  );
  it('finds its columns by name among others, takes its words, digits and units', async () => {
    const rows = 'Rank,Stamp,Kind,Size,Addr,engine\n0,1.5,LOAD,64,1f0,2\n1,2,st,32,0xFF,3\n';
    expect(await said(rows, { shape })).toMatchObject({
      rows: [
        [
          ['op', 0],
          ['address', 0x1f0],
          ['bytes', 64],
          ['timePs', 1.5e9],
          ['die', null],
          ['engine', 2],
          ['kernel', 0],
          ['tile', null],
          ['flops', null],
          ['after', null],
        ],
        [
          ['op', 1],
          ['address', 0xff],
          ['bytes', 32],
          ['timePs', 2e9],
          ['die', null],
          ['engine', 3],
          ['kernel', 0],
          ['tile', null],
          ['flops', null],
          ['after', null],
        ],
      ],
    });
  });
  it.each([
    [
      'Stamp,Kind,Size,Adr\n',
      "-:1: found no column 'Addr' among 'Stamp', 'Kind', 'Size', 'Adr'; expected the column that is our 'address'. did you mean 'Adr'?",
    ],
    [
      'Stamp,Kind,Size,Addr,Addr\n',
      "-:1: Addr: found column 'Addr' twice; expected each column once. remove or rename one of them",
    ],
    ['Stamp,Kind,Size,Addr\n1,LDX,64,0\n', "-:2:3: Kind: found 'LDX'; expected ld, load, st. one access a row"],
    [
      'Stamp,Kind,Size,Addr\n1,LD,64,xyz\n',
      "-:2:9: Addr: found 'xyz'; expected an address: hexadecimal digits, below 2^52. for example 4096 or 0x1000",
    ],
    [
      'Stamp,Kind,Size,Addr\n1,LD,0,0\n',
      "-:2:6: Size: found '0'; expected the bytes of one access: a whole number from 1 to 2147483648. the least is 1",
    ],
  ])('%j is refused', async (rows, message) => {
    expect(await said(rows, { shape })).toBe(message);
  });
  it.each([
    [
      { columns: 'addres=A' },
      "--columns: found 'addres'; expected a column of an access trace: op, address, bytes, time, die, engine, kernel, tile, flops, after. did you mean 'address'?",
    ],
    [{ columns: 'address' }, "--columns: found 'address'; expected column=name, for example address=Addr"],
    [{ columns: 'op=A,op=B' }, "--columns: found 'op' twice; expected each column once"],
    [
      { columns: 'time=T' },
      "--columns: found 'time=T'; expected a time with its unit: time=T:ps, time=T:ns, time=T:us, time=T:ms, time=T:s, time=T:cycle",
    ],
    [{ columns: 'time=T:min' }, "--columns: found 'min'; expected a unit of 'time': ps, ns, us, ms, s, cycle"],
    [{ ops: 'read=' }, "--ops: found 'read='; expected read=word|word or write=word|word"],
    [{ ops: 'read=a,write=a' }, "--ops: found 'a' twice; expected each word once"],
    [{ delimiter: 'ab' }, "--delimiter: found 'ab'; expected one character between cells, for example ; or | or tab"],
    [{ delimiter: ' ' }, "--delimiter: found ' '; expected one character between cells, for example ; or | or tab"],
  ])('%j is no shape', (given, message) => {
    expect(() => parseShape(given, where)).toThrow(message);
  });
  it('may be kept in a file, which says where it is wrong', () => {
    const kept = shapeFile(
      'columns: { address: Addr:hex, bytes: =64 }\nops: { read: [LD, load], write: ST }\ndelimiter: ;\nclock: 1.7 GHz\n',
      's.yaml',
    );
    expect(kept).toMatchObject({
      text: { columns: 'address=Addr:hex,bytes==64', ops: 'read=LD|load,write=ST', delimiter: ';' },
      clock: '1.7 GHz',
    });
    expect(() => shapeFile('columns: a\ncolums: b\n', 's.yaml')).toThrow(
      "s.yaml:2:1: colums: found unknown key 'colums'; expected 'columns'",
    );
    expect(() => shapeFile('delimiter: [a]\n', 's.yaml')).toThrow('s.yaml:1:12: delimiter: found ["a"]; expected text');
    expect(kept.where('ops')).toMatchObject({ file: 's.yaml', line: 2 });
  });
});
