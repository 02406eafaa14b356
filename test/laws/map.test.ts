import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { domains, parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import { AddressMap } from '../../src/model/address-map.js';

/** A package with a device, an interleave and fields; `stacks` per die. */
function mapped(map: MapCase): Package {
  const { o, stacks } = map;
  const dies = stacks.map((_, d) => `  - { name: d${d}, clock: 1 GHz, engines: 1, request: ${o.atom_bytes} B }`);
  let first = 0;
  const links = stacks.map((count, d) => {
    const to = count === 1 ? `hbm.${first}` : `hbm.${first}-${first + count - 1}`;
    first += count;
    return `  - { name: l${d}, from: d${d}, to: ${to}, lanes: 64, rate: 16 GT/s }`;
  });
  const xor = map.xor.map(([target, bit, rows]) => `${target}.${bit}: [${rows.map((r) => `row.${r}`).join(', ')}]`);
  return parsePackage(
    `
penstock: 1
name: map
compute:
${dies.join('\n')}
memory:
  - name: hbm
    device: hbm3-6.4
    stacks: ${first}
    organisation: { ${Object.entries(o)
      .map(([key, value]) => `${key}: ${value}`)
      .join(', ')} }
links:
${links.join('\n')}
address_map:
  interleave: [${map.interleave.join(', ')}]
  granule: ${map.granuleAtoms * o.atom_bytes} B
  rotate: ${map.rotate}
  fields: [${map.fields.join(', ')}]
  xor: { ${xor.join(', ')} }
`,
    'map.yaml',
  );
}

interface MapCase {
  readonly stacks: readonly number[]; // per die
  readonly o: Readonly<
    Record<
      'channels' | 'pseudo_channels' | 'sids' | 'bank_groups' | 'banks_per_group' | 'rows' | 'columns' | 'atom_bytes',
      number
    >
  >;
  readonly interleave: readonly string[];
  readonly granuleAtoms: number;
  readonly rotate: boolean;
  readonly fields: readonly string[];
  readonly xor: readonly (readonly [string, number, readonly number[]])[];
}

const bitsOf = (count: number): number => Math.ceil(Math.log2(count));

/** Random maps; `large` ones have up to 2^14 rows, small ones can be walked atom by atom. */
function anyMap(large: boolean): fc.Arbitrary<MapCase> {
  return fc
    .record({
      stacks: fc.array(fc.integer({ min: 1, max: 6 }), { minLength: 1, maxLength: large ? 3 : 2 }),
      channels: fc.constantFrom(1, 2, 3, 4, 5, 8),
      pseudo_channels: fc.constantFrom(1, 2, 4),
      sids: fc.constantFrom(1, 2, 3, 4),
      bank_groups: fc.constantFrom(1, 2, 4),
      banks_per_group: fc.constantFrom(1, 2, 4),
      rowBits: large ? fc.integer({ min: 4, max: 14 }) : fc.integer({ min: 1, max: 3 }),
      oddRows: fc.boolean(),
      columns: fc.constantFrom(...(large ? [8, 16, 32, 64] : [2, 4])),
      atom_bytes: fc.constantFrom(32, 64),
      granuleAtoms: fc.constantFrom(1, 2, 3, 8, 12, 32),
      rotate: fc.boolean(),
      pseudoIsField: fc.boolean(),
      order: fc.array(fc.nat(1000), { minLength: 40, maxLength: 40 }),
      split: fc.array(fc.boolean(), { minLength: 12, maxLength: 12 }),
      unitOrder: fc.array(fc.nat(1000), { minLength: 3, maxLength: 3 }),
      folds: fc.array(fc.tuple(fc.nat(9), fc.nat(3), fc.array(fc.nat(13), { minLength: 1, maxLength: 3 })), {
        maxLength: 6,
      }),
    })
    .map((r): MapCase => {
      // at most one count that is no power of two may be a field, and it must be the highest
      const odd: 'sid' | 'row' | '' = r.sids === 3 ? 'sid' : r.oddRows ? 'row' : '';
      const rows = odd === 'row' ? 2 ** r.rowBits - (r.rowBits > 1 ? 1 : 0) : 2 ** r.rowBits;
      const shuffled = <T>(items: readonly T[], keys: readonly number[]): T[] =>
        items
          .map((item, i) => ({ item, key: keys[i % keys.length] + i / 1000 }))
          .sort((a, b) => a.key - b.key)
          .map(({ item }) => item);
      const counts = {
        column: bitsOf(r.columns),
        bank_group: bitsOf(r.bank_groups),
        bank: bitsOf(r.banks_per_group),
        sid: bitsOf(r.sids),
        row: bitsOf(rows),
        pseudo_channel: r.pseudoIsField ? bitsOf(r.pseudo_channels) : 0,
      };
      // fields in two parts, so that names return
      const parts: string[] = [];
      Object.entries(counts).forEach(([name, bits], i) => {
        if (bits === 0 || name === odd) return;
        const low = r.split[i] ? Math.floor(bits / 2) : 0;
        if (low > 0) parts.push(`${name}:${low}`);
        parts.push(`${name}:${bits - low}`);
      });
      const fields = shuffled(parts, r.order);
      if (odd !== '' && counts[odd] > 0) fields.push(`${odd}:${counts[odd]}`);
      const units = r.pseudoIsField ? ['stack', 'channel'] : ['stack', 'channel', 'pseudo_channel'];
      const targets: Record<string, number> = {
        bank_group: r.bank_groups,
        bank: r.banks_per_group,
        sid: r.sids,
        channel: r.channels,
        pseudo_channel: r.pseudo_channels,
      };
      const xor = new Map<string, readonly [string, number, readonly number[]]>();
      for (const [which, bit, rowBits] of r.folds) {
        const target = Object.keys(targets)[which % 5];
        const own = bitsOf(targets[target]);
        if (own === 0 || 2 ** own !== targets[target] || counts.row === 0) continue;
        const from = [...new Set(rowBits.map((b) => b % counts.row))];
        xor.set(`${target}.${bit % own}`, [target, bit % own, from]);
      }
      const { channels, pseudo_channels, sids, bank_groups, banks_per_group, columns, atom_bytes } = r;
      return {
        stacks: r.stacks,
        o: { channels, pseudo_channels, sids, bank_groups, banks_per_group, rows, columns, atom_bytes },
        interleave: shuffled(units, r.unitOrder),
        granuleAtoms: r.granuleAtoms,
        rotate: r.rotate,
        fields: fields.length > 0 ? fields : ['column:0'],
        xor: [...xor.values()],
      };
    });
}

/** A granule must divide what one interleave unit holds, or the last granule would reach over the end of the device. */
const fits = ({ o, granuleAtoms, interleave }: MapCase): boolean => {
  const unit = o.sids * o.bank_groups * o.banks_per_group * o.rows * o.columns;
  return (interleave.includes('pseudo_channel') ? unit : unit * o.pseudo_channels) % granuleAtoms === 0;
};

describe('the address map is a bijection', () => {
  it('there and back: encode(decode(a)) is a, and the place is on the device and belongs to the die', () => {
    fc.assert(
      fc.property(
        anyMap(true).filter(fits),
        fc.array(fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }), { minLength: 20, maxLength: 20 }),
        (map, at) => {
          const pkg = mapped(map);
          const { o } = map;
          const places = domains(pkg);
          const m = new AddressMap(pkg, places);
          for (const { die, base, capacity, stacks } of places) {
            for (const fraction of [...at, 0, 1 - 1e-12]) {
              const address = base + Math.floor((fraction * capacity) / o.atom_bytes) * o.atom_bytes;
              expect(m.domainOf(address)).toBe(die);
              m.decode(die, address);
              const { p, bank, row, column } = m;
              expect(row).toBeLessThan(o.rows);
              expect(column).toBeLessThan(o.columns);
              expect(bank).toBeLessThan(o.sids * o.bank_groups * o.banks_per_group);
              expect(stacks).toContain(Math.floor(p / (o.channels * o.pseudo_channels)));
              expect(m.encode(die, p, bank, row, column)).toBe(address);
              // bytes within an atom share its place
              m.decode(die, address + o.atom_bytes - 1);
              expect([m.p, m.bank, m.row, m.column]).toEqual([p, bank, row, column]);
              // a piece is consecutive columns of one row
              const within = address % m.pieceBytes;
              m.decode(die, address - within);
              expect([m.p, m.bank, m.row, m.column + within / o.atom_bytes]).toEqual([p, bank, row, column]);
            }
          }
        },
      ),
      { seed: 21, numRuns: 250 },
    );
  });

  it('decode meets every place of a small device exactly once', () => {
    fc.assert(
      fc.property(anyMap(false).filter(fits), (map) => {
        const pkg = mapped(map);
        const { o } = map;
        const places = domains(pkg);
        const m = new AddressMap(pkg, places);
        const banks = o.sids * o.bank_groups * o.banks_per_group;
        const total =
          map.stacks.reduce((a, b) => a + b, 0) * o.channels * o.pseudo_channels * banks * o.rows * o.columns;
        const met = new Uint8Array(total);
        let walked = 0;
        for (const { die, base, capacity } of places) {
          for (let a = base; a < base + capacity; a += o.atom_bytes) {
            m.decode(die, a);
            met[((m.p * banks + m.bank) * o.rows + m.row) * o.columns + m.column]++;
            walked++;
          }
        }
        expect(walked).toBe(total);
        expect(met.every((times) => times === 1)).toBe(true);
      }),
      { seed: 22, numRuns: 120 },
    );
  });

  it('a granule that does not divide the device is refused, or the last addresses would lie outside it', () => {
    fc.assert(
      fc.property(
        anyMap(false).filter((map) => !fits(map)),
        (map) => {
          expect(() => mapped(map)).toThrow(/granule/);
        },
      ),
      { seed: 23, numRuns: 30 },
    );
  });

  it('folding spreads the rows of one bank over banks and leaves rows and columns alone', () => {
    const map: MapCase = {
      stacks: [1],
      o: {
        channels: 2,
        pseudo_channels: 2,
        sids: 1,
        bank_groups: 4,
        banks_per_group: 4,
        rows: 256,
        columns: 32,
        atom_bytes: 32,
      },
      interleave: ['channel', 'stack', 'pseudo_channel'],
      granuleAtoms: 8,
      rotate: false,
      fields: ['column:5', 'bank_group:2', 'bank:2', 'row:8'],
      xor: [],
    };
    const folded: MapCase = {
      ...map,
      xor: [
        ['bank_group', 0, [0]],
        ['bank_group', 1, [1]],
        ['bank', 0, [2]],
        ['bank', 1, [3]],
      ],
    };
    const [pa, pb] = [mapped(map), mapped(folded)];
    const [a, b] = [new AddressMap(pa, domains(pa)), new AddressMap(pb, domains(pb))];
    const stride = 32 * 32 * 16 * 4; // from one row of a bank to the next
    const banks = [new Set<number>(), new Set<number>()];
    for (let i = 0; i < 16; i++) {
      a.decode(0, i * stride);
      b.decode(0, i * stride);
      banks[0].add(a.bank);
      banks[1].add(b.bank);
      expect([b.row, b.column, b.p]).toEqual([a.row, a.column, a.p]);
    }
    expect(banks.map((set) => set.size)).toEqual([1, 16]);
  });

  it('turned rounds spread a stride of whole rounds over the units, and leave a sequence as even as it was', () => {
    const map: MapCase = {
      stacks: [3],
      o: {
        channels: 8,
        pseudo_channels: 2,
        sids: 1,
        bank_groups: 4,
        banks_per_group: 4,
        rows: 256,
        columns: 32,
        atom_bytes: 32,
      },
      interleave: ['pseudo_channel', 'channel', 'stack'],
      granuleAtoms: 8,
      rotate: true,
      fields: ['column:5', 'bank_group:2', 'bank:2', 'row:8'],
      xor: [],
    };
    const units = 3 * 8 * 2;
    const met = (rotate: boolean, stride: number): number[] => {
      const pkg = mapped({ ...map, rotate });
      const m = new AddressMap(pkg, domains(pkg));
      const counts = new Array<number>(units).fill(0);
      for (let i = 0; i < 100 * units; i++) {
        m.decode(0, i * stride);
        counts[m.p]++;
      }
      return counts;
    };
    // a granule after the other: each unit a hundred times, turned or not
    expect(met(true, 256)).toEqual(new Array(units).fill(100));
    // a round at a time: one unit without; with it all of them, about a hundred times each (five standard deviations: 50)
    expect(met(false, 256 * units).filter((count) => count > 0)).toEqual([100 * units]);
    for (const count of met(true, 256 * units)) expect(Math.abs(count - 100)).toBeLessThan(50);
  });
});
