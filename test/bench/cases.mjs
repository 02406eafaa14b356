// One bench case in a process of its own: prints a JSON line with atoms (or rows) a second and a sink that was read.
import { Delays } from '../../dist/analysis/index.js';
import { domains, loadPackage } from '../../dist/config/index.js';
import { geometryOf, run } from '../../dist/engine/index.js';
import { openTrace } from '../../dist/trace/index.js';
import { bareChannel } from './bare-channel.mjs';

const PACKAGE = new URL('../../configs/wagtail.yaml', import.meta.url).pathname;
const HEADER = 'kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\n';

async function* text(value) {
  yield Buffer.from(value);
}

/** Runs a kernel trace or an access trace on the demo package, with all figures on unless told otherwise. */
async function wholePath(csv, { overrides = [], attribution = true } = {}) {
  const pkg = loadPackage(PACKAGE, overrides);
  const geometry = geometryOf(pkg, domains(pkg));
  const trace = await openTrace('-', { input: text(csv), dieNames: pkg.dies.map((die) => die.name), geometry });
  const options = {
    replay: 'closed',
    seed: '1',
    untilPs: Infinity,
    windowPs: Infinity,
    attribution,
    onCommand: null,
    onProgress: null,
    signal: null,
  };
  const start = process.hrtime.bigint();
  const recording = await run(pkg, trace, options, [new Delays()]);
  const seconds = Number(process.hrtime.bigint() - start) / 1e9;
  if (!recording.checks.every((check) => check.ok)) throw new Error('a self check failed');
  let atoms = 0;
  for (const counts of [recording.dram.reads, recording.dram.writes]) for (const n of counts) atoms += n;
  return { perSecond: atoms / seconds, sink: recording.makespanPs };
}

const kernel = (read, pattern, write = '0', writePattern = '') =>
  `${HEADER}k,main,,0,${read},${write},${pattern},${writePattern},64 KiB\n`;
const atomRequests = ['compute.0.request=32 B', 'compute.1.request=32 B'];

/** An access trace in which every access of one engine waits for the one before it. */
function loneChase(accesses) {
  let state = 1;
  const rows = ['op,address,bytes,engine,after'];
  for (let i = 0; i < accesses; i++) {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    rows.push(`R,${(state % 2 ** 28) * 64},64,0,1`);
  }
  return `${rows.join('\n')}\n`;
}

export const CASES = {
  'whole path, sequential, 256 B requests': () => wholePath(kernel('512 MiB', 'sequential')),
  'whole path, sequential, 32 B requests': () =>
    wholePath(kernel('128 MiB', 'sequential'), { overrides: atomRequests }),
  'whole path, uniform random, 64 B': () => wholePath(kernel('160 MiB', 'uniform granule=64B span=32GiB')),
  'whole path, uniform random, 32 B': () => wholePath(kernel('80 MiB', 'uniform granule=32B span=32GiB')),
  'whole path, sequential read and write': () => wholePath(kernel('256 MiB', 'sequential', '256 MiB', 'sequential')),
  'same, attribution off': () =>
    wholePath(kernel('256 MiB', 'sequential', '256 MiB', 'sequential'), { attribution: false }),
  'bare channels, sequential, one atom': async () => bareChannel('sequential', 8e6),
  'bare channels, uniform random, one atom': async () => bareChannel('uniform', 4e6),
  'lone pointer chase, 100,000 accesses': () => wholePath(loneChase(100_000)),
};

if (process.argv[1]?.endsWith('cases.mjs')) {
  const { perSecond, sink } = await CASES[process.argv[2]]();
  process.stdout.write(`${JSON.stringify({ perSecond, sink, rss: process.memoryUsage().rss })}\n`);
}
