import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import { stream } from '../../src/random.js';
import { accessTrace, type Row, simulate, sum } from '../helpers/engine.js';
import { lone, movedPerS } from '../helpers/outside.js';

type Access = Pick<Row, 'op' | 'address' | 'bytes'>;

async function bandwidth(pkg: Package, rows: Iterable<Access>): Promise<{ perS: number; hits: number }> {
  const { recording } = await simulate(pkg, accessTrace(rows));
  const { rowHits, rowMisses, rowConflicts } = recording.dram;
  return { perS: movedPerS(recording), hits: sum(rowHits) / sum([...rowHits, ...rowMisses, ...rowConflicts]) };
}

/** A column walk through a matrix: 64 B from every row of `pitch` bytes, column by column. */
function* columns(pitch: number, rows: number, count: number): Generator<Access> {
  for (let i = 0; i < count; i++) yield { op: 'R', address: (i % rows) * pitch + 64 * Math.floor(i / rows), bytes: 64 };
}

function* sequential(count: number): Generator<Access> {
  for (let i = 0; i < count; i++) yield { op: 'R', address: 256 * i, bytes: 256 };
}

function* random(count: number): Generator<Access> {
  const draw = stream('1', 'random');
  for (let i = 0; i < count; i++) yield { op: 'R', address: 64 * Math.floor(draw.double() * 2 ** 22), bytes: 64 };
}

/*
 * Zhang, Zhu and Zhang, MICRO-33, 2000, 32-41: bank index XORed with low bits of the row (page) address. Rows that used to meet in
 * one bank are spread over all, and what lay in one page still does. Its figures are memory stalls of whole programs; what is checked
 * is the direction: a conflicting stride gains much, a sequential stream loses nothing, random traffic does not care.
 */
describe('permutation-based interleaving', () => {
  const plain = (): Package => lone('hbm2-1.8');
  const folded = (): Package =>
    lone(
      'hbm2-1.8',
      'address_map.xor={ bank_group.0: [row.0], bank_group.1: [row.1], bank.0: [row.2], bank.1: [row.3] }',
    );
  // 16 banks x 1 KiB: the next row of the same bank is 16 KiB on

  // Ratio chosen beforehand: of 16 banks one is used without it, so the activate window becomes the limit instead of tRC of one bank:
  // 44 ck against 4 ck an ACT, and half of that is asked for
  it('a stride that stays in one bank gains several times', async () => {
    const without = await bandwidth(plain(), columns(16 * 1024, 512, 8192));
    const withIt = await bandwidth(folded(), columns(16 * 1024, 512, 8192));
    expect(withIt.perS / without.perS).toBeGreaterThan(5);
  });

  // Tolerances chosen beforehand: 1 % for a sequential stream, 3 % for random traffic, which is a sample of 10,000
  it('a sequential stream keeps its row hits and its bandwidth', async () => {
    const without = await bandwidth(plain(), sequential(8192));
    const withIt = await bandwidth(folded(), sequential(8192));
    expect(Math.abs(withIt.perS / without.perS - 1)).toBeLessThan(0.01);
    expect(withIt.hits).toBeGreaterThanOrEqual(0.99 * without.hits);
  });

  it('random traffic does not care', async () => {
    const without = await bandwidth(plain(), random(10_000));
    const withIt = await bandwidth(folded(), random(10_000));
    expect(Math.abs(withIt.perS / without.perS - 1)).toBeLessThan(0.03);
  });
});

/*
 * Rixner, Dally, Kapasi, Mattson and Owens, ISCA 2000: first-ready scheduling gives 40 % more bandwidth than in order, aggressive
 * reordering 93 %, on media traces, and streams to one row are nearly ten times as fast as streams to different rows. Their device
 * is another one: what is checked is the direction, and that the gains are of that size or larger where streams collide.
 */
describe('first-ready scheduling', () => {
  const scheduled = (scheduler: 'fcfs' | 'fr-fcfs'): Package =>
    lone('hbm2-1.8', `memory.0.controller.scheduler=${scheduler}`);

  /** `streams` sequential streams taking turns, each `apart` bytes from the next. */
  function* interleaved(streams: number, apart: number, count: number): Generator<Access> {
    for (let i = 0; i < count; i++) {
      yield { op: 'R', address: (i % streams) * apart + 64 * Math.floor(i / streams), bytes: 64 };
    }
  }

  // Ratios chosen beforehand: the published 1.4 where streams share banks; nowhere worse than in order, within 1 %
  it.each([
    ['four streams, each in its own row of one bank', () => interleaved(4, 2 ** 20, 16_384), 1.4],
    ['eight such streams', () => interleaved(8, 2 ** 20, 16_384), 1.4],
    ['a column walk', () => columns(4096, 128, 8192), 0.99],
    ['random traffic', () => random(10_000), 0.99],
    ['one sequential stream', () => sequential(8192), 0.99],
  ] as const)('%s', async (_, rows, least) => {
    const inOrder = await bandwidth(scheduled('fcfs'), rows());
    const firstReady = await bandwidth(scheduled('fr-fcfs'), rows());
    expect(firstReady.perS / inOrder.perS).toBeGreaterThanOrEqual(least);
    expect(firstReady.hits).toBeGreaterThanOrEqual(inOrder.hits - 0.01);
  });

  it('a stream along rows is about ten times as fast as one of different rows of a bank', async () => {
    // by hand: 64 B along rows take two bursts, 2 x 2 ck, and a tRC of 44 ck when each has its own row: 11 times. Tolerance, chosen
    // beforehand: 5 %, as for every ceiling of a schedule
    const [{ timings, organisation }] = scheduled('fr-fcfs').memory;
    const byHand = timings.tRC.ck / (2 * organisation.burst_ck);
    const along = await bandwidth(scheduled('fr-fcfs'), sequential(8192));
    const across = await bandwidth(scheduled('fr-fcfs'), columns(16 * 1024, 8192, 8192));
    expect(along.perS / across.perS / byHand).toBeGreaterThan(0.95);
    expect(along.perS / across.perS / byHand).toBeLessThan(1.05);
  });
});
