import { domains } from '../config/domains.js';
import type { Package } from '../config/package.js';
import { CheckError } from '../errors.js';
import { AddressMap } from '../model/address-map.js';
import { separationsOf } from '../model/separations.js';
import { memoryOf, systemOf } from '../model/system.js';
import type { Trace } from '../trace/batch.js';
import {
  channelsBusy,
  closeAccounts,
  keepInRange,
  lastBurstEndHalf,
  lastWriteEndHalf,
  resetChannels,
  runChannels,
  settleChannels,
} from './channel.js';
import { resetCredits } from './credits.js';
import { drainEgress, egressBusy, resetEgress, skipEgress } from './egress.js';
import { FrontEnd } from './front-end.js';
import { makeWork } from './make-work.js';
import { record } from './record.js';
import type { Collector, Recording, RunOptions } from './recording.js';
import { makeRequests } from './request-records.js';
import { Samples } from './samples.js';
import { Timers } from './timers.js';
import { resetTraffic } from './traffic.js';
import { Runnable } from './work.js';

const OPEN_LOOP_HANDLES = 1 << 16; // requests in flight in open loop; later arrivals wait at their engine
const WINDOWS_PER_BREATH = 512; // windows between two looks at the outside world

/**
 * Runs a trace through a package. Time goes forward in windows (the conservative synchronous method: Chandy and Misra, 1979;
 * Nicol, 1993): the front end handles everything before `front`; the channels may then go on to `back`, the earliest time a
 * request sent from now on can reach a queue; and what they answer cannot be seen by the front end before its next window.
 * Any shorter window gives the same result.
 */
export async function runEngine(
  pkg: Package,
  trace: Trace,
  options: RunOptions,
  collectors: Collector[],
): Promise<Recording> {
  const memory = memoryOf(pkg);
  const system = systemOf(pkg);
  const separations = separationsOf(memory);
  const halfPs = memory.clockPs / 2;
  const least = (f: (link: Package['links'][number]) => number): number => Math.min(...pkg.links.map(f));
  const downPs = least((link) => link.flitPs + link.latencyPs) + memory.baseDie.ingressPs;
  const upPs = least((link) => link.latencyPs) + memory.baseDie.egressPs;
  const roundTripPs = downPs + upPs;
  const windowHalf = Math.max(2, Math.floor(Math.min(options.windowPs, roundTripPs) / halfPs));
  let untilPs = options.untilPs; // brought forward by an interrupt

  // everything that holds state, from the DRAM up to the engines
  const places = domains(pkg);
  const map = new AddressMap(pkg, places);
  resetChannels(system, separations, memory, options);
  resetTraffic();
  const dieOf = new Int32Array(system.total);
  const creditDelay = new Float64Array(system.total);
  for (let p = 0; p < system.total; p++) {
    const link = pkg.links[Math.floor(p / (system.channels * system.pseudoChannels))];
    dieOf[p] = link.die;
    creditDelay[p] = link.latencyPs + memory.baseDie.egressPs;
  }
  resetCredits(
    pkg.dies.map((die) => die.clockPs),
    dieOf,
    creditDelay,
    halfPs,
    Math.max(...creditDelay) + 2 * roundTripPs,
  );
  const closedHandles = pkg.dies.reduce((sum, die) => sum + die.engines * die.window, 0);
  const handles = options.replay === 'open' ? Math.max(OPEN_LOOP_HANDLES, closedHandles) : closedHandles;
  const longest = Math.max(separations.readLatency + separations.burst, 2 * memory.controller.pipelineCk);
  const requests = makeRequests(handles);
  resetEgress(requests, system.stacks, system.channels * system.pseudoChannels, longest + (2 * roundTripPs) / halfPs);
  const runnable = new Runnable(pkg.dies.reduce((sum, die) => sum + die.engines, 0));
  const timers = new Timers(pkg.dies.length);
  const work = makeWork(pkg, trace, places, map, options, timers, runnable);
  const samples = new Samples(collectors);
  const front = new FrontEnd(
    pkg,
    system,
    map,
    work,
    timers,
    runnable,
    samples,
    requests,
    handles,
    options.replay === 'open',
  );

  // rows may be long in coming (a pipe): an interrupt does not wait for them
  const { signal } = options;
  const aborted = new Promise<void>((resolve) => signal?.addEventListener('abort', () => resolve(), { once: true }));
  const more = (): Promise<void> => Promise.race([work.refill(), aborted]);

  let frontPs = 0; // the front end has handled every edge before this
  let backHalf = 0; // the channels have run up to this half clock
  let windows = 0;
  let partial = false;
  for (;;) {
    // nothing under way: go straight to the next thing the front end has to do
    const idle = !channelsBusy() && !egressBusy();
    if (idle) {
      const next = front.nextPs();
      if (next === Number.POSITIVE_INFINITY) {
        if (!work.enough()) {
          await more();
          if (!signal?.aborted) continue;
          partial = true;
        }
        break;
      }
      if (next >= frontPs) frontPs = next + 1;
      // whatever the front end does from `next` on reaches a queue later than that
      const now = Math.floor(next / halfPs) - 2;
      if (now > backHalf) {
        backHalf = now;
        skipEgress(Math.floor(now / 2) - 1);
      }
      keepInRange(backHalf);
    }
    if (frontPs >= untilPs) {
      partial = true;
      frontPs = untilPs;
    }

    // the front end, then the channels, then what they answered goes on the up links
    while (!front.advance(frontPs) && !signal?.aborted) await more();
    const reachHalf = Math.floor((frontPs + downPs) / halfPs);
    backHalf = Math.min(Math.max(backHalf, Math.min(reachHalf, backHalf + windowHalf)), Math.ceil(untilPs / halfPs));
    keepInRange(backHalf);
    runChannels(backHalf);
    if (partial) break;
    const drainTo = Math.floor(backHalf / 2);
    for (let stack = 0; stack < system.stacks; stack++) drainEgress(stack, drainTo, front.answer);
    frontPs = Math.max(frontPs, Math.floor(2 * drainTo * halfPs + upPs));

    if (++windows % WINDOWS_PER_BREATH === 0 || signal?.aborted) {
      options.onProgress?.({ simulatedPs: frontPs, requests: front.answered, bytes: front.bytesAnswered });
      await new Promise(setImmediate); // signals arrive here
      if (signal?.aborted) untilPs = frontPs; // the next turn is the last
    }
  }
  if (!partial && (front.inFlight > 0 || !work.finished())) {
    throw new CheckError(
      `the run stopped with ${front.inFlight} requests in flight and nothing left that could move them`,
    );
  }
  const writesPs = Math.ceil(lastWriteEndHalf() * halfPs);
  const makespanPs = partial ? frontPs : Math.max(front.lastAnswerPs, work.lastEventPs, writesPs);
  let elapsedCk = Math.ceil(makespanPs / memory.clockPs);
  settleChannels(2 * elapsedCk);
  // a run cut short still accounts for the bursts that were under way
  if (partial) elapsedCk = Math.max(elapsedCk, lastBurstEndHalf() / 2);
  closeAccounts(2 * elapsedCk, Math.ceil(front.lastSendPs / halfPs));
  front.close(makespanPs);
  return record(pkg, front, work, { makespanPs, partial, elapsedCk, attribution: options.attribution });
}
