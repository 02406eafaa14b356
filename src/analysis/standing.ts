import type { Package } from '../config/package.js';
import { type Recording, STACK_CLASSES } from '../engine/recording.js';
import { boundsOfLinks } from './bounds.js';
import { sum } from './sums.js';

/**
 * The figures the verdict is derived from. Stacks that moved nothing, or next to nothing, are left out of the bound and of the
 * bandwidth stack: what nobody asked anything of says nothing about what binds.
 */
export interface Standing {
  readonly partial: boolean;
  readonly achieved: number; // bytes a second
  readonly bound: number; // of the stacks in use, bytes a second
  readonly limit: 'dram' | 'link'; // which ceiling that bound is
  readonly stacksInUse: number;
  readonly stacks: number; // of the package
  readonly computeUtilization: number; // 0 … 1, all engines
  readonly busiestEngine: number; // share of the makespan it computed
  /** The busiest direction of any link, and how many links are about as busy. */
  readonly busiestLink: { readonly name: string; readonly direction: 'up' | 'down'; readonly utilization: number };
  readonly linksAlike: number; // links with a direction within a tenth of the busiest
  /** The bandwidth stack of the stacks in use, ck by class of STACK_CLASSES; all 0 when it was not kept. */
  readonly stack: readonly number[];
}

// common practice, no source
const IN_USE = 0.01; // of the bytes of the busiest stack
const ALIKE = 0.9; // of the busiest link's time

export function standingOf(pkg: Package, recording: Recording): Standing {
  const { kernels, dram, engineComputePs, makespanPs, partial } = recording;
  const reads = sum(kernels.map((kernel) => kernel.movedReadBytes));
  const writes = sum(kernels.map((kernel) => kernel.movedWriteBytes));
  const share = (ps: number): number => (makespanPs > 0 ? ps / makespanPs : 0);

  const perStack = dram.reads.length / pkg.links.length; // pseudo-channels
  const atoms = pkg.links.map(({ stack }) => {
    const [from, to] = [stack * perStack, (stack + 1) * perStack];
    return sum(dram.reads.subarray(from, to)) + sum(dram.writes.subarray(from, to));
  });
  const least = IN_USE * Math.max(...atoms);
  const used = pkg.links.filter(({ stack }) => atoms[stack] > 0 && atoms[stack] >= least);
  const { bound, limit } = boundsOfLinks(pkg, used, reads, writes);

  const rowOfClasses = perStack * STACK_CLASSES.length;
  const stack = STACK_CLASSES.map((_, c) => {
    let ck = 0;
    for (const { stack: s } of used) {
      const end = Math.min(recording.bandwidthStack.length, (s + 1) * rowOfClasses);
      for (let at = s * rowOfClasses + c; at < end; at += STACK_CLASSES.length) ck += recording.bandwidthStack[at];
    }
    return ck;
  });

  const links = pkg.links.map(({ name, stack: s, flitPs }) => {
    const { flitsDown, flitsUp } = recording.links[s];
    const direction = flitsUp >= flitsDown ? ('up' as const) : ('down' as const);
    // of a run cut short, the last flits counted may end after it
    return { name, direction, utilization: Math.min(1, share(Math.max(flitsUp, flitsDown) * flitPs)) };
  });
  const busiestLink = links.reduce((most, link) => (link.utilization > most.utilization ? link : most));
  return {
    partial,
    achieved: makespanPs > 0 ? (reads + writes) / (makespanPs / 1e12) : 0,
    bound,
    limit,
    stacksInUse: used.length,
    stacks: pkg.links.length,
    computeUtilization: share(sum(engineComputePs) / engineComputePs.length),
    busiestEngine: share(engineComputePs.reduce((most, ps) => Math.max(most, ps), 0)),
    busiestLink,
    linksAlike: links.filter(({ utilization }) => utilization >= ALIKE * busiestLink.utilization).length,
    stack,
  };
}
