import { InputError } from '../errors.js';
import { formatTime } from '../units.js';
import { stackBytes } from './domains.js';
import type { Package } from './package.js';
import { locate, type Path, type Tree } from './tree.js';

/**
 * What the engine has tables for. The numbers bound memory, not modelling: each is some ten times beyond a large package, and
 * together they keep a run below about 4 GB. The engine refuses nothing that passes here.
 */
const MOST_PSEUDO_CHANNELS = 4096; // an index of this width runs through every array of the channels
const MOST_QUEUE_ENTRIES = 2 ** 20; // 64 B each
const MOST_ENGINES = 4096; // each keeps some 300 KiB of rows, dependencies and stores
const MOST_IN_FLIGHT = 2 ** 21; // 128 B a request, 16 B a tile slot; windows count as long as the widest
const MOST_CREDITS = 2 ** 26; // 2 B for each clock edge, pseudo-channel and queue
const MOST_ANSWERS = 2 ** 25; // 8 B for each DRAM clock and stack
const MOST_BYTES = 2 ** 52; // addresses are whole numbers in doubles

/** Refuses a package that is larger than the engine's tables, naming the limit and the key that sets it. */
export function checkSize(pkg: Package, tree: Tree): void {
  const { dies, memory } = pkg;
  const [{ organisation: o, controller }] = memory;
  const limit = (path: Path, found: number, most: number, what: string): void => {
    if (found <= most) return;
    throw new InputError({
      where: locate(tree, path),
      found: `${found.toLocaleString('en-US')} ${what}`,
      expected: `at most ${most.toLocaleString('en-US')} ${what} in a package`,
    });
  };
  const total = o.stacks * o.channels * o.pseudo_channels;
  limit(['memory', 0, 'stacks'], total, MOST_PSEUDO_CHANNELS, 'pseudo-channels');
  const entries = total * (controller.readQueue + controller.writeQueue);
  limit(['memory', 0, 'controller'], entries, MOST_QUEUE_ENTRIES, 'queue entries');
  const engines = dies.reduce((sum, die) => sum + die.engines, 0);
  limit(['compute'], engines, MOST_ENGINES, 'engines');
  const widest = Math.max(...dies.map((die) => die.window));
  limit(['compute'], engines * widest, MOST_IN_FLIGHT, 'outstanding requests (engines x widest window)');
  limit(['memory', 0], o.stacks * stackBytes(memory[0]), MOST_BYTES, 'bytes');
  checkUnderWay(pkg, tree);
}

/**
 * From a die to its memory and back, ps, on the shortest ways: time goes forward in windows of this length. `down` is the soonest
 * a request can reach a queue, `up` the soonest that what a queue answers, or frees, can be seen by a die.
 */
export function shortestRoundTrip({ links, memory }: Package): { readonly down: number; readonly up: number } {
  const [{ baseDie }] = memory;
  return {
    down: Math.min(...links.map((link) => link.flitPs + link.latencyPs)) + baseDie.ingressPs,
    up: Math.min(...links.map((link) => link.latencyPs)) + baseDie.egressPs,
  };
}

/** Credits and answers under way are kept by the clock at which they arrive, so long ways on fast clocks take room. */
function checkUnderWay(pkg: Package, tree: Tree): void {
  const { dies, links, memory } = pkg;
  const [{ organisation: o, clockPs, baseDie, timings, controller }] = memory;
  const { down, up } = shortestRoundTrip(pkg);
  const longestUp = Math.max(...links.map((link) => link.latencyPs)) + baseDie.egressPs;
  const fits = (clocks: number, lanes: number, most: number): boolean =>
    2 ** Math.ceil(Math.log2(clocks + 4)) * lanes <= most;

  const dieClockPs = Math.min(...dies.map((die) => die.clockPs));
  const pseudoChannels = o.stacks * o.channels * o.pseudo_channels;
  if (!fits((longestUp + 2 * (down + up)) / dieClockPs + 1, 2 * pseudoChannels, MOST_CREDITS)) {
    throw new InputError({
      where: locate(tree, ['links']),
      found: `a round trip of ${formatTime(down + longestUp)} at a compute clock of ${formatTime(dieClockPs)} for ${pseudoChannels} pseudo-channels`,
      expected: 'fewer clocks a round trip or fewer pseudo-channels: their credits under way would not fit in memory',
    });
  }
  const answerCk = Math.max(timings.RL.ck + o.burst_ck, controller.pipelineCk);
  if (!fits(2 * answerCk + (4 * (down + up)) / clockPs + 1, o.stacks, MOST_ANSWERS)) {
    throw new InputError({
      where: locate(tree, ['links']),
      found: `a round trip of ${formatTime(down + longestUp)} and answers that take ${answerCk} ck at a DRAM clock of ${formatTime(clockPs)} for ${o.stacks} stacks`,
      expected: 'fewer clocks a round trip or fewer stacks: their answers under way would not fit in memory',
    });
  }
}
