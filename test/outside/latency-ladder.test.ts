import { expect, it } from 'vitest';
import { accessTrace, placer, type Row, simulate, sum } from '../helpers/engine.js';
import { fpgaCard, latencyOf } from '../helpers/outside.js';

/*
 * Wang, Huang, Zhang and Alonso, FCCM 2020, table IV: one 32 B read at a time on one pseudo-channel of HBM2 at 1.8 Gb/s, idle
 * latency with the row open, the bank closed, and another row open: 48, 55 and 62 cycles of 450 MHz.
 */
const CYCLE = 1e6 / 450; // ps
const PUBLISHED = { open: 48 * CYCLE, closed: 55 * CYCLE, other: 62 * CYCLE };

/*
 * Tolerance, chosen beforehand: the measurement counts whole cycles of 2.2 ns, so a step between two of its readings is known to
 * one cycle. The constant delay is fitted on the open row alone, to the picosecond, and then found again within one cycle.
 */
const TOLERANCE = CYCLE;

/** Mean latency of a chain of reads, each waiting for the one before; the first few are left out. */
async function chase(pipelinePs: number, page: 'open' | 'closed', rowOf: (i: number) => number): Promise<number> {
  const pkg = fpgaCard(pipelinePs, 'memory.0.refresh={ mode: off }', `memory.0.controller.page=${page}`);
  const address = placer(pkg);
  const rows = Array.from(
    { length: 256 },
    (_, i): Row => ({ op: 'R', address: address({ row: rowOf(i), column: i % 32 }), bytes: 32, after: 1 }),
  );
  const { samples } = await simulate(pkg, accessTrace(rows), { keepSamples: true });
  const settled = samples.slice(16);
  return sum(settled.map(latencyOf)) / settled.length;
}

const open = (pipelinePs: number): Promise<number> => chase(pipelinePs, 'open', () => 7);
const closed = (pipelinePs: number): Promise<number> => chase(pipelinePs, 'closed', (i) => i);
const other = (pipelinePs: number): Promise<number> => chase(pipelinePs, 'open', (i) => i);

it('the latency ladder of a real card: a closed bank costs tRCD more than an open row, another row tRP more again', async () => {
  const fitted = 5000 + Math.round(PUBLISHED.open - (await open(5000)));
  const ladder = { open: await open(fitted), closed: await closed(fitted), other: await other(fitted) };
  expect(Math.abs(ladder.open - PUBLISHED.open)).toBeLessThanOrEqual(TOLERANCE);
  expect(Math.abs(ladder.closed - ladder.open - (PUBLISHED.closed - PUBLISHED.open))).toBeLessThanOrEqual(TOLERANCE);
  expect(Math.abs(ladder.other - ladder.closed - (PUBLISHED.other - PUBLISHED.closed))).toBeLessThanOrEqual(TOLERANCE);
});
