import { InputError } from '../errors.js';
import { formatBytes, formatTime } from '../units.js';
import { checkSize, shortestRoundTrip } from './check-size.js';
import { pieceBytes } from './derive.js';
import type { Package } from './package.js';
import { locate, type Tree } from './tree.js';

const MOST_REQUEST = 2 ** 16; // bytes

/** Checks between the parts of a package: it fits the engine, requests fit the device, landing buffers can take one. */
export function checkPackage(pkg: Package, tree: Tree): void {
  checkSize(pkg, tree);
  checkRoundTrip(pkg, tree);
  const { atom_bytes: atom } = pkg.memory[0].organisation;
  pkg.dies.forEach((die, d) => {
    if (die.requestBytes % atom !== 0 || die.requestBytes > MOST_REQUEST) {
      throw new InputError({
        where: locate(tree, ['compute', d, 'request']),
        found: `requests of ${formatBytes(die.requestBytes)}`,
        expected: `a multiple of the device's ${atom} B, at most 64 KiB`,
      });
    }
  });
  for (const link of pkg.links) {
    // a request that does not start with an atom touches one more than its length asks for
    const longest = Math.min(pieceBytes(pkg), pkg.dies[link.die].requestBytes + atom);
    if (link.landingBytes < longest) {
      throw new InputError({
        where: locate(tree, ['links', linkIndex(link.name, tree), 'landing']),
        found: `a landing buffer of ${formatBytes(link.landingBytes)}`,
        expected: `room for the atoms of one request, ${formatBytes(longest)}: with less a read might never be sent`,
      });
    }
  }
}

/** Index in the file of the entry a resolved link came from: that of its name, or of its name before the number of a range. */
function linkIndex(name: string, tree: Tree): number {
  const list = tree.kind === 'map' ? tree.entries.get('links')?.value : undefined;
  if (list?.kind !== 'list') return 0;
  const called = (wanted: string): number =>
    list.items.findIndex((item) => {
      const own = item.kind === 'map' ? item.entries.get('name')?.value : undefined;
      return own?.kind === 'scalar' && own.value === wanted;
    });
  const own = called(name);
  return Math.max(0, own >= 0 ? own : called(name.replace(/\.\d+$/, '')));
}

/** Time goes forward in windows as long as the shortest round trip, so there must be one. */
function checkRoundTrip(pkg: Package, tree: Tree): void {
  const [{ clockPs }] = pkg.memory;
  const { down, up } = shortestRoundTrip(pkg);
  if (down + up >= 2 * clockPs) return;
  throw new InputError({
    where: locate(tree, ['links']),
    found: `${formatTime(down + up)} from a die to its memory and back (flit, latencies, ingress, egress)`,
    expected: `at least two DRAM clocks, ${formatTime(2 * clockPs)}`,
  });
}
