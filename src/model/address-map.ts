import type { Domain, FieldName, Package, AddressMap as Spec } from '../config/package.js';
import { memoryOf, systemOf } from './system.js';

/** Bits of an atom number are looked up in slices of this many, one table a slice. */
const SLICE_BITS = 12;
const SLICE_MASK = (1 << SLICE_BITS) - 1;

/**
 * The address map: a bijection between addresses and (pseudo-channel, bank, row, column). Interleaving over stacks and channels
 * is division, so any counts do; inside an interleave unit every output bit is an XOR of address bits, a linear map over
 * GF(2), so three table look-ups and two XORs decode an atom number whatever the fields and the folding
 * (permutation-based interleaving: Zhang, Zhu and Zhang, 2000).
 *
 * With `rotate`, every round over the units is turned by a hash of its number: still one address for each place.
 *
 * `decode` leaves its answer in `p`, `bank`, `row` and `column`, so that nothing is allocated for a request.
 */
export class AddressMap {
  p = 0; // pseudo-channel of the whole package
  bank = 0; // within the pseudo-channel, over stack IDs and bank groups
  row = 0;
  column = 0; // atom within the row
  /** Longest piece that stays in consecutive columns of one row, bytes; pieces are aligned to it. */
  readonly pieceBytes: number;

  private readonly base: Float64Array; // first address of a die's range
  private readonly rotate: boolean;
  private readonly units: Int32Array; // interleave units of a die
  private readonly unitStart: Int32Array; // where a die's units start in unitPlace
  private readonly unitPlace: Int32Array; // pseudo-channel of an interleave unit, before folding
  private readonly granule: number;
  private readonly atomsPerGranule: number;
  private readonly atomBytes: number;
  private readonly low: Int32Array; // atom number bits 0 … 11 -> packed place
  private readonly middle: Int32Array; // bits 12 … 23
  private readonly high: Int32Array; // bits 24 …
  private readonly columnMask: number;
  private readonly bankShift: number;
  private readonly bankMask: number;
  private readonly pseudoShift: number; // -1 when the pseudo-channel is interleaved, not a field
  private readonly pseudoMask: number;
  private readonly rowShift: number;
  private readonly unitFold: readonly { readonly place: number; readonly rowMask: number }[]; // XORs p with parity(row & mask)
  private readonly packed: Record<FieldName, number>; // where each field starts in a packed place

  constructor(
    pkg: Package,
    private readonly domains: readonly Domain[],
    private readonly spec: Spec = pkg.addressMap,
  ) {
    const system = systemOf(pkg);
    const { organisation: o } = memoryOf(pkg);
    this.atomBytes = o.atom_bytes;
    this.granule = spec.granuleBytes;
    this.rotate = spec.rotate;
    this.atomsPerGranule = this.granule / this.atomBytes;
    const bits = (count: number): number => Math.ceil(Math.log2(count));
    const width: Record<FieldName, number> = {
      column: bits(o.columns),
      bank: bits(o.banks_per_group),
      bank_group: bits(o.bank_groups),
      sid: bits(o.sids),
      pseudo_channel: spec.interleave.includes('pseudo_channel') ? 0 : bits(o.pseudo_channels),
      row: bits(o.rows),
    };
    const order: FieldName[] = ['column', 'bank', 'bank_group', 'sid', 'pseudo_channel', 'row'];
    let at = 0;
    this.packed = { column: 0, bank: 0, bank_group: 0, sid: 0, pseudo_channel: 0, row: 0 };
    for (const name of order) {
      this.packed[name] = at;
      at += width[name];
    }
    this.columnMask = (1 << width.column) - 1;
    this.bankShift = this.packed.bank;
    this.bankMask = (1 << (width.bank + width.bank_group + width.sid)) - 1;
    this.pseudoShift = this.packed.pseudo_channel;
    this.pseudoMask = (1 << width.pseudo_channel) - 1;
    this.rowShift = this.packed.row;

    // one packed contribution per atom-number bit: its own field bit, and every bit its row bit is folded into
    const contribution: number[] = [];
    const seen: Record<string, number> = {};
    for (const { name, bits: count } of spec.fields) {
      for (let i = 0; i < count; i++) {
        const bit = seen[name] ?? 0;
        seen[name] = bit + 1;
        let mask = 1 << (this.packed[name] + bit);
        if (name === 'row') {
          for (const fold of spec.xor) {
            const inside =
              fold.target !== 'channel' && !(fold.target === 'pseudo_channel' && width.pseudo_channel === 0);
            if (inside && fold.rowBits.includes(bit)) mask ^= 1 << (this.packed[fold.target as FieldName] + fold.bit);
          }
        }
        contribution.push(mask);
      }
    }
    const table = (slice: number): Int32Array => {
      const out = new Int32Array(1 << SLICE_BITS);
      for (let value = 0; value < out.length; value++) {
        for (let i = 0; i < SLICE_BITS; i++)
          if (value & (1 << i)) out[value] ^= contribution[slice * SLICE_BITS + i] ?? 0;
      }
      return out;
    };
    this.low = table(0);
    this.middle = table(1);
    this.high = table(2);

    const unitFold: { place: number; rowMask: number }[] = [];
    for (const fold of spec.xor) {
      const rowMask = fold.rowBits.reduce((mask, bit) => mask | (1 << bit), 0);
      if (fold.target === 'channel') unitFold.push({ place: (1 << fold.bit) * system.pseudoChannels, rowMask });
      else if (fold.target === 'pseudo_channel' && width.pseudo_channel === 0)
        unitFold.push({ place: 1 << fold.bit, rowMask });
    }
    this.unitFold = unitFold;

    this.base = Float64Array.from(domains, (domain) => domain.base);
    this.units = new Int32Array(domains.length);
    this.unitStart = new Int32Array(domains.length);
    const places: number[] = [];
    domains.forEach((domain, d) => {
      this.unitStart[d] = places.length;
      const radix = spec.interleave.map((unit) =>
        unit === 'stack' ? domain.stacks.length : unit === 'channel' ? o.channels : o.pseudo_channels,
      );
      const count = radix.reduce((product, r) => product * r, 1);
      this.units[d] = count;
      for (let unit = 0; unit < count; unit++) {
        const part = { stack: 0, channel: 0, pseudo_channel: 0 };
        let rest = unit;
        spec.interleave.forEach((name, i) => {
          part[name] = rest % radix[i];
          rest = Math.floor(rest / radix[i]);
        });
        places.push((domain.stacks[part.stack] * o.channels + part.channel) * o.pseudo_channels + part.pseudo_channel);
      }
    });
    this.unitPlace = Int32Array.from(places);

    // the lowest column bits keep a piece in one row; a granule that is no multiple of that shortens it
    let run = 0;
    for (const { name, bits: count } of spec.fields) {
      if (name !== 'column') break;
      run += count;
    }
    let piece = this.atomBytes * 2 ** run;
    while (this.granule % piece !== 0) piece /= 2;
    this.pieceBytes = piece;
  }

  /** Places the atom at a global address of one die's range. The address must lie in that range. */
  decode(domain: number, address: number): void {
    const offset = address - this.base[domain];
    const block = Math.floor(offset / this.granule);
    const units = this.units[domain];
    const local = Math.floor(block / units);
    const atom = local * this.atomsPerGranule + Math.floor((offset - block * this.granule) / this.atomBytes);
    const packed =
      this.low[atom & SLICE_MASK] ^
      this.middle[(atom >>> SLICE_BITS) & SLICE_MASK] ^
      this.high[(atom >>> (2 * SLICE_BITS)) & SLICE_MASK];
    const row = packed >>> this.rowShift;
    let unit = block - local * units;
    if (this.rotate) unit = (unit + turn(local)) % units;
    let p = this.unitPlace[this.unitStart[domain] + unit];
    if (this.unitFold.length > 0) p = this.fold(p, row);
    this.p = p + ((packed >>> this.pseudoShift) & this.pseudoMask);
    this.row = row;
    this.bank = (packed >>> this.bankShift) & this.bankMask;
    this.column = packed & this.columnMask;
  }

  /** The global address of a place, the inverse of `decode`; -1 when the place is not in the domain. */
  encode(domain: number, p: number, bank: number, row: number, column: number): number {
    const inField = p & this.pseudoMask;
    const unitP = this.fold(p - inField, row);
    const start = this.unitStart[domain];
    const units = this.units[domain];
    let unit = this.unitPlace.subarray(start, start + units).indexOf(unitP);
    if (unit < 0) return -1;
    // undo the folding: the row is never changed by it, so its contribution can be XORed out again
    let packed = column | (bank << this.bankShift) | (inField << this.pseudoShift) | (row << this.rowShift);
    for (const { target, bit, rowBits } of this.spec.xor) {
      if (target === 'channel' || (target === 'pseudo_channel' && this.pseudoMask === 0)) continue;
      const mask = rowBits.reduce((sum, b) => sum | (1 << b), 0);
      if (parity(row & mask) === 1) packed ^= 1 << (this.packed[target] + bit);
    }
    let atom = 0;
    let at = 0;
    const seen: Record<string, number> = {};
    for (const { name, bits } of this.spec.fields) {
      for (let i = 0; i < bits; i++) {
        const bit = seen[name] ?? 0;
        seen[name] = bit + 1;
        if ((packed >>> (this.packed[name] + bit)) & 1) atom += 2 ** at;
        at++;
      }
    }
    const local = Math.floor(atom / this.atomsPerGranule);
    const within = (atom - local * this.atomsPerGranule) * this.atomBytes;
    if (this.rotate) unit = (unit + units - (turn(local) % units)) % units;
    return this.base[domain] + (local * units + unit) * this.granule + within;
  }

  /** The die whose range holds an address, -1 when none does. */
  domainOf(address: number): number {
    for (const { die, base, capacity } of this.domains) {
      if (address >= base && address < base + capacity) return die;
    }
    return -1;
  }

  /** Flips the channel and pseudo-channel bits that the row is folded into; its own inverse. */
  private fold(p: number, row: number): number {
    let folded = p;
    for (const { place, rowMask } of this.unitFold) {
      if (parity(row & rowMask) === 1) folded += Math.floor(folded / place) % 2 === 0 ? place : -place;
    }
    return folded;
  }
}

/** By how many units round `local` is turned: a mix of its bits, so that no stride of rounds keeps to a few units. */
function turn(local: number): number {
  let mixed = (local >>> 0) ^ Math.floor(local / 2 ** 32);
  mixed = Math.imul(mixed ^ (mixed >>> 16), 0x45d9f3b);
  mixed = Math.imul(mixed ^ (mixed >>> 15), 0x2c1b3c6d);
  return (mixed ^ (mixed >>> 14)) >>> 4; // below 2^28, so that adding a unit stays exact
}

function parity(value: number): number {
  let v = value;
  v ^= v >>> 16;
  v ^= v >>> 8;
  v ^= v >>> 4;
  return (0x6996 >>> (v & 15)) & 1;
}
