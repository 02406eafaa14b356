import { expect, it } from 'vitest';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { lonePackage } from '../helpers/packages.js';

// credits.ts keeps a ring of clock edges; a die that slept longer than the ring (here through a refresh of 350 ns) must not find a
// credit one turn of the ring too early and send into the past
it('a die that sleeps through a refresh gets its credits when they land, not before', async () => {
  const pkg = lonePackage(
    'compute.0.engines=1',
    'memory.0.timings={ tREFI: 1500 ns }',
    'memory.0.refresh={ mode: all-bank, postpone: 1, pull_in: 0 }',
    'memory.0.controller={ read_queue: 2, write_queue: 2 }',
  );
  const rows = Array.from({ length: 400 }, (_, i): Row => ({ op: 'W', address: 256 * i, bytes: 256 }));
  const { commands } = await simulate(pkg, accessTrace(rows), { log: true }); // its checks must hold too
  const times = commands.map((command) => command.ck);
  expect(times).toEqual([...times].sort((a, b) => a - b));
});
