import { describe, expect, it } from 'vitest';
import type { Package } from '../../src/config/package.js';
import type { Collector, SampleBlock } from '../../src/engine/index.js';
import { stream } from '../../src/random.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';

/*
 * One direction of a link as a server by itself: writes whose header and data fill one flit exactly, on a single lane at 4 GT/s,
 * so that a service is 128 ns, 205 die clocks, and everything behind it is idle nearly always.
 */
const SERVICE = 128_000; // ps

const slowLink = (...overrides: string[]): Package =>
  smallPackage(
    'links.0.lanes=1',
    'links.0.rate=4 GT/s',
    'links.0.flit=64 B',
    'links.0.flit_overhead=16 B', // 48 B: a header of 16 B and an atom
    'compute.0.engines=1',
    ...overrides,
  );

/** A write a row, to random atoms of the whole stack, at Poisson times. */
function* poisson(count: number, utilisation: number): Generator<Row> {
  const random = stream('1', 'arrivals', Math.round(utilisation * 100));
  let time = 0;
  for (let i = 0; i < count; i++) {
    time += (-Math.log(1 - random.double()) * SERVICE) / utilisation;
    yield { op: 'W', address: 32 * Math.floor(random.double() * 2 ** 28), bytes: 32, timePs: Math.round(time) };
  }
}

describe('M/D/1: waiting before the link', () => {
  /*
   * Saylor Academy, "Formulation of Queueing Models", section 4.5: Wq = rho S / (2 (1 - rho)); S is the service.
   * Interval, chosen beforehand (batch means; Law and Kelton, Simulation Modeling and Analysis, ch. 9): 20 batches, 99 %,
   * t(19, 0.995) = 2.861, widened by one die clock (0.5 % of a service), in which the engine may hold a request that has
   * arrived. And the interval must be narrow enough to tell: within 10 % of the mean.
   */
  const BATCHES = 20;
  const T = 2.861;
  const CLOCK = 625 / SERVICE;

  it.each([
    { rho: 0.5, waiting: 0.5, batch: 5_000 },
    { rho: 0.8, waiting: 2, batch: 15_000 },
    { rho: 0.9, waiting: 4.5, batch: 40_000 },
  ])('at a utilisation of $rho: $waiting services', async ({ rho, waiting, batch }) => {
    const pkg = slowLink();
    expect(pkg.links[0].flitPs).toBeCloseTo(SERVICE, 6);
    const sums = new Float64Array(BATCHES + 1); // of waiting; the first is warm-up
    let seen = 0;
    let last = 0;
    const collector: Collector = {
      add({ count, stages, donePs }: SampleBlock) {
        for (let i = 0; i < count; i++) sums[Math.floor(seen++ / batch)] += stages[0][i] + stages[1][i];
        last = donePs[count - 1];
      },
    };
    const count = (BATCHES + 1) * batch;
    const { recording } = await simulate(pkg, accessTrace(poisson(count, rho)), {
      replay: 'open',
      attribution: false,
      collectors: [collector],
    });
    expect(seen).toBe(count);
    expect(recording.links[0].flitsDown).toBe(count); // a flit a message: the server is deterministic
    expect(Math.abs((recording.links[0].flitsDown * SERVICE) / last / rho - 1)).toBeLessThan(0.02); // the load asked for

    const means = [...sums.subarray(1)].map((total) => total / batch / SERVICE);
    const mean = means.reduce((a, b) => a + b) / BATCHES;
    const variance = means.reduce((a, b) => a + (b - mean) ** 2, 0) / (BATCHES - 1);
    const half = T * Math.sqrt(variance / BATCHES);
    expect((rho * 1) / (2 * (1 - rho))).toBeCloseTo(waiting, 10);
    expect(half).toBeLessThan(0.1 * waiting);
    expect(Math.abs(mean - waiting)).toBeLessThanOrEqual(half + CLOCK);
  });
});

describe('a closed network: N requests round and round through one slow station', () => {
  /*
   * Lazowska, Zahorjan, Graham and Sevcik, Quantitative System Performance, 1984, ch. 5, from memory: X(N) is at most
   * min(1 / Dmax, N / (D + Z)), and the two bounds cross at N* = (D + Z) / Dmax.
   * Tolerance, chosen beforehand: both bounds met within 2 % at their ends (one request; four times N*), which is room for the
   * rounding to clocks of a round trip; exceeded nowhere, but for the requests at either end of the run.
   */
  const ROWS = 4000;
  const NEAR = 0.02;

  async function throughput(window: number): Promise<{ perPs: number; roundPs: number }> {
    const pkg = slowLink(`compute.0.window=${window}`, 'links.0.latency=400 ns');
    function* rows(): Generator<Row> {
      for (let i = 0; i < ROWS; i++) yield { op: 'W', address: 256 * i, bytes: 32 };
    }
    const done: number[] = [];
    const collector: Collector = {
      add({ count, donePs }: SampleBlock) {
        for (let i = 0; i < count; i++) done.push(donePs[i]);
      },
    };
    await simulate(pkg, accessTrace(rows()), { collectors: [collector] });
    const from = ROWS / 10;
    return { perPs: (ROWS - 1 - from) / (done[ROWS - 1] - done[from]), roundPs: done[0] };
  }

  it('stays below both bounds and meets them at the ends', async () => {
    const { perPs: lone, roundPs } = await throughput(1);
    // the way round by hand: a flit down, the flight, the way in, the controller's pipeline, the way out, a flit up, the flight
    const byHand = 128_000 + 400_000 + 5_000 + 5_000 + 5_000 + 128_000 + 400_000;
    expect(Math.abs(roundPs / byHand - 1)).toBeLessThan(0.005); // whole clocks at both ends
    expect(Math.abs(lone * byHand - 1)).toBeLessThanOrEqual(NEAR);

    const knee = byHand / SERVICE;
    let before = 0;
    for (const n of [1, 2, 3, 4, 6, 8, 10, 12, 16, 24, Math.ceil(4 * knee)]) {
      const { perPs } = await throughput(n);
      const bound = Math.min(1 / SERVICE, n / byHand);
      expect(perPs).toBeLessThanOrEqual(bound * (1 + 1e-3)); // an edge of the measured stretch: one of 3600
      expect(perPs).toBeGreaterThanOrEqual(before * (1 - 1e-3));
      before = perPs;
    }
    expect(before * SERVICE).toBeGreaterThanOrEqual(1 - NEAR);
  });
});

describe("latency-bound: Little's law", () => {
  /*
   * J. D. C. Little, 1961: N in flight and T each makes X = N / T. A pointer chase of 64 B reads that find their bank closed; T by
   * hand from the device's timings. Tolerance, chosen beforehand: 3 %: answers and requests wait for whole clocks at the die and at
   * the controller, up to 1.25 ns of 53, and several chains sometimes meet at a bank or bus.
   */
  it.each([1, 2, 4])('%i chains of dependent 64 B reads', async (chains) => {
    const pkg = smallPackage(`compute.0.engines=${chains}`, 'memory.0.controller.page=closed');
    const [link] = pkg.links;
    const [{ timings, clockPs, organisation, baseDie }] = pkg.memory;
    const ck = timings.tRCDRD.ck + timings.tCCD_L.ck + timings.RL.ck + organisation.burst_ck;
    const down = link.flitPs + link.latencyPs + baseDie.ingressPs;
    const up = baseDie.egressPs + link.flitPs + link.latencyPs;
    const T = down + ck * clockPs + up;
    const random = stream('1', 'chase', chains);
    const each = 3000;
    function* rows(): Generator<Row> {
      for (let i = 0; i < each * chains; i++) {
        const address = 64 * Math.floor(random.double() * 2 ** 27);
        yield { op: 'R', address, bytes: 64, engine: i % chains, after: 1 };
      }
    }
    const { recording } = await simulate(pkg, accessTrace(rows()));
    const X = (each * chains * 64) / recording.makespanPs;
    expect(Math.abs(X / ((chains * 64) / T) - 1)).toBeLessThanOrEqual(0.03);
  });
});
