// node test/bench/ingest.mjs [rows]: how fast traces are read, as ratios within one run. Writes its files to a temporary folder and
// removes them. Each case runs in a process of its own; best of three, and the most memory a process took.
import { spawnSync } from 'node:child_process';
import { createReadStream, mkdtempSync, rmSync } from 'node:fs';
import { open } from 'node:fs/promises';
import { cpus, tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { createGunzip, createGzip } from 'node:zlib';
import { parse } from 'fast-csv';
import { arrowBytes, openTrace, parquetBytes } from '../../dist/trace/index.js';

const ROUNDS = 3;
const CHUNK = 1 << 20;

/** An access trace with times, as a capture would have it: about 27 bytes a row. */
async function writeCsv(file, rows) {
  const handle = await open(file, 'w');
  await handle.write('time_ns,op,address,bytes\n');
  let state = 1;
  for (let row = 0; row < rows; ) {
    let block = '';
    for (const end = Math.min(rows, row + 50_000); row < end; row++) {
      state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
      block += `${row * 3},${state & 256 ? 'R' : 'W'},0x${(state * 16).toString(16)},64\n`;
    }
    await handle.write(block);
  }
  await handle.close();
}

async function drain(file) {
  const trace = await openTrace(file);
  let rows = 0;
  let sum = 0;
  for await (const { count, address } of trace.batches()) {
    rows += count;
    for (let i = 0; i < count; i += 64) sum += address[i];
  }
  return { rows, sum };
}

const CASES = {
  'bytes of the CSV alone': async (at) => {
    let sum = 0;
    for await (const chunk of createReadStream(at('t.csv'), { highWaterMark: CHUNK })) sum += chunk[0];
    return { sum };
  },
  CSV: (at) => drain(at('t.csv')),
  'CSV through fast-csv, one tenth of the rows': async (at) => {
    let rows = 0;
    let sum = 0;
    const most = Number(process.argv[4]) / 10;
    const source = createReadStream(at('t.csv'), { highWaterMark: 65536 });
    for await (const [, , address] of source.pipe(parse({ headers: false, skipLines: 1 }))) {
      sum += Number(address);
      if (++rows >= most) break;
    }
    source.destroy();
    return { rows, sum };
  },
  'gunzip alone': async (at) => {
    let sum = 0;
    for await (const chunk of createReadStream(at('t.csv.gz'), { highWaterMark: CHUNK }).pipe(
      createGunzip({ chunkSize: CHUNK }),
    ))
      sum += chunk[0];
    return { sum };
  },
  'CSV, gzipped': (at) => drain(at('t.csv.gz')),
  Arrow: (at) => drain(at('t.arrow')),
  Parquet: (at) => drain(at('t.parquet')),
};

async function write(target, pieces) {
  const handle = await open(target, 'w');
  for await (const piece of pieces) await handle.write(piece);
  await handle.close();
}

if (process.argv[2] === 'case') {
  const [, , , name, rows, folder] = process.argv;
  const start = process.hrtime.bigint();
  const { sum, rows: seen } = await CASES[name]((file) => join(folder, file));
  const seconds = Number(process.hrtime.bigint() - start) / 1e9;
  if (!(sum > 0) || (seen !== undefined && seen < Number(rows) / 10)) throw new Error(`${name}: not all was read`);
  process.stdout.write(JSON.stringify({ seconds, peakBytes: process.resourceUsage().maxRSS * 1024 }));
} else {
  const rows = Number(process.argv[2] ?? 20e6);
  const folder = mkdtempSync(join(tmpdir(), 'penstock-ingest-'));
  const at = (name) => join(folder, name);
  try {
    await writeCsv(at('t.csv'), rows);
    await write(at('t.csv.gz'), createReadStream(at('t.csv'), { highWaterMark: CHUNK }).pipe(createGzip({ level: 4 })));
    await write(at('t.arrow'), arrowBytes((await openTrace(at('t.csv'))).batches(), null));
    await write(at('t.parquet'), parquetBytes((await openTrace(at('t.csv'))).batches(), null));
    console.log(
      `${cpus()[0].model.trim()}, ${cpus().length} cores, Node ${process.version}; ${rows} rows, best of ${ROUNDS}, each in its own process`,
    );
    const best = {};
    for (let round = 0; round < ROUNDS; round++) {
      for (const name of Object.keys(CASES)) {
        const args = [fileURLToPath(import.meta.url), 'case', name, String(rows), folder];
        const child = spawnSync(process.execPath, args, { encoding: 'utf8', stdio: ['ignore', 'pipe', 'inherit'] });
        if (child.status !== 0) throw new Error(`${name} failed`);
        const { seconds, peakBytes } = JSON.parse(child.stdout);
        const before = best[name] ?? { seconds: Number.POSITIVE_INFINITY, peakBytes: 0, worst: 0 };
        best[name] = {
          seconds: Math.min(before.seconds, seconds),
          worst: Math.max(before.worst, seconds),
          peakBytes: Math.max(before.peakBytes, peakBytes),
        };
      }
    }
    for (const [name, { seconds, worst, peakBytes }] of Object.entries(best)) {
      const part = name.includes('tenth') ? rows / 10 : rows;
      console.log(
        `${name.padEnd(46)} ${(part / seconds / 1e6).toFixed(2).padStart(6)} M rows/s   slowest ${((100 * seconds) / worst).toFixed(0).padStart(3)} % of that   ${(peakBytes / 1e6).toFixed(0).padStart(4)} MB`,
      );
    }
    const time = (name) => best[name].seconds * (name.includes('tenth') ? 10 : 1);
    const ratio = (a, b) => (time(a) / time(b)).toFixed(2);
    console.log('\nratios of time, within this run');
    console.log(`  CSV to its bytes alone                 ${ratio('CSV', 'bytes of the CSV alone')}`);
    console.log(
      `  fast-csv on the same rows to CSV       ${ratio('CSV through fast-csv, one tenth of the rows', 'CSV')}`,
    );
    console.log(
      `  gzipped CSV to gunzip and CSV          ${(time('CSV, gzipped') / (time('gunzip alone') + time('CSV'))).toFixed(2)}`,
    );
    console.log(`  CSV to Arrow                           ${ratio('CSV', 'Arrow')}`);
    console.log(`  CSV to Parquet                         ${ratio('CSV', 'Parquet')}`);
  } finally {
    rmSync(folder, { recursive: true });
  }
}
