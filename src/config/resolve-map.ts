import { InputError } from '../errors.js';
import { formatBytes, parseBytes } from '../units.js';
import type { AddressMap, FieldName, MemoryGroup } from './package.js';
import { type PackageFile, XOR_TARGETS } from './schema.js';
import { type Place, whole } from './values.js';

type XorTarget = AddressMap['xor'][number]['target'];

/** The address map, checked to be a bijection onto the device: every field has exactly the bits its count needs. */
export function resolveMap(file: PackageFile['address_map'], memory: MemoryGroup, place: Place): AddressMap {
  const { organisation: o } = memory;
  const path = 'address_map';
  const granuleBytes = whole(parseBytes(file.granule, place([path, 'granule'])), place([path, 'granule']), 'bytes');
  if (granuleBytes < o.atom_bytes || granuleBytes % o.atom_bytes !== 0) {
    throw new InputError({
      where: place([path, 'granule']),
      found: `a granule of ${formatBytes(granuleBytes)}`,
      expected: `a multiple of the device's access granularity, ${o.atom_bytes} B`,
    });
  }
  const units = new Set(file.interleave);
  if (units.size !== file.interleave.length || !units.has('stack') || !units.has('channel')) {
    throw new InputError({
      where: place([path, 'interleave']),
      found: `[${file.interleave.join(', ')}]`,
      expected: 'stack and channel once each, and pseudo_channel at most once',
    });
  }
  const counts: Record<FieldName, number> = {
    column: o.columns,
    bank_group: o.bank_groups,
    bank: o.banks_per_group,
    sid: o.sids,
    row: o.rows,
    pseudo_channel: units.has('pseudo_channel') ? 1 : o.pseudo_channels,
  };
  const unitBytes = Object.values(counts).reduce((product, count) => product * count, o.atom_bytes);
  if (unitBytes % granuleBytes !== 0) {
    throw new InputError({
      where: place([path, 'granule']),
      found: `a granule of ${formatBytes(granuleBytes)}`,
      expected: `a granule that divides the ${formatBytes(unitBytes)} of one interleave unit`,
      hint: 'with any other the last addresses would lie outside the device; powers of two always do',
    });
  }
  const bitsOf = (count: number): number => Math.ceil(Math.log2(count));
  const fields = file.fields.map((text) => {
    const [name, bits] = text.split(':');
    return { name: name as FieldName, bits: Number(bits) };
  });
  for (const [name, count] of Object.entries(counts) as [FieldName, number][]) {
    const bits = fields.filter((field) => field.name === name).reduce((sum, field) => sum + field.bits, 0);
    if (bits !== bitsOf(count)) {
      throw new InputError({
        where: place([path, 'fields']),
        found: `${bits} bits of ${name}`,
        expected: `${bitsOf(count)} bits: ${name === 'pseudo_channel' && units.has(name) ? 'the pseudo-channel is interleaved' : `the device has ${count}`}`,
      });
    }
  }
  const uneven = (Object.keys(counts) as FieldName[]).filter((name) => counts[name] !== 2 ** bitsOf(counts[name]));
  if (uneven.length > 1 || (uneven.length === 1 && fields[fields.length - 1].name !== uneven[0])) {
    throw new InputError({
      where: place([path, 'fields']),
      found: `a count of ${uneven.map((name) => `${counts[name]} for ${name}`).join(' and ')}, below other fields`,
      expected: 'at most one count that is no power of two, as the highest field',
    });
  }
  if (fields.reduce((sum, field) => sum + field.bits, 0) > 31) {
    throw new InputError({
      where: place([path, 'fields']),
      found: 'more than 31 bits',
      expected: 'at most 31 bits of atoms in one interleave unit',
    });
  }
  return {
    granuleBytes,
    interleave: file.interleave,
    rotate: file.rotate,
    fields,
    xor: folding(file, memory, counts, place),
  };
}

function folding(
  file: PackageFile['address_map'],
  { organisation: o }: MemoryGroup,
  counts: Readonly<Record<FieldName, number>>,
  place: Place,
): AddressMap['xor'] {
  const all: Record<XorTarget, number> = { ...counts, channel: o.channels, pseudo_channel: o.pseudo_channels };
  const folds = Object.entries(file.xor).map(([key, sources]) => {
    const [target, bitText] = key.split('.') as [XorTarget, string];
    const where = place(['address_map', 'xor', key]);
    const bit = Number(bitText);
    const count = all[target];
    if (2 ** bit >= count || !Number.isInteger(Math.log2(count))) {
      throw new InputError({
        where,
        found: `folding into bit ${bit} of ${target}, of which there are ${count}`,
        expected: 'a bit that a power-of-two count has; other counts cannot be folded',
      });
    }
    const rowBits = sources.map((source) => Number(source.split('.')[1]));
    const twice = sources.find((source, i) => sources.indexOf(source) !== i);
    if (twice !== undefined) {
      throw new InputError({ where, found: `${twice} twice`, expected: 'each row bit once: two of them cancel' });
    }
    const rowCount = Math.ceil(Math.log2(o.rows));
    for (const rowBit of rowBits) {
      if (rowBit >= rowCount) {
        throw new InputError({ where, found: `row.${rowBit}`, expected: `row bits 0 to ${rowCount - 1}` });
      }
    }
    return { target, bit, rowBits };
  });
  // the order has no meaning, so packages that differ in nothing else are equal
  return folds.sort((a, b) => XOR_TARGETS.indexOf(a.target) - XOR_TARGETS.indexOf(b.target) || a.bit - b.bit);
}
