/** Broken traces, and what is said about each: where, what was found, what would do. Nothing hangs, nothing grows. */
import { existsSync, mkdirSync, mkdtempSync, readdirSync, readlinkSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { InputError, SystemError } from '../../src/errors.js';
import { openTrace, type TraceOptions } from '../../src/trace/index.js';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'penstock-refused-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

/** Reads a trace to its end and gives back the InputError it must stop with. */
async function refusal(file: string, options: TraceOptions = {}): Promise<InputError> {
  try {
    const trace = await openTrace(file, options);
    if (trace.kind === 'access') for await (const _ of trace.batches());
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    expect(error.where.file).toBe(file);
    expect(error.message).toContain(file);
    expect(error.expected).not.toBe('');
    expect(error.hint).not.toBe('');
    return error;
  }
  throw new Error(`${file} was accepted`);
}

async function refusalOf(content: string | Buffer, options?: TraceOptions, name = 'bad.csv'): Promise<InputError> {
  const file = join(folder, name);
  writeFileSync(file, content);
  return refusal(file, options);
}

const geometry = [
  { base: 0, capacity: 4096, engines: 2, requestBytes: 256 },
  { base: 4096, capacity: 4096, engines: 2, requestBytes: 256 },
];
const dieNames = ['west', 'east'];

describe('files that are no trace', () => {
  it('missing', async () => {
    expect((await refusal(join(folder, 'nowhere.csv'))).found).toBe('no such file');
    expect((await refusal(join(folder, 'nowhere.csv', 'deeper.csv'))).found).toBe('no such file');
  });

  it('a directory', async () => {
    mkdirSync(join(folder, 'some.csv'));
    expect((await refusal(join(folder, 'some.csv'))).found).toBe('a directory');
  });

  it('empty, or nothing but comments and blank lines', async () => {
    expect((await refusalOf('')).found).toBe('an empty file');
    expect((await refusalOf('# nothing\n\n   \n#')).found).toBe('an empty file');
    expect((await refusalOf('', {}, 'empty.csv.gz')).found).toBe('an empty file');
  });

  it('a header alone, or one with only bad rows under it', async () => {
    expect((await refusalOf('op,address,bytes\n')).found).toBe('a header and no rows');
    expect((await refusalOf('op,address,bytes')).found).toBe('a header and no rows');
    expect((await refusalOf('kernel,stream,format,flops,read,write,read_pattern,write_pattern\n')).found).toBe(
      'a header and no rows',
    );
    expect((await refusalOf('op,address,bytes\nX,1,1\n', { skipBadRows: 9 })).found).toBe(
      'no good row: all 1 were skipped',
    );
  });

  it("'-' without standard input", async () => {
    expect((await refusal('-')).found).toContain('no standard input');
  });

  it('that break off while being read are no fault of the user', async () => {
    async function* input() {
      yield Buffer.from('op,address,bytes\nR,0,1\n');
      throw new Error('EIO: i/o error, read');
    }
    const reading = openTrace('-', { input: input() });
    await expect(reading).rejects.toThrow(SystemError);
    await expect(reading).rejects.toThrow('-: cannot be read: EIO: i/o error, read');
  });

  it('with NUL bytes', async () => {
    const error = await refusalOf('op,address,bytes\nR,1,\u00001\n');
    expect(error.found).toBe('a NUL byte');
    expect(error.where).toMatchObject({ line: 2, column: 5 });
    expect((await refusalOf(Buffer.alloc(1000000))).where.line).toBe(1);
  });

  it('not gzip, truncated gzip, damaged gzip, gzip under a plain name', async () => {
    const text = `op,address,bytes\n${Array.from({ length: 50000 }, (_, i) => `R,${i * 977},64`).join('\n')}\n`;
    const zipped = gzipSync(text);
    expect((await refusalOf(text, {}, 'a.csv.gz')).found).toBe('a file named .gz that is not gzip');
    expect((await refusalOf(zipped, {}, 'b.csv')).found).toBe('gzip data in a file not named .gz');
    for (const length of [12, 5000, zipped.length - 4]) {
      expect((await refusalOf(zipped.subarray(0, length), {}, 'c.csv.gz')).found).toBe('gzip data that ends too early');
    }
    const damaged = Buffer.from(zipped);
    damaged.fill(0x55, 3000, 3400);
    expect((await refusalOf(damaged, {}, 'd.csv.gz')).found).toContain('damaged gzip data');
  });

  it('with a line of 100 MB, refused from its first part in little memory', async () => {
    let pulled = 0;
    async function* input() {
      yield Buffer.from('op,address,bytes\nR,0,1\n');
      for (let i = 0; i < 1600; i++) {
        pulled++;
        yield Buffer.alloc(65536, 0x31);
      }
    }
    const error = await refusal('-', { input: input() });
    expect(error.found).toBe('a line of more than 65536 bytes');
    expect(error.where.line).toBe(3);
    expect(pulled).toBeLessThan(8);
    const file = join(folder, 'long.csv');
    writeFileSync(file, Buffer.alloc(100_000_000, 0x31));
    const before = process.memoryUsage().rss;
    expect((await refusal(file)).where.line).toBe(1);
    expect(process.memoryUsage().rss - before).toBeLessThan(30e6);
    writeFileSync(file, gzipSync(Buffer.alloc(100_000_000, 0x31)));
    expect((await refusalOf(gzipSync(Buffer.alloc(100_000_000, 0x31)), {}, 'long.csv.gz')).found).toContain(
      'line of more',
    );
  });

  it('with a quote that is never closed, near the end or in a long file', async () => {
    const short = await refusalOf('op,address,bytes\nR,1,1\nR,"1,1\nR,1,1\n');
    expect(short.found).toBe('a quoted cell that never ends');
    expect(short.where.line).toBe(3);
    const long = await refusalOf(`op,address,bytes\nR,"1,1\n${'R,1,1\n'.repeat(50000)}`);
    expect(long.found).toBe('a quoted cell of more than 65536 bytes');
    expect(long.where.line).toBe(2);
  });

  it('with text after a closing quote, or bare carriage returns', async () => {
    const quote = await refusalOf('op,address,bytes\nR,"1"0,1\n');
    expect(quote.found).toBe('text after the closing quote of a cell');
    expect(quote.where).toMatchObject({ line: 2, column: 6 });
    expect((await refusalOf('op,address,bytes\rR,1,1\rR,2,1\r')).found).toBe(
      'a carriage return in the middle of a line',
    );
  });
});

describe('headers', () => {
  it.each([
    ['op,addr,bytes', "no column 'address' among 'op', 'addr', 'bytes'", "is 'addr' meant to be 'address'? rename it"],
    ['op,address', "no column 'bytes' among 'op', 'address'", "add a column 'bytes'"],
    ['op,address,bytes,enginge', "unknown column 'enginge'", "did you mean 'engine'?"],
    ['op,address,bytes,', 'a column without a name', 'remove it'],
    ['op,address,bytes,op', "column 'op' twice", 'remove or rename one of them'],
    ['op,address,bytes,time_ps,time_ns', "the time columns 'time_ps', 'time_ns'", 'keep one of them'],
    [
      'a,b,c',
      "a header row of neither kind of trace: 'a', 'b', 'c'",
      'the first row that is no comment names the columns',
    ],
    [
      'R,0x1000,64',
      "a header row of neither kind of trace: 'R', '0x1000', '64'",
      'the first row that is no comment names the columns',
    ],
    [
      'kernel,stream,format,flops,read,write,read_pattern',
      expect.stringContaining("no column 'write_pattern'"),
      "add a column 'write_pattern'",
    ],
    [
      'kernel,stream,format,flops,reads,write,read_pattern,write_pattern',
      expect.stringContaining("no column 'read'"),
      "is 'reads' meant to be 'read'? rename it",
    ],
  ])('%s', async (header, found, hint) => {
    const error = await refusalOf(`# a comment\n${header}\n`);
    expect(error.found).toEqual(found);
    expect(error.hint).toBe(hint);
    expect(error.where.line).toBe(2);
  });

  it.skipIf(!existsSync('/proc/self/fd'))('leave no file open behind them', async () => {
    for (const header of ['a,b,c', 'op,address,bytes,cycle', 'op,address,bytes\nX,1,1']) {
      await refusalOf(`${header}\n${'R,0,1,1\n'.repeat(100000)}`, {}, 'left.csv');
      const zipped = gzipSync(`${header}\n${'R,0,1,1\n'.repeat(100000)}`);
      await refusalOf(zipped, {}, 'left.csv.gz');
      await refusalOf(zipped, {}, 'left.csv');
    }
    await new Promise((resolve) => setTimeout(resolve, 50));
    const open = readdirSync('/proc/self/fd').filter((fd) => {
      try {
        return readlinkSync(`/proc/self/fd/${fd}`).includes('left.csv');
      } catch {
        return false; // closed since
      }
    });
    expect(open).toEqual([]);
  });

  it('a cycle column without a clock', async () => {
    expect((await refusalOf('op,address,bytes,cycle\nR,1,1,1\n')).expected).toBe('the period of that clock');
  });
});

describe('rows of an access trace', () => {
  const COLUMNS = 'op,address,bytes,time_ps,die,engine,tile,flops,after';
  it.each([
    ['R,0,64,0,0,0,0,0', '8 cells', undefined],
    ['R,0,64,0,0,0,0,0,0,0', '10 cells', undefined],
    ['R', '1 cell', undefined],
    ['X,0,64,0,0,0,0,0,0', "'X'", 'op'],
    [',0,64,0,0,0,0,0,0', 'an empty cell', 'op'],
    ['constructor,0,64,0,0,0,0,0,0', "'constructor'", 'op'],
    ['R,zero,64,0,0,0,0,0,0', "'zero'", 'address'],
    ['R,ff00,64,0,0,0,0,0,0', "'ff00'", 'address'],
    ['R,-1,64,0,0,0,0,0,0', "'-1'", 'address'],
    ['R,1.5,64,0,0,0,0,0,0', "'1.5'", 'address'],
    ['R,1e3,64,0,0,0,0,0,0', "'1e3'", 'address'],
    ['R,0x,64,0,0,0,0,0,0', "'0x'", 'address'],
    ['R,0x10000000000000,64,0,0,0,0,0,0', "'0x10000000000000'", 'address'],
    ['R,0,0,0,0,0,0,0,0', "'0'", 'bytes'],
    ['R,0,-64,0,0,0,0,0,0', "'-64'", 'bytes'],
    ['R,0,64B,0,0,0,0,0,0', "'64B'", 'bytes'],
    ['R,0,,0,0,0,0,0,0', 'an empty cell', 'bytes'],
    ['R,0,2147483649,0,0,0,0,0,0', "'2147483649'", 'bytes'],
    ['R,8191,2,0,0,0,0,0,0', "'8191', 1 bytes beyond the end of memory", 'address'],
    ['R,4095,2,0,0,0,0,0,0', "'4095'", 'address'],
    ['R,0,64,-1,0,0,0,0,0', "'-1'", 'time_ps'],
    ['R,0,64,,0,0,0,0,0', 'an empty cell', 'time_ps'],
    ['R,0,64,soon,0,0,0,0,0', "'soon'", 'time_ps'],
    ['R,0,64,9e18,0,0,0,0,0', "'9e18'", 'time_ps'],
    ['R,0,64,0,2,0,0,0,0', "'2'", 'die'],
    ['R,0,64,0,esat,0,0,0,0', "'esat'", 'die'],
    ['R,0,64,0,0,2,0,0,0', "'2'", 'engine'],
    ['R,0,64,0,,-1,0,0,0', "'-1'", 'engine'],
    ['R,0,64,0,0,0,-1,0,0', "'-1'", 'tile'],
    ['R,0,64,0,0,0,0,-1,0', "'-1'", 'flops'],
    ['R,0,64,0,0,0,0,NaN,0', "'NaN'", 'flops'],
    ['R,0,64,0,0,0,0,0,-1', "'-1'", 'after'],
    ['R,0,64,0,0,0,0,0,1025', "'1025'", 'after'],
  ])('%s', async (row, found, path) => {
    const good = 'R,0,64,0,west,1,0,0,1024';
    const error = await refusalOf(`${COLUMNS}\n# good\n${good}\n${row}\n`, { geometry, dieNames });
    expect(error.found).toBe(found);
    expect(error.where).toMatchObject({ line: 4 });
    expect(error.where.path).toBe(path);
    // one bad row may be skipped, whatever is wrong with it
    const trace = await openTrace(join(folder, 'bad.csv'), { geometry, dieNames, skipBadRows: 1 });
    if (trace.kind === 'access') for await (const batch of trace.batches()) expect(batch.count).toBe(1);
    expect(trace.kind).toBe('access');
  });

  it('time going backwards', async () => {
    const error = await refusalOf('op,address,bytes,time_ns\nR,0,1,5\nR,0,1,7\nR,0,1,6.5\n');
    expect(error.found).toBe("'6.5': time goes backwards by 500 ps");
    expect(error.expected).toBe('a time no earlier than that of line 3, 7000 ps');
    expect(error.where).toMatchObject({ line: 4, path: 'time_ns' });
  });

  it('a misspelt die', async () => {
    const error = await refusalOf('op,address,bytes,die\nR,0,1,esst\n', { dieNames });
    expect(error.hint).toBe("did you mean 'east'?");
  });

  it('an address beyond a capacity given alone', async () => {
    expect((await refusalOf('op,address,bytes\nR,100,1\n', { capacity: 100 })).found).toContain(
      '1 bytes beyond the end',
    );
  });

  it('a new kernel every row, for ever', async () => {
    const rows = Array.from({ length: 70000 }, (_, i) => `R,0,1,launch${i}`).join('\n');
    const error = await refusalOf(`op,address,bytes,kernel\n${rows}\n`);
    expect(error.expected).toBe('at most 65536 different kernels in a trace');
    expect(error.where.line).toBe(65538);
  });
});

describe('rows of a kernel trace', () => {
  const COLUMNS = 'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,die,repeat,estimate_us';
  it.each([
    [',s,,0,1 KiB,0,,,,,,', 'an empty cell', 'kernel'],
    ['a,s,,0,0,0,,,,,,', 'flops, read and write all 0', 'read'],
    ['a,s,,1e6,1 KiB,0,,,,,,', 'an empty cell', 'format'],
    ['a,s,,0,1 KiB,0,sequentail,,,,,', "unknown pattern 'sequentail'", 'read_pattern'],
    ['a,s,,0,1 KiB,0,,strided,,,,', "pattern 'strided' without 'stride'", 'write_pattern'],
    ['a,s,,0,1 KiB,0,,,0,,,', "'0'", 'tile'],
    ['a,s,,0,1 KiB,0,,,,north,,', "'north'", 'die'],
    ['a,s,,0,1 KiB,0,,,,,0,', "'0'", 'repeat'],
    ['a,s,,0,1 KiB,0,,,,,2.5,', "'2.5'", 'repeat'],
    ['a,s,,0,1 KiB,0,,,,,,-3', "'-3'", 'estimate_us'],
    ['a,s,,0,0.3 B,0,,,,,,', "'0.3 B'", 'read'],
    ['a,s,,0,1 KiB,0,,,,,', '11 cells', undefined],
  ])('%s', async (row, found, path) => {
    const error = await refusalOf(`${COLUMNS}\n${row}\n`, { dieNames });
    expect(error.found).toBe(found);
    expect(error.where.line).toBe(2);
    expect(error.where.path).toBe(path);
  });

  it.each([
    ['a,s,,0,1024,0,,,,,,', 'read'],
    ['a,s,,0,0,5 ns,,,,,,', 'write'],
    ['a,s,,0,-1 KiB,0,,,,,,', 'read'],
    ['a,s,bf16,lots,1 KiB,0,,,,,,', 'flops'],
    ['a,s,bf16,-5,1 KiB,0,,,,,,', 'flops'],
    ['a,s,bf16,-5 GFLOP,1 KiB,0,,,,,,', 'flops'],
    ['a,s,bf16,1e300,1 KiB,0,,,,,,', 'flops'],
    ['a,s,,0,1 KiB,0,,,4,,,', 'tile'],
  ])('%s, whose quantity has no fitting unit', async (row, path) => {
    expect((await refusalOf(`${COLUMNS}\n${row}\n`)).where).toMatchObject({ line: 2, path });
  });
});
