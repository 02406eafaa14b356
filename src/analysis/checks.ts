import type { Package } from '../config/package.js';
import { type Check, type Recording, STACK_CLASSES, STAGES } from '../engine/recording.js';
import type { Delays } from './delays.js';
import { sum } from './sums.js';

const EXACT_BELOW = 2 ** 53; // sums of whole picoseconds are exact below this
const ROUNDING = 1e-9; // relative, for sums above it

/**
 * The engine's own checks, followed by those that only hold between what the engine counted and what the samples say: two ways to
 * the same quantity must meet. A run that was cut short has requests under way, so equalities across the cut are left out.
 */
export function checksOf(pkg: Package, recording: Recording, delays: Delays): Check[] {
  const { dram, kernels, makespanPs, partial } = recording;
  const [{ peakBytesPerS, organisation }] = pkg.memory;
  const checks = [...recording.checks];
  const equal = (name: string, got: number, expected: number, tolerance = 0): void => {
    checks.push({ name, ok: Math.abs(got - expected) <= tolerance, got, expected, tolerance });
  };
  /** How far something is above its limit must be 0. */
  const within = (name: string, excess: number, tolerance: number): void =>
    equal(name, Math.max(0, excess), 0, tolerance);
  const slack = (value: number): number => (value < EXACT_BELOW ? 0 : ROUNDING * value);

  const readStages = sum(delays.reads.map((stage) => stage.sum));
  equal('stage delays of reads add up to their latency (ps)', readStages, delays.readLatency.sum, slack(readStages));
  within('least stage delay below zero (ps)', -delays.least, 0);

  if (!partial) {
    const [, ...afterIssue] = STAGES.map((_, stage) => delays.reads[stage].sum + delays.writes[stage].sum);
    const inWindows = sum(recording.engineWindowPs);
    equal("Little's law, stages after issue (request x ps)", sum(afterIssue), inWindows, ROUNDING * inWindows);
    const asked = sum(kernels.map((kernel) => kernel.readBytes + kernel.writeBytes));
    equal('bytes of samples are those of kernels', sum(delays.kernels.map((kernel) => kernel.bytes)), asked);
    const requests = sum(kernels.map((kernel) => kernel.requests));
    equal('samples are as many as requests', sum(delays.kernels.map((kernel) => kernel.requests)), requests);
    equal('reads served from write queues', delays.forwarded, sum(dram.forwarded));
  }

  const bursts = Array.from(dram.reads, (reads, p) => (reads + dram.writes[p]) * organisation.burst_ck);
  const total = bursts.length * recording.elapsedCk;
  if (sum(recording.bandwidthStack) > 0) {
    let data = 0;
    for (let at = 0; at < recording.bandwidthStack.length; at += STACK_CLASSES.length) {
      data += recording.bandwidthStack[at] + recording.bandwidthStack[at + 1]; // read_data, write_data
    }
    equal('data clocks of the bandwidth stack are those of the bursts', data, sum(bursts));
    equal('bandwidth stack adds up to pseudo-channels x elapsed clocks', sum(recording.bandwidthStack), total);
  }
  within('busiest data bus above its clocks (ck)', Math.max(0, ...bursts) - recording.elapsedCk, 0);
  const moved = sum(kernels.map((kernel) => kernel.movedReadBytes + kernel.movedWriteBytes));
  // the last clock of a run may be a fraction of one
  const couldMove = (peakBytesPerS * organisation.stacks * (makespanPs + pkg.memory[0].clockPs)) / 1e12;
  within('bytes moved above the DRAM peak', moved - couldMove, ROUNDING * couldMove);
  // payload never passes what is left of a flit beside its overhead
  let overfull = 0;
  recording.links.forEach((link, s) => {
    const { flitBytes, flitOverheadBytes } = pkg.links[s];
    const room = flitBytes - flitOverheadBytes;
    overfull = Math.max(
      overfull,
      link.payloadBytesDown - link.flitsDown * room,
      link.payloadBytesUp - link.flitsUp * room,
    );
  });
  within('link payload above what its flits hold (bytes)', overfull, 0);
  const mostCompute = recording.engineComputePs.reduce((most, ps) => Math.max(most, ps), 0);
  within('busiest engine above the makespan (ps)', mostCompute - makespanPs, ROUNDING * makespanPs + 1);
  if (!partial) {
    let over = 0;
    recording.links.forEach((link, s) => {
      over = Math.max(over, Math.max(link.flitsDown, link.flitsUp) * pkg.links[s].flitPs - makespanPs);
    });
    within('busiest link above the makespan (ps)', over, ROUNDING * makespanPs + 1);
  }
  return checks;
}
