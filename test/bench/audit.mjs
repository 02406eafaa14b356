// The audit: command logs of real runs, read from a file and checked. Part of npm run bench; prints commands a second, the spread,
// and peak memory of a log ten times as long, which should be the same. Each measurement is a process of its own.
import { spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { cpus, tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { auditLines, createAudit, createLogReader } from '../../dist/audit/index.js';
import { CommandLog } from '../../dist/cli/command-log.js';
import { domains, loadPackage } from '../../dist/config/index.js';
import { geometryOf, run } from '../../dist/engine/index.js';
import { openBytes, openTrace } from '../../dist/trace/index.js';

const PACKAGE = fileURLToPath(new URL('../../configs/wagtail.yaml', import.meta.url));
const SHORT = 1_000_000; // commands
const LONG = 10_000_000;
const PATTERNS = {
  sequential: 'k,main,,0,2 GiB,0,sequential,,64 KiB',
  'uniform random': 'k,main,,0,400 MiB,200 MiB,uniform granule=64B span=32GiB,uniform granule=64B span=32GiB,64 KiB',
};

async function* kernelTrace(row) {
  yield Buffer.from(`kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\n${row}\n`);
}

/** Writes the first `wanted` commands of a run to `file`. */
async function writeLog(file, pattern, wanted) {
  const pkg = loadPackage(PACKAGE);
  const trace = await openTrace('-', {
    input: kernelTrace(PATTERNS[pattern]),
    dieNames: pkg.dies.map((die) => die.name),
    geometry: geometryOf(pkg, domains(pkg)),
  });
  const log = new CommandLog(file, pkg);
  const enough = new AbortController();
  let commands = 0;
  const options = {
    replay: 'closed',
    seed: '1',
    untilPs: Infinity,
    windowPs: Infinity,
    attribution: false,
    onCommand: (...fields) => {
      if (commands++ < wanted) log.sink(...fields);
      else enough.abort();
    },
    onProgress: null,
    signal: enough.signal,
  };
  await run(pkg, trace, options, []);
  if (commands < wanted) throw new Error(`${pattern}: only ${commands} commands`);
  log.finish();
}

/** Audits a log as the command does; prints a JSON line. */
async function auditLog(file) {
  const pkg = loadPackage(PACKAGE);
  const start = process.hrtime.bigint();
  const checker = createAudit(pkg);
  const reader = createLogReader(file, pkg, (...fields) => checker.command(...fields));
  for await (const bytes of await openBytes(file, { expected: 'a command log' })) reader.push(bytes);
  const commands = reader.end();
  const report = checker.finish();
  const seconds = Number(process.hrtime.bigint() - start) / 1e9;
  if (!report.ok) throw new Error(auditLines(report, 1).join('\n'));
  console.log(JSON.stringify({ commands, perSecond: commands / seconds, peak: process.resourceUsage().maxRSS * 1024 }));
}

/** Runs this file again with other arguments; returns what it printed. */
function child(...args) {
  const ended = spawnSync(process.execPath, [fileURLToPath(import.meta.url), ...args], {
    encoding: 'utf8',
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  if (ended.status !== 0) throw new Error(`${args.join(' ')}: failed`);
  return ended.stdout;
}

function bench(rounds) {
  console.log(
    `audit: ${cpus()[0].model.trim()}, ${cpus().length} cores, Node ${process.version}; seed 1, ${rounds} rounds, each in its own process`,
  );
  const folder = mkdtempSync(join(tmpdir(), 'penstock-bench-'));
  try {
    const logs = Object.keys(PATTERNS).flatMap((pattern) =>
      [SHORT, LONG].map((wanted) => ({ pattern, wanted, file: join(folder, `${pattern} ${wanted}.csv`), found: [] })),
    );
    for (const { pattern, wanted, file } of logs) child('write', file, pattern, String(wanted));
    for (let round = 0; round < rounds; round++) {
      for (const { wanted, file, found } of logs) {
        const one = JSON.parse(child('audit', file));
        if (one.commands !== wanted) throw new Error(`${file}: ${one.commands} commands were read`);
        found.push(one);
      }
    }
    for (const { pattern, wanted, found } of logs) {
      const rates = found.map((one) => one.perSecond).sort((a, b) => b - a);
      const peak = Math.max(...found.map((one) => one.peak));
      console.log(
        `${`${pattern}, ${wanted / 1e6} million commands`.padEnd(44)} ${(rates[0] / 1e6).toFixed(2).padStart(6)} M commands/s   slowest ${((100 * rates.at(-1)) / rates[0]).toFixed(0).padStart(3)} % of that   ${(peak / 1e6).toFixed(0).padStart(4)} MB`,
      );
    }
  } finally {
    rmSync(folder, { recursive: true });
  }
}

const [what, file, pattern, wanted] = process.argv.slice(2);
if (what === 'write') await writeLog(file, pattern, Number(wanted));
else if (what === 'audit') await auditLog(file);
else bench(Number(what ?? 3));
