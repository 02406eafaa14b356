import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import {
  type AccessBatch,
  type AccessTrace,
  accessCsv,
  type KernelTrace,
  openTrace,
  READ,
  synthesise,
  type TraceOptions,
  WRITE,
} from '../../src/trace/index.js';
import { die } from './build.js';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'penstock-trace-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

/** Opens text as standard input, cut into chunks of `size` bytes. */
async function open(text: string | Buffer, options: TraceOptions = {}, size = 65536) {
  const bytes = Buffer.from(text);
  async function* input() {
    for (let i = 0; i < bytes.length; i += size) yield bytes.subarray(i, i + size);
  }
  return openTrace('-', { ...options, input: input() });
}

type Row = Record<Exclude<keyof AccessBatch, 'count'>, number | null>;

/** All rows of an access trace as objects; absent columns are null. */
async function rowsOf(trace: AccessTrace) {
  const rows: Row[] = [];
  for await (const { count, ...columns } of trace.batches()) {
    for (let i = 0; i < count; i++) {
      const cells = Object.entries(columns).map(([name, values]) => [name, values && Number(values[i])]);
      rows.push(Object.fromEntries(cells) as Row);
    }
  }
  return rows;
}
const access = async (text: string | Buffer, options?: TraceOptions, size?: number) =>
  (await open(text, options, size)) as AccessTrace;

describe('access traces', () => {
  it('read every column, in any order, with names and numbers for dies', async () => {
    const trace = await access(
      'bytes,op,kernel,address,time_ns,die,engine,tile,flops,after\n' +
        '64,R,load,0x1000,0,east,3,7,1e6,0\n' +
        '32,write,"store, last",8192,1.5,0,,,,1\n' +
        '1,READ,load,0,1.5,,,,,\n',
      { dieNames: ['west', 'east'] },
    );
    expect(trace.kind).toBe('access');
    expect(trace.hasTime).toBe(true);
    const common = { bytes: 64, kernel: 0 };
    expect(await rowsOf(trace)).toEqual([
      { ...common, op: READ, address: 4096, timePs: 0, die: 1, engine: 3, tile: 7, flops: 1e6, after: 0 },
      {
        op: WRITE,
        bytes: 32,
        kernel: 1,
        address: 8192,
        timePs: 1500,
        die: 0,
        engine: -1,
        tile: -1,
        flops: 0,
        after: 1,
      },
      { op: READ, bytes: 1, kernel: 0, address: 0, timePs: 1500, die: -1, engine: -1, tile: -1, flops: 0, after: 0 },
    ]);
    expect(trace.kernelNames).toEqual(['load', 'store, last']);
    expect(trace.facts()).toMatchObject({ rows: 3, skippedRows: 0 });
  });

  it('leave out the columns the file has not', async () => {
    const [row] = await rowsOf(await access('op,address,bytes\nR,0xFfF,2147483648\n'));
    expect(row).toMatchObject({ address: 4095, bytes: 2 ** 31, timePs: null, die: null, engine: null, tile: null });
    expect(row).toMatchObject({ flops: null, after: null });
  });

  it.each([
    ['time_ps', '7', 7],
    ['time_ns', '0.0015', 2],
    ['time_us', '2.5', 2500000],
    ['cycle', '3', 1875], // 3 x 625 ps
  ])('take %s %s for %i ps', async (column, cell, timePs) => {
    const [row] = await rowsOf(await access(`op,address,bytes,${column}\nR,0,1,${cell}\n`, { cyclePs: 625 }));
    expect(row.timePs).toBe(timePs);
  });

  it.each([
    ['CRLF line ends', 'op,address,bytes\r\nR,1,2\r\n\r\nW,3,4\r\n'],
    ['a byte order mark', '\uFEFFop,address,bytes\nR,1,2\nW,3,4\n'],
    ['no last line end', 'op,address,bytes\nR,1,2\nW,3,4'],
    ['comments and blank lines', '# made by hand\n\nop,address,bytes\n  # more\nR,1,2\n   \n#\nW,3,4\n\n'],
    ['blanks round the cells', ' op , address,bytes \n R ,1 ,2\nW, 3,\t4\n'],
    ['quoted cells', '"op","address","bytes"\n"R",1,"2"\nW,"3" , "4"\n'],
  ])('do not mind %s', async (_, text) => {
    for (const size of [65536, 1, 2, 3, 7]) {
      const rows = await rowsOf(await access(text, {}, size));
      expect(rows.map(({ op, address, bytes }) => [op, address, bytes])).toEqual([
        [READ, 1, 2],
        [WRITE, 3, 4],
      ]);
    }
  });

  it('are refused at the right line after comments, blank lines and quoted newlines, however the bytes come', async () => {
    const text =
      '# one\r\n\r\nop,address,bytes,kernel\r\n# four\r\nR,0,1,"a\nb"\n\nR,0,1,"say ""so"""\n#\n#\nR,zero,1,"late, and\nlong"\nR,0,1,x\n';
    for (const size of [65536, 1, 2, 5]) {
      const reading = async () => rowsOf(await access(text, {}, size));
      await expect(reading()).rejects.toMatchObject({ where: { line: 11, path: 'address' }, found: "'zero'" });
    }
    const rows = await access(text, { skipBadRows: 1 });
    expect(await rowsOf(rows)).toHaveLength(3);
    expect(rows.kernelNames).toEqual(['a\nb', 'say "so"', 'x']);
  });

  it('name the column on the line where a bad cell begins', async () => {
    const reading = async (text: string) => rowsOf(await access(text));
    await expect(reading('op,address,bytes\nR,0x10,-4\n')).rejects.toMatchObject({ where: { line: 2, column: 8 } });
  });

  it('skip as many bad rows as allowed and count them', async () => {
    const text = 'op,address,bytes\nR,0,1\nX,0,1\nR,0\nR,0,1,2\nR,"0"0,1\nR,64,1\n';
    const trace = await access(text, { skipBadRows: 4 });
    expect((await rowsOf(trace)).map((row) => row.address)).toEqual([0, 64]);
    expect(trace.facts()).toMatchObject({ rows: 2, skippedRows: 4 });
    // the fourth is one too many
    const reading = async () => rowsOf(await access(text, { skipBadRows: 3 }));
    await expect(reading()).rejects.toMatchObject({ where: { line: 6 }, hint: expect.stringContaining('3 bad rows') });
  });

  it('leave no trace of a bad row in the rows round it', async () => {
    const text = 'op,address,bytes,time_ps,kernel\nR,0,1,5,a\nR,0,0,9,b\nR,64,1,6,c\n';
    const trace = await access(text, { skipBadRows: 1 });
    expect((await rowsOf(trace)).map((row) => row.timePs)).toEqual([5, 6]);
    expect(trace.kernelNames).toEqual(['a', 'c']);
  });

  it('come in batches that are used again, and once', async () => {
    const lines = Array.from({ length: 10000 }, (_, i) => `R,${i * 64},64`);
    const trace = await access(`op,address,bytes\n${lines.join('\n')}\n`);
    const counts: number[] = [];
    const seen = new Set<object>();
    let last = -1;
    for await (const batch of trace.batches()) {
      counts.push(batch.count);
      seen.add(batch);
      for (let i = 0; i < batch.count; i++) {
        if (batch.address[i] !== last + (last < 0 ? 1 : 64)) throw new Error(`row out of order at ${batch.address[i]}`);
        last = batch.address[i];
      }
    }
    expect(counts).toEqual([4096, 4096, 10000 - 2 * 4096]);
    expect(seen.size).toBe(1);
    expect(last).toBe(9999 * 64);
    await expect(rowsOf(trace)).rejects.toThrow(/open it again/);
  });

  it('may be left before their end', async () => {
    const file = join(folder, 'long.csv');
    writeFileSync(file, `op,address,bytes\n${'R,0,64\n'.repeat(100000)}`);
    const trace = (await openTrace(file)) as AccessTrace;
    for await (const batch of trace.batches()) {
      expect(batch.count).toBe(4096);
      break;
    }
    expect(trace.facts()).toEqual({ rows: 4096, skippedRows: 0, hash: '' });
  });

  it('are hashed as they are stored, plain or gzip, by file or by standard input', async () => {
    const text = `op,address,bytes\n${'R,0x40,64\n'.repeat(20000)}`;
    const plain = join(folder, 'a.csv');
    const zipped = join(folder, 'a.csv.gz');
    writeFileSync(plain, text);
    writeFileSync(zipped, gzipSync(text));
    for (const [file, bytes] of [
      [plain, Buffer.from(text)],
      [zipped, gzipSync(text)],
    ] as const) {
      const expected = { rows: 20000, skippedRows: 0, hash: createHash('sha256').update(bytes).digest('hex') };
      for (const trace of [(await openTrace(file)) as AccessTrace, await access(bytes)]) {
        expect(await rowsOf(trace)).toHaveLength(20000);
        expect(trace.facts()).toEqual(expected);
      }
    }
  });

  it('agree with a plain split on random cells of every shape fast-csv can meet', async () => {
    const cell = fc.string({ unit: fc.constantFrom('a', '"', ',', '\n', ' ', '#', '\t'), maxLength: 6 });
    const quote = (text: string) => `"${text.replaceAll('"', '""')}"`;
    await fc.assert(
      fc.asyncProperty(
        fc.array(cell, { minLength: 1, maxLength: 8 }),
        fc.integer({ min: 1, max: 30 }),
        async (names, size) => {
          const text = `op,kernel,address,bytes\n${names.map((name) => `R,${quote(name)},0,1\n`).join('')}`;
          const trace = await access(text, {}, size);
          const rows = await rowsOf(trace);
          const got = rows.map((row) => trace.kernelNames[row.kernel as number]);
          expect(got).toEqual(names.map((name) => name.trim() || '(unnamed)'));
        },
      ),
      { numRuns: 200, seed: 11 },
    );
  });

  it('take any unquoted cell as it is', async () => {
    const cell = fc.string({ unit: fc.constantFrom('a', ' ', '#', '\t', 'é', "'"), maxLength: 6 });
    await fc.assert(
      fc.asyncProperty(fc.array(cell, { minLength: 1, maxLength: 8 }), async (names) => {
        const trace = await access(`kernel,op,address,bytes,tile\n${names.map((n) => `x${n}"${n},R,0,1,\n`).join('')}`);
        const rows = await rowsOf(trace);
        expect(rows.map((row) => trace.kernelNames[row.kernel as number])).toEqual(
          names.map((n) => `x${n}"${n}`.trim()),
        );
      }),
      { numRuns: 100, seed: 12 },
    );
  });

  it('know the die that owns an address, for the engines it has', async () => {
    const geometry = [die({ capacity: 1000, engines: 2 }), die({ base: 1000, capacity: 1000, engines: 8 })];
    const text = (engine: number, address: number) => `op,address,bytes,engine\nR,${address},1,${engine}\n`;
    expect(await rowsOf(await access(text(7, 1000), { geometry }))).toHaveLength(1);
    await expect(access(text(7, 999), { geometry })).rejects.toMatchObject({ found: "'7'", where: { path: 'engine' } });
  });
});

describe('synthetic traces', () => {
  it.each([
    ['sequential', 1],
    ['strided stride=4KiB', 0.5],
    ['zipf s=1.1 granule=256B span=1MiB', 0],
    ['chase granule=64B span=1MiB', 1],
  ])('of %s with %f reads come back as they were written', async (pattern, readFraction) => {
    const options = {
      bytes: 700000,
      readFraction,
      seed: '5',
      requestBytes: 256,
      base: 4096,
      arrivals: { kind: 'poisson', gapPs: 1234.5 } as const,
    };
    const made: Pick<Row, 'op' | 'address' | 'bytes' | 'timePs' | 'engine' | 'after'>[] = [];
    for (const { count, op, address, bytes, timePs, engine, after } of synthesise(pattern, options)) {
      for (let i = 0; i < count; i++) {
        const dependency = { engine: engine?.[i] ?? null, after: after?.[i] ?? null };
        made.push({ op: op[i], address: address[i], bytes: bytes[i], timePs: timePs?.[i] ?? null, ...dependency });
      }
    }
    let text = '';
    for await (const piece of accessCsv(synthesise(pattern, options), null)) text += piece;
    const trace = await access(text);
    const read = await rowsOf(trace);
    expect(
      read.map(({ op, address, bytes, timePs, engine, after }) => ({ op, address, bytes, timePs, engine, after })),
    ).toEqual(made);
    expect(made.length).toBeGreaterThan(1000);
    const reads = made.filter((row) => row.op === READ).length / made.length;
    expect(Math.abs(reads - readFraction)).toBeLessThanOrEqual(
      4 * Math.sqrt((readFraction * (1 - readFraction)) / made.length),
    );
    // mean of n exponential gaps of mean m: deviation m / sqrt(n)
    const mean = (made.at(-1)?.timePs ?? 0) / (made.length - 1);
    expect(Math.abs(mean - 1234.5)).toBeLessThan((4 * 1234.5) / Math.sqrt(made.length));
  });

  it('of a chase are one chain on one engine', () => {
    const [batch] = synthesise('chase', { bytes: 640, readFraction: 1, seed: '1', requestBytes: 256, base: 0 });
    expect([...(batch.after ?? [])].slice(0, 10)).toEqual([0, 1, 1, 1, 1, 1, 1, 1, 1, 1]);
    expect([...(batch.engine ?? [])].slice(0, 10)).toEqual(new Array(10).fill(0));
  });

  it('are the same for the same seed, add up, and arrive on the beat', () => {
    const all = (seed: string) => {
      const rows: number[][] = [];
      const options = {
        bytes: 100000,
        readFraction: 0.5,
        seed,
        requestBytes: 256,
        base: 0,
        arrivals: { kind: 'fixed', gapPs: 250 } as const,
      };
      for (const { count, op, address, timePs } of synthesise('uniform granule=50B', options)) {
        for (let i = 0; i < count; i++) rows.push([op[i], address[i], timePs?.[i] ?? -1]);
      }
      return rows;
    };
    expect(all('a')).toEqual(all('a'));
    expect(all('a')).not.toEqual(all('b'));
    expect(all('a')).toHaveLength(2000);
    expect(all('a').map((row) => row[2])).toEqual(Array.from({ length: 2000 }, (_, i) => i * 250));
  });

  it('keep the names of kernels, whatever is in them', async () => {
    const source = await access('op,address,bytes,kernel\nR,0,1,"a, ""b"""\nW,1,1,c\n');
    let text = '';
    for await (const piece of accessCsv(source.batches(), source.kernelNames)) text += piece;
    expect(text).toBe('op,address,bytes,kernel\nR,0x0,1,"a, ""b"""\nW,0x1,1,c\n');
  });
});

describe('kernel traces', () => {
  const HEADER = 'kernel,stream,format,flops,read,write,read_pattern,write_pattern';
  const kernels = async (rows: string, header = HEADER, options?: TraceOptions) =>
    (await open(`${header}\n${rows}\n`, options)) as KernelTrace;

  it('read sizes with units, patterns and every optional column', async () => {
    const trace = await kernels(
      '# invented\nmm,main,bf16,2e9,64 MiB,1 MB,block rows=128 width=256B pitch=16KiB,sequential,32 KiB,east,3,12.5\ncopy,side,,,4 KiB,4 KiB,,,,,,\n',
      `${HEADER},tile,die,repeat,estimate_us`,
      { dieNames: ['west', 'east'] },
    );
    expect(trace.kind).toBe('kernel');
    expect(trace.streams).toEqual(['main', 'side']);
    const [mm, copy] = trace.kernels;
    expect(mm).toMatchObject({ name: 'mm', line: 3, stream: 0, format: 'bf16', flops: 2e9, die: 1, repeat: 3 });
    expect(mm).toMatchObject({ readBytes: 64 * 2 ** 20, writeBytes: 1e6, tileBytes: 32768, estimatePs: 12500000 });
    expect(mm.read).toMatchObject({ name: 'block', rows: 128, width: 256, pitch: 16384 });
    expect(copy).toMatchObject({
      line: 4,
      stream: 1,
      format: '',
      flops: 0,
      die: -1,
      repeat: 1,
      estimatePs: 0,
      tileBytes: 65536,
    });
    expect(copy.read?.name).toBe('sequential');
    expect(copy.write?.name).toBe('sequential');
    expect(trace.facts.rows).toBe(2);
    expect(trace.facts.hash).toMatch(/^[0-9a-f]{64}$/);
  });

  it('have no pattern for a side that moves nothing', async () => {
    const { kernels: list } = await kernels('fill,s,,0,0,1 MiB,uniform,sequential');
    expect(list[0].read).toBeNull();
    expect(list[0].write?.name).toBe('sequential');
  });

  it('skip bad rows like access traces do', async () => {
    const trace = await kernels('a,s,,0,1 KiB,0,,\nb,s,,0,1 parsec,0,,\nc,s,,0,1 KiB,0,\nd,t,,0,1 KiB,0,,', HEADER, {
      skipBadRows: 2,
    });
    expect(trace.kernels.map((k) => k.name)).toEqual(['a', 'd']);
    expect(trace.streams).toEqual(['s', 't']);
    expect(trace.facts).toMatchObject({ rows: 2, skippedRows: 2 });
  });
});
