// npm run bench: every case in turn, round after round, each in a fresh process; prints the machine, the best and the spread, and
// the ratios that matter. Figures of one machine are compared only with figures of the same run.
import { spawnSync } from 'node:child_process';
import { cpus } from 'node:os';
import { fileURLToPath } from 'node:url';
import { CASES } from './cases.mjs';

const ROUNDS = Number(process.argv[2] ?? 3);
const script = fileURLToPath(new URL('./cases.mjs', import.meta.url));
const names = Object.keys(CASES);
const rates = new Map(names.map((name) => [name, []]));
const peaks = new Map(); // bytes of memory at most, by case
console.log(
  `${cpus()[0].model.trim()}, ${cpus().length} cores, Node ${process.version}; seed 1, ${ROUNDS} rounds, each case in its own process`,
);
for (let round = 0; round < ROUNDS; round++) {
  for (const name of names) {
    const child = spawnSync(process.execPath, [script, name], {
      encoding: 'utf8',
      stdio: ['ignore', 'pipe', 'inherit'],
    });
    if (child.status !== 0) process.exit(1);
    const { perSecond, sink, peakBytes } = JSON.parse(child.stdout);
    if (!(sink > 0)) throw new Error(`${name}: nothing was done`);
    rates.get(name).push(perSecond);
    peaks.set(name, Math.max(peakBytes, peaks.get(name) ?? 0));
  }
}
const best = (name) => Math.max(...rates.get(name));
for (const name of names) {
  const low = Math.min(...rates.get(name));
  console.log(
    `${name.padEnd(44)} ${(best(name) / 1e6).toFixed(2).padStart(6)} M ${name.startsWith('machine') ? '     ' : 'atoms'}/s   slowest ${((100 * low) / best(name)).toFixed(0).padStart(3)} % of that   ${(peaks.get(name) / 1e6).toFixed(0).padStart(4)} MB`,
  );
}
const ratio = (a, b) => (best(a) / best(b)).toFixed(2);
console.log('\nratios, within this run');
console.log(
  `  whole path / bare channels, sequential, one atom a request: ${ratio('whole path, sequential, 32 B requests', 'bare channels, sequential, one atom')}`,
);
console.log(
  `  whole path / bare channels, uniform random, one atom:       ${ratio('whole path, uniform random, 32 B', 'bare channels, uniform random, one atom')}`,
);
console.log(
  `  requests of eight atoms / of one, sequential:               ${ratio('whole path, sequential, 256 B requests', 'whole path, sequential, 32 B requests')}`,
);
console.log(
  `  attribution on / off:                                       ${ratio('whole path, sequential read and write', 'same, attribution off')}`,
);
console.log(
  `  lone pointer chase of 100,000 accesses:                     ${(200_000 / best('lone pointer chase, 100,000 accesses')).toFixed(2)} s`,
);
console.log(
  `  memory of 20 million rows / of 1 million:                   ${(peaks.get('access rows, 20 million') / peaks.get('access rows, 1 million')).toFixed(2)}`,
);
