import fc from 'fast-check';
import { expect, it } from 'vitest';
import { STAGES } from '../../src/engine/index.js';
import { accessTrace, simulate, sum } from '../helpers/engine.js';
import { everyClockIsAccountedFor } from './accounts.js';
import { anyDesign, anyReplay, anyWork, build, type Finished, finished, rowsOf } from './cases.js';

const [WAIT, DOWN_QUEUE, DOWN_TRANSIT, QUEUE, PREPARATION, DATA, UP_QUEUE, UP_TRANSIT] = STAGES.keys();

/** When a request entered (and the last one, left) each stage: its stages laid end to end before its end. */
function entered(request: Finished): number[] {
  const times = [request.donePs - sum(request.stages)];
  for (const delay of request.stages) times.push(times[times.length - 1] + delay);
  return times;
}

/** Time integral of how many are inside, and the most at once, from two lists of moments. At one moment arrivals count first, or departures. */
function occupancy(
  arrivals: readonly number[],
  departures: readonly number[],
  first: 'arrivals' | 'departures' = 'arrivals',
): { integral: number; most: number } {
  const events = [...arrivals.map((at) => ({ at, step: 1 })), ...departures.map((at) => ({ at, step: -1 }))].sort(
    (a, b) => a.at - b.at || (first === 'arrivals' ? b.step - a.step : a.step - b.step),
  );
  let [inside, most, integral, last] = [0, 0, 0, 0];
  for (const { at, step } of events) {
    integral += inside * (at - last);
    last = at;
    inside += step;
    most = Math.max(most, inside);
    expect(inside).toBeGreaterThanOrEqual(0);
  }
  expect(inside).toBe(0);
  return { integral, most };
}

it('stage delays are whole picoseconds, never negative, and add up from ready to done', async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, async (design, work) => {
      const pkg = build(design);
      // rows inside one granule, so that each is one request; open loop, so that each is ready at its recorded time
      const rows = rowsOf(pkg, { ...work, tiles: false, after: false, size: 32 }).map(({ after, ...row }) => row);
      const { all, collector } = finished();
      const { recording } = await simulate(pkg, accessTrace(rows, ['even', 'odd']), {
        replay: 'open',
        collectors: [collector],
      });
      for (const request of all) {
        expect(request.stages.every((delay) => Number.isInteger(delay) && delay >= 0)).toBe(true);
        expect(request.donePs).toBeLessThanOrEqual(recording.makespanPs);
      }
      const ready = all.map((request) => entered(request)[0]).sort((a, b) => a - b);
      expect(ready).toEqual(rows.map((row) => row.timePs)); // recorded times rise
    }),
    { seed: 11, numRuns: 30 },
  );
});

it('fixed delays are never undercut: transit, the read latency, the burst', async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, anyReplay, async (design, work, replay) => {
      const pkg = build(design);
      const [memory] = pkg.memory;
      const { all, collector } = finished();
      await simulate(pkg, accessTrace(rowsOf(pkg, work), ['even', 'odd']), { replay, collectors: [collector] });
      const pcs = memory.organisation.channels * memory.organisation.pseudo_channels;
      const ck = memory.clockPs;
      for (const { stages, op, p, bytes } of all) {
        const link = pkg.links[Math.floor(p / pcs)];
        expect(stages[DOWN_TRANSIT]).toBeGreaterThanOrEqual(
          Math.floor(link.flitPs) + link.latencyPs + memory.baseDie.ingressPs,
        );
        expect(stages[UP_TRANSIT]).toBeGreaterThanOrEqual(
          Math.floor(link.flitPs) + link.latencyPs + memory.baseDie.egressPs,
        );
        const atoms = Math.ceil(bytes / memory.organisation.atom_bytes);
        const data = memory.timings.RL.ck + memory.organisation.burst_ck + (atoms - 1) * memory.timings.tCCD_L.ck;
        if (op === 0) expect(stages[DATA]).toBeGreaterThanOrEqual(Math.floor(data * ck));
        // whole clocks at both ends of the pipeline, each rounded up to a picosecond
        const pipeline = memory.controller.pipelineCk * ck;
        if (op === 1) expect(Math.abs(stages[QUEUE] - pipeline)).toBeLessThanOrEqual(1);
        if (op === 2) expect(Math.abs(stages[DATA] - pipeline)).toBeLessThanOrEqual(1);
        if (op === 1) expect(stages[PREPARATION] + stages[DATA]).toBe(0);
      }
    }),
    { seed: 12, numRuns: 30 },
  );
});

it("Little's law holds for every stage, for the windows and for the queues", async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, anyReplay, async (design, work, replay) => {
      const pkg = build({ ...design, device: 'hbm3-6.4' }); // a clock of 625 ps: times in clocks are exact in ps
      const [memory] = pkg.memory;
      const { all, collector } = finished();
      const { recording, commands } = await simulate(pkg, accessTrace(rowsOf(pkg, work), ['even', 'odd']), {
        replay,
        log: true,
        collectors: [collector],
      });
      const T = recording.makespanPs;
      const times = all.map(entered);
      STAGES.forEach((_, s) => {
        // L = lambda x W over the run, which no request began before and none outlasted
        const { integral } = occupancy(
          times.map((t) => t[s]),
          times.map((t) => t[s + 1]),
        );
        const throughput = all.length / T;
        const mean = sum(all.map((r) => r.stages[s])) / all.length;
        expect(integral / T).toBeCloseTo(throughput * mean, 9);
        expect(Math.min(...times.map((t) => t[s]))).toBeGreaterThanOrEqual(0);
      });

      // windows: all from issue to answer
      const windows = occupancy(
        times.map((t) => t[DOWN_QUEUE]),
        all.map((r) => r.donePs),
        'departures',
      );
      expect(sum(recording.engineWindowPs)).toBe(windows.integral);
      if (replay !== 'open') {
        const most = pkg.dies.reduce((n, die) => n + die.engines * die.window, 0);
        expect(windows.most).toBeLessThanOrEqual(most);
      }

      // queues: arrivals from the samples, departures from the last column command of each request in the command log
      recording.dram.reads.forEach((_, p) => {
        for (const [op, names] of [
          [0, ['RD', 'RDA']],
          [1, ['WR', 'WRA']],
        ] as const) {
          const here = all.filter((r) => r.p === p && (op === 1 ? r.op === 1 : r.op !== 1));
          const arrivals = here.map((r) => entered(r)[QUEUE] / memory.clockPs);
          const last = new Map<number, number>();
          for (const c of commands)
            if (c.p === p && (names as readonly string[]).includes(c.command)) last.set(c.request, c.ck);
          // one served from the write queue leaves when it is found there: where its data transfer begins
          const served = here.filter((r) => r.op === 2).map((r) => entered(r)[PREPARATION] / memory.clockPs);
          const { integral, most } = occupancy(arrivals, [...last.values(), ...served]);
          expect([recording.dram.readQueueCk, recording.dram.writeQueueCk][op][p]).toBe(integral);
          const deepest = [recording.dram.readQueueMax, recording.dram.writeQueueMax][op][p];
          expect(deepest).toBe(most);
          expect(deepest).toBeLessThanOrEqual(op === 0 ? memory.controller.readQueue : memory.controller.writeQueue);
        }
      });
    }),
    { seed: 13, numRuns: 40 },
  );
});

it('nothing runs above its ceiling', async () => {
  await fc.assert(
    fc.asyncProperty(anyDesign, anyWork, anyReplay, async (design, work, replay) => {
      const pkg = build(design);
      const [memory] = pkg.memory;
      const { organisation: o } = memory;
      const { recording } = await simulate(pkg, accessTrace(rowsOf(pkg, work), ['even', 'odd']), { replay });
      everyClockIsAccountedFor(pkg, recording);
      const seconds = recording.makespanPs / 1e12;
      const moved = sum(recording.kernels.map((k) => k.movedReadBytes + k.movedWriteBytes));
      expect(moved / seconds).toBeLessThanOrEqual(memory.peakBytesPerS * o.stacks);
      recording.dram.reads.forEach((reads, p) => {
        expect((reads + recording.dram.writes[p]) * o.burst_ck).toBeLessThanOrEqual(recording.elapsedCk);
      });
      recording.links.forEach((record, s) => {
        const { payloadBytesPerS, flitPs } = pkg.links[s];
        expect(record.payloadBytesDown / seconds).toBeLessThanOrEqual(payloadBytesPerS);
        expect(record.payloadBytesUp / seconds).toBeLessThanOrEqual(payloadBytesPerS);
        expect(record.flitsDown * flitPs).toBeLessThanOrEqual(recording.makespanPs);
        expect(record.flitsUp * flitPs).toBeLessThanOrEqual(recording.makespanPs);
      });
      for (const ps of recording.engineComputePs) expect(ps).toBeLessThanOrEqual(recording.makespanPs);
      // compute takes flops over the engine's share of the peak: as long as that, and never faster
      const flops = sum(recording.kernels.map((k) => k.flops));
      expect(sum(recording.engineComputePs)).toBeGreaterThanOrEqual(flops - 1e-6); // 1 flop per ps and engine here
    }),
    { seed: 14, numRuns: 40 },
  );
});

it('stages have the names this file takes them by', () => {
  expect([WAIT, UP_QUEUE].map((s) => STAGES[s])).toEqual(['window_wait', 'up_link_queue']);
  expect(STAGES).toHaveLength(8);
});
