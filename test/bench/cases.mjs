// One bench case in a process of its own: prints a JSON line with atoms (or rows) a second and a sink that was read.
import { Heap } from 'heap-js';
import seedrandom from 'seedrandom';
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

/** An access trace of `rows` sequential reads of 32 B, as CSV in blocks: what a pipe would bring, never whole in memory. */
async function* csvRows(rows) {
  yield Buffer.from('op,address,bytes\n');
  for (let row = 0; row < rows; ) {
    let block = '';
    for (const end = Math.min(rows, row + 8192); row < end; row++) block += `R,0x${(row * 32).toString(16)},32\n`;
    yield Buffer.from(block);
  }
}

/** Runs a kernel trace or an access trace on the demo package, with all figures on unless told otherwise. */
async function wholePath(csv, { overrides = [], attribution = true } = {}) {
  const input = typeof csv === 'string' ? text(csv) : csv;
  const pkg = loadPackage(PACKAGE, overrides);
  const geometry = geometryOf(pkg, domains(pkg));
  const trace = await openTrace('-', { input, dieNames: pkg.dies.map((die) => die.name), geometry });
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

/** How fast this machine is at what the engine does: pops and pushes of a small heap of numbers. */
function heapRate(count) {
  const heap = new Heap((a, b) => a - b);
  for (let i = 0; i < 64; i++) heap.push(i);
  const random = seedrandom.xor128('1');
  const start = process.hrtime.bigint();
  for (let i = 0; i < count; i++) heap.push(heap.pop() + 64 * random());
  return { perSecond: (count * 1e9) / Number(process.hrtime.bigint() - start), sink: heap.peek() };
}

/** … and loads that each wait for the one before, all over `bytes` of memory. */
function loadRate(bytes) {
  const lines = bytes / 64;
  const next = new Int32Array(bytes / 4);
  const order = Array.from({ length: lines }, (_, i) => i);
  const random = seedrandom.xor128('1');
  for (let i = lines - 1; i > 0; i--) {
    const j = Math.floor(random() * (i + 1));
    [order[i], order[j]] = [order[j], order[i]];
  }
  order.forEach((line, i) => {
    next[line * 16] = order[(i + 1) % lines] * 16;
  });
  let at = 0;
  const count = 2e7;
  const start = process.hrtime.bigint();
  for (let i = 0; i < count; i++) at = next[at];
  return { perSecond: (count * 1e9) / Number(process.hrtime.bigint() - start), sink: at + 1 };
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
  'access rows, 1 million': () => wholePath(csvRows(1e6)),
  'access rows, 20 million': () => wholePath(csvRows(20e6)),
  'machine: heap-js, 64 entries, pop and push': async () => heapRate(3e6),
  'machine: dependent loads, 1 MiB': async () => loadRate(2 ** 20),
  'machine: dependent loads, 8 MiB': async () => loadRate(2 ** 23),
};

if (process.argv[1]?.endsWith('cases.mjs')) {
  const { perSecond, sink } = await CASES[process.argv[2]]();
  process.stdout.write(`${JSON.stringify({ perSecond, sink, peakBytes: process.resourceUsage().maxRSS * 1024 })}\n`);
}
