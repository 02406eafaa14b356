import {
  type Ceilings,
  capacityBytes,
  ceilings,
  refreshLoss,
  stackBytes,
  type UnloadedLatency,
  unloadedLatency,
} from './derive.js';
import { DEVICES } from './devices/index.js';
import { domains } from './domains.js';
import type { AddressMap, ComputeDie, Domain, Link, MemoryGroup, Package } from './package.js';

/** The package as resolved, with what follows from it: the object behind `penstock describe`. */
export interface Description {
  readonly name: string;
  readonly file: string;
  readonly hash: string;
  readonly caution: string;
  readonly capacity_bytes: number;
  readonly peak_bytes_per_s: number;
  readonly refresh_derated_bytes_per_s: number;
  readonly link_ceiling_bytes_per_s: number;
  readonly compute: readonly ComputeDie[];
  readonly memory: readonly (Omit<MemoryGroup, 'clockPs'> & {
    readonly clock_ps: number;
    readonly clock_source: string;
    readonly organisation_sources: Readonly<Record<string, string>>;
    readonly rule_sources: Readonly<Record<string, string>>;
    readonly stack_bytes: number;
    readonly refresh_loss: number;
  })[];
  readonly links: readonly (Link & { readonly ceilings: Ceilings; readonly unloaded_latency_ps: UnloadedLatency })[];
  readonly domains: readonly Domain[];
  readonly address_map: AddressMap & { readonly bits: readonly AddressBit[] };
}

/** One row of the address-bit table: bit of the address inside an interleave unit's own bytes. */
export interface AddressBit {
  readonly bit: number; // counted from the lowest byte bit of one unit's bytes
  readonly field: string; // byte, or field and its bit, for example bank_group.1
  readonly folded_into: readonly string[]; // field bits that this (row) bit is XORed into
}

export function describePackage(pkg: Package): Description {
  const each = pkg.links.map((link) => ({
    ...link,
    ceilings: ceilings(pkg, link),
    unloaded_latency_ps: unloadedLatency(pkg, link),
  }));
  const sum = (f: (c: Ceilings) => number): number => each.reduce((total, link) => total + f(link.ceilings), 0);
  return {
    name: pkg.name,
    file: pkg.file,
    hash: pkg.hash,
    caution: pkg.caution,
    capacity_bytes: capacityBytes(pkg),
    peak_bytes_per_s: sum((c) => c.peak),
    refresh_derated_bytes_per_s: sum((c) => c.refreshDerated),
    link_ceiling_bytes_per_s: sum((c) => c.linkRead),
    compute: pkg.dies,
    memory: pkg.memory.map(({ clockPs, ...group }) => {
      const device = DEVICES.get(group.device);
      return {
        ...group,
        clock_ps: clockPs,
        clock_source:
          device === undefined || Math.abs(clockPs - 1e12 / frequencyOf(device.clock.value)) > 1e-6
            ? 'package file'
            : device.clock.source,
        organisation_sources: Object.fromEntries(
          Object.entries(device?.organisation ?? {}).map(([name, { value, source }]) => [
            name,
            group.organisation[name as keyof typeof group.organisation] === value ? source : 'package file',
          ]),
        ),
        rule_sources: {
          buses: sourceOf(group.buses, device?.buses),
          activate_window_scope: sourceOf(group.activateWindowScope, device?.activateWindowScope),
          refresh_scope: sourceOf(group.refresh.scope, device?.refreshScope),
          postpone: sourceOf(group.refresh.postpone, device?.postpone),
          pull_in: sourceOf(group.refresh.pullIn, device?.pullIn),
          refpb_in_activate_window: sourceOf(group.refresh.refpbInActivateWindow, device?.refpbInActivateWindow),
        },
        stack_bytes: stackBytes({ ...group, clockPs }),
        refresh_loss: refreshLoss({ ...group, clockPs }),
      };
    }),
    links: each,
    domains: domains(pkg),
    address_map: { ...pkg.addressMap, bits: addressBits(pkg) },
  };
}

/** The source of a device's value, or the package file where that says otherwise. */
function sourceOf<T>(value: T, device: { readonly value: T; readonly source: string } | undefined): string {
  const same = device !== undefined && JSON.stringify(value) === JSON.stringify(device.value);
  return same ? device.source : 'package file';
}

function frequencyOf(text: string): number {
  const [number, unit] = text.split(' ');
  return Number(number) * (unit === 'GHz' ? 1e9 : 1e6);
}

function addressBits(pkg: Package): AddressBit[] {
  const { fields, xor } = pkg.addressMap;
  const bits: AddressBit[] = [];
  for (let i = 0; i < Math.log2(pkg.memory[0].organisation.atom_bytes); i++)
    bits.push({ bit: bits.length, field: 'byte', folded_into: [] });
  const seen: Record<string, number> = {};
  for (const { name, bits: count } of fields) {
    for (let i = 0; i < count; i++) {
      const own = seen[name] ?? 0;
      seen[name] = own + 1;
      const into =
        name === 'row'
          ? xor.filter((fold) => fold.rowBits.includes(own)).map((fold) => `${fold.target}.${fold.bit}`)
          : [];
      bits.push({ bit: bits.length, field: `${name}.${own}`, folded_into: into });
    }
  }
  return bits;
}
