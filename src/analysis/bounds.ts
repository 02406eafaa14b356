import { ceilings } from '../config/derive.js';
import type { Link, Package } from '../config/package.js';

/** Ceilings of bandwidth over a set of compute dies and the stacks they own, bytes a second. */
export interface Bounds {
  readonly peak: number; // DRAM data buses
  readonly refreshDerated: number; // less all-bank refresh
  readonly link: number; // what the links carry of this mix of reads and writes
  readonly bound: number; // the lesser of the last two
  readonly limit: 'dram' | 'link';
}

/** The ceilings of the stacks that `dies` own, see boundsOfLinks. */
export function boundsOf(pkg: Package, dies: readonly number[], readBytes: number, writeBytes: number): Bounds {
  const links = pkg.links.filter(({ die }) => dies.includes(die));
  return boundsOfLinks(pkg, links, readBytes, writeBytes);
}

/**
 * The ceilings that hold for a mix of `readBytes` and `writeBytes` spread evenly over the stacks behind `links`. Read data crosses
 * the up links and write data the down links at the same time, so the links need the longer of the two times; headers are those of
 * the longest requests, so no traffic can beat it.
 */
export function boundsOfLinks(pkg: Package, links: readonly Link[], readBytes: number, writeBytes: number): Bounds {
  let peak = 0;
  let refreshDerated = 0;
  let up = 0;
  let down = 0;
  for (const link of links) {
    const stack = ceilings(pkg, link);
    peak += stack.peak;
    refreshDerated += stack.refreshDerated;
    up += stack.linkRead;
    down += stack.linkWrite;
  }
  // without traffic the ceiling is that of reads
  const busy = Math.max(readBytes / up, writeBytes / down);
  const link = busy > 0 ? (readBytes + writeBytes) / busy : up;
  return {
    peak,
    refreshDerated,
    link,
    bound: Math.min(refreshDerated, link),
    limit: link < refreshDerated ? 'link' : 'dram',
  };
}

/** Every compute die of the package. */
export function allDies(pkg: Package): number[] {
  return pkg.dies.map((_, die) => die);
}
