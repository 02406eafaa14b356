import { InputError } from '../errors.js';
import { formatBytes } from '../units.js';
import type { Package } from './package.js';
import { locate, type Tree } from './tree.js';

/** Checks between the parts of a package: requests fit the device, links can carry one, landing buffers can take one. */
export function checkPackage(pkg: Package, tree: Tree): void {
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
