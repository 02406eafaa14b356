import { InputError } from '../errors.js';
import { formatBytes } from '../units.js';
import { stackBytes } from './domains.js';
import type { Package } from './package.js';
import { locate, type Path, type Tree } from './tree.js';

/** Checks between the parts of a package: requests fit the device, links can carry one, landing buffers can take one. */
export function checkPackage(pkg: Package, tree: Tree): void {
  checkSize(pkg, tree);
  checkRoundTrip(pkg, tree);
  const { atom_bytes: atom } = pkg.memory[0].organisation;
  const rowBytes = atom * pkg.memory[0].organisation.columns;
  pkg.dies.forEach((die, d) => {
    if (die.requestBytes % atom !== 0 || die.requestBytes > 65536) {
      throw new InputError({
        where: locate(tree, ['compute', d, 'request']),
        found: `requests of ${formatBytes(die.requestBytes)}`,
        expected: `a multiple of the device's ${atom} B, at most 64 KiB`,
      });
    }
  });
  for (const link of pkg.links) {
    const index = linkIndex(pkg, link.name, tree);
    const longest = Math.min(pkg.dies[link.die].requestBytes, pkg.addressMap.granuleBytes, rowBytes);
    if (link.landingBytes < longest) {
      throw new InputError({
        where: locate(tree, ['links', index, 'landing']),
        found: `a landing buffer of ${formatBytes(link.landingBytes)}`,
        expected: `room for one request, ${formatBytes(longest)}: with less no read could ever be sent`,
      });
    }
  }
}

/** Index in the file of the entry a resolved link came from. */
function linkIndex(pkg: Package, name: string, tree: Tree): number {
  const list = tree.kind === 'map' ? tree.entries.get('links')?.value : undefined;
  if (list?.kind !== 'list') return 0;
  const base = pkg.links.some((link) => link.name === name) ? name : '';
  return Math.max(
    0,
    list.items.findIndex((item) => {
      const own = item.kind === 'map' ? item.entries.get('name')?.value : undefined;
      return own?.kind === 'scalar' && (base === own.value || base.replace(/\.\d+$/, '') === own.value);
    }),
  );
}

/** The engine's tables: pseudo-channels, queue entries of the package, and requests in flight of all engines. */
const MOST_PSEUDO_CHANNELS = 4096;
const MOST_QUEUE_ENTRIES = 2 ** 20;
const MOST_IN_FLIGHT = 2 ** 21;

function checkSize({ dies, memory }: Package, tree: Tree): void {
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
  const inFlight = dies.reduce((sum, die) => sum + die.engines * die.window, 0);
  limit(['compute'], inFlight, MOST_IN_FLIGHT, 'outstanding requests (engines x window)');
  limit(['memory', 0], o.stacks * stackBytes(memory[0]), 2 ** 52, 'bytes');
}

/** Time goes forward in windows as long as the shortest round trip, so there must be one. */
function checkRoundTrip({ links, memory }: Package, tree: Tree): void {
  const [{ baseDie, clockPs }] = memory;
  const least =
    Math.min(...links.map((link) => link.flitPs + 2 * link.latencyPs)) + baseDie.ingressPs + baseDie.egressPs;
  if (least >= 2 * clockPs) return;
  throw new InputError({
    where: locate(tree, ['links', 0]),
    found: `${least.toPrecision(3)} ps from a die to its memory and back (flit, latencies, ingress, egress)`,
    expected: `at least two DRAM clocks, ${(2 * clockPs).toPrecision(4)} ps`,
  });
}
