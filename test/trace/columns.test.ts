import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Float64, Table, tableFromArrays, tableToIPC, Utf8, vectorFromArray } from 'apache-arrow';
import fc from 'fast-check';
import { parquetWriteBuffer } from 'hyparquet-writer';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import {
  type AccessTrace,
  accessCsv,
  arrowBytes,
  openTrace,
  parquetBytes,
  parseShape,
  type TraceOptions,
} from '../../src/trace/index.js';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'penstock-columns-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

async function bytesOf(pieces: AsyncIterable<Uint8Array | string>): Promise<Buffer> {
  const all: Buffer[] = [];
  for await (const piece of pieces) all.push(Buffer.from(piece as Uint8Array));
  return Buffer.concat(all);
}

async function fromText(text: string, options: TraceOptions = {}): Promise<AccessTrace> {
  async function* input() {
    yield Buffer.from(text);
  }
  return (await openTrace('-', { ...options, input: input() })) as AccessTrace;
}

/** What a trace file says, as CSV. */
async function asCsv(file: string, options: TraceOptions = {}): Promise<string> {
  const trace = (await openTrace(file, options)) as AccessTrace;
  return (await bytesOf(accessCsv(trace.batches(), trace.kernelNames))).toString();
}

const row = fc.tuple(
  fc.constantFrom('R', 'W'),
  fc.maxSafeNat().map((n) => n % 2 ** 51),
  fc.integer({ min: 1, max: 2 ** 31 }),
  fc.constantFrom('', '0', '3'),
  fc.constantFrom('', '7', '1000'),
  fc.constantFrom('gemm', 'a b', 'é', ''),
  fc.constantFrom('', '2147483647', '5'),
  fc.double({ min: 0, max: 1e18, noNaN: true }),
  fc.integer({ min: 0, max: 1024 }),
);

describe('Parquet and Arrow', () => {
  it('give back what was written, as CSV does', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(row, { minLength: 1, maxLength: 40 }), async (rows) => {
        const text = `op,address,bytes,die,engine,kernel,tile,flops,after,time_ps\n${rows
          .map((cells, i) => [...cells, 12345 * i].join(','))
          .join('\n')}\n`;
        const plain = await fromText(text);
        const csv = (await bytesOf(accessCsv(plain.batches(), plain.kernelNames))).toString();
        for (const [name, write] of [
          ['t.parquet', parquetBytes],
          ['t.arrow', arrowBytes],
        ] as const) {
          const trace = await fromText(text);
          const file = join(folder, name);
          writeFileSync(file, await bytesOf(write(trace.batches(), trace.kernelNames)));
          expect((await asCsv(file)).replaceAll(',-1', ',')).toBe(csv.replaceAll(',-1', ','));
        }
      }),
      { seed: 4, numRuns: 60 },
    );
  });

  it('hold many groups, and cost memory for one at a time', async () => {
    async function* input() {
      yield Buffer.from('op,address,bytes\n');
      for (let block = 0; block < 300; block++) {
        let text = '';
        for (let i = 0; i < 4000; i++) text += `R,${(block * 4000 + i) * 64},64\n`;
        yield Buffer.from(text);
      }
    }
    for (const [name, write] of [
      ['many.parquet', parquetBytes],
      ['many.arrow', arrowBytes],
    ] as const) {
      const trace = (await openTrace('-', { input: input() })) as AccessTrace;
      const file = join(folder, name);
      writeFileSync(file, await bytesOf(write(trace.batches(), null)));
      const back = (await openTrace(file)) as AccessTrace;
      let rows = 0;
      let wrong = 0;
      for await (const { count, address, bytes } of back.batches())
        for (let i = 0; i < count; i++) if (address[i] !== 64 * rows++ || bytes[i] !== 64) wrong++;
      expect({ rows, wrong, facts: back.facts().rows }).toEqual({ rows: 1_200_000, wrong: 0, facts: 1_200_000 });
      expect(back.facts().hash).toMatch(/^[0-9a-f]{64}$/);
    }
  }, 60_000);

  it('take columns of other types, names and words', async () => {
    const shape = parseShape(
      { columns: 'op=Kind,address=Addr:hex,bytes==64,time=T:us', ops: 'read=LD,write=ST' },
      (file) => ({ file }),
    );
    const expected = 'op,address,bytes,time_ps,kernel\nR,0x1f0,64,1500000,trace\nW,0xff,64,2000000,trace\n';
    const arrow = join(folder, 'other.arrow');
    const table = new Table({
      T: vectorFromArray([1.5, 2], new Float64()),
      Kind: vectorFromArray(['LD', 'st'], new Utf8()),
      Addr: vectorFromArray(['1f0', '0xFF'], new Utf8()),
    });
    writeFileSync(arrow, tableToIPC(table, 'file'));
    expect(await asCsv(arrow, { shape })).toBe(expected);
    const parquet = join(folder, 'other.parquet');
    const columnData = [
      { name: 'Kind', data: ['LD', 'st'] },
      { name: 'Addr', data: ['1f0', '0xFF'] },
      { name: 'T', data: [1.5, 2] },
    ];
    writeFileSync(parquet, Buffer.from(parquetWriteBuffer({ columnData })));
    expect(await asCsv(parquet, { shape })).toBe(expected);
  });

  it('take a column with nothing in some rows', async () => {
    const file = join(folder, 'holes.parquet');
    const columnData = [
      { name: 'op', data: ['R', 'W'] },
      { name: 'address', data: [0n, 64n] },
      { name: 'bytes', data: [64, 32] },
      { name: 'engine', data: [null, 3], type: 'INT32' as const },
    ];
    writeFileSync(file, Buffer.from(parquetWriteBuffer({ columnData })));
    expect(await asCsv(file)).toBe('op,address,bytes,engine,kernel\nR,0x0,64,,trace\nW,0x40,32,3,trace\n');
  });
});

describe('what is refused', () => {
  const refused = async (name: string, content: Uint8Array, options: TraceOptions = {}): Promise<string> => {
    writeFileSync(join(folder, name), content);
    try {
      await asCsv(join(folder, name), options);
    } catch (error) {
      expect((error as Error).name).toBe('InputError');
      return (error as Error).message.replace(`${folder}/`, '');
    }
    return 'accepted';
  };
  const columns = (change: Record<string, unknown[]>): Buffer =>
    Buffer.from(
      parquetWriteBuffer({
        columnData: Object.entries({ op: ['R', 'W'], address: [0n, 64n], bytes: [64, 32], ...change }).map(
          ([name, data]) => ({ name, data: data as number[] }),
        ),
      }),
    );

  it.each([
    [
      { bytes: [64, 0] },
      "b.parquet:2: bytes: found '0'; expected the bytes of one access: a whole number from 1 to 2147483648",
    ],
    [{ bytes: [64, -5] }, "b.parquet:2: bytes: found '-5'"],
    [{ bytes: [1.5, 2] }, "b.parquet:1: bytes: found '1.5'"],
    [{ address: [0n, 2n ** 52n] }, "b.parquet:2: address: found '4503599627370496'; expected an address"],
    [{ address: [0n, -1n] }, "b.parquet:2: address: found '-1'"],
    [{ op: ['R', 'X'] }, "b.parquet:2: op: found 'X'; expected R, W, read or write"],
    [{ time_ps: [5, 4] }, "b.parquet:2: time_ps: found '4': time goes backwards by 1 ps"],
    [{ after: [0, 1025] }, "b.parquet:2: after: found '1025'"],
    [{ oops: [1, 2] }, "b.parquet:1: oops: found unknown column 'oops'"],
  ])('case %#', async (change, message) => {
    expect(await refused('b.parquet', columns(change))).toContain(message);
  });

  it('but bad rows may be skipped', async () => {
    writeFileSync(join(folder, 's.parquet'), columns({ bytes: [0, 32] }));
    expect(await asCsv(join(folder, 's.parquet'), { skipBadRows: 1 })).toBe(
      'op,address,bytes,kernel\nW,0x40,32,trace\n',
    );
  });

  it('files that are none, or cut short', async () => {
    const whole = columns({});
    for (const [name, content] of [
      ['c.parquet', whole.subarray(0, whole.length - 20)],
      ['c.parquet', Buffer.from('op,address,bytes\nR,0,64\n')],
      ['c.parquet', Buffer.alloc(0)],
    ] as const)
      expect(await refused(name, content)).toMatch(/^c\.parquet: found a file that is no Parquet, or a damaged one/);
    const table = Buffer.from(tableToIPC(tableFromArrays({ op: ['R'], address: [0], bytes: [64] }), 'file'));
    for (const content of [
      table.subarray(0, table.length - 40),
      Buffer.from('op,address,bytes\nR,0,64\n'),
      Buffer.alloc(0),
    ])
      expect(await refused('c.arrow', content)).toMatch(
        /^c\.arrow: found a file that is no Arrow IPC, or a damaged one/,
      );
    expect(await refused('d.csv', readFileSync(join(folder, 's.parquet')))).toMatch(/^d\.csv:\d+/);
  });
});
