/** How a package's address map spreads a trace over stacks, channels and banks, and what rows it would find open. */
import { domains, type Package } from '../../config/index.js';
import { AddressMap } from '../../model/address-map.js';
import { Frequent } from './frequent.js';

/** Evenness of counts: their mean and largest, and how many equal ones would be as uneven, (sum n)^2 / sum n^2. */
export interface Evenness {
  readonly places: number;
  readonly mean_share: number;
  readonly max_share: number;
  readonly effective: number;
}

export interface SpreadResult {
  readonly atoms: number;
  readonly stacks: Evenness;
  readonly channels: Evenness;
  readonly pseudo_channels: Evenness;
  readonly banks: Evenness;
  readonly row_hit_share: number; // of pieces that find their row open when each bank keeps its last row, in the order of the trace
  readonly hot_rows: readonly { readonly place: string; readonly share: number }[]; // of atoms
}

export class Spread {
  private readonly map: AddressMap;
  private readonly atoms: Float64Array; // by bank of the package
  private readonly openRow: Int32Array;
  private readonly rows = new Frequent(4096);
  private readonly banks: number;
  private readonly dieOf: (address: number) => number;
  private pieces = 0;
  private hits = 0;

  constructor(private readonly pkg: Package) {
    const places = domains(pkg);
    this.map = new AddressMap(pkg, places);
    const { organisation: o } = pkg.memory[0];
    this.banks = o.sids * o.bank_groups * o.banks_per_group;
    const total = o.stacks * o.channels * o.pseudo_channels * this.banks;
    this.atoms = new Float64Array(total);
    this.openRow = new Int32Array(total).fill(-1);
    this.dieOf = (address) => this.map.domainOf(address);
  }

  add(address: number, bytes: number): void {
    const { map } = this;
    const { organisation: o } = this.pkg.memory[0];
    for (let at = address; at < address + bytes; ) {
      const end = Math.min(address + bytes, at - (at % map.pieceBytes) + map.pieceBytes);
      map.decode(this.dieOf(at), at);
      const bank = map.p * this.banks + map.bank;
      const atoms = Math.ceil(end / o.atom_bytes) - Math.floor(at / o.atom_bytes);
      this.atoms[bank] += atoms;
      this.pieces++;
      if (this.openRow[bank] === map.row) this.hits++;
      this.openRow[bank] = map.row;
      for (let i = 0; i < atoms; i++) this.rows.add(bank * o.rows + map.row);
      at = end;
    }
  }

  result(): SpreadResult {
    const { organisation: o } = this.pkg.memory[0];
    const grouped = (size: number): Evenness => {
      const sums = new Float64Array(this.atoms.length / size);
      this.atoms.forEach((n, i) => {
        sums[Math.floor(i / size)] += n;
      });
      return evenness(sums);
    };
    const total = this.atoms.reduce((a, b) => a + b, 0);
    const pcs = o.channels * o.pseudo_channels;
    return {
      atoms: total,
      stacks: grouped(pcs * this.banks),
      channels: grouped(o.pseudo_channels * this.banks),
      pseudo_channels: grouped(this.banks),
      banks: grouped(1),
      row_hit_share: this.pieces === 0 ? 0 : this.hits / this.pieces,
      hot_rows: this.rows.top(5).map(({ value, count }) => {
        const [bank, row] = [Math.floor(value / o.rows), value % o.rows];
        const p = Math.floor(bank / this.banks);
        const place = `stack ${Math.floor(p / pcs)} channel ${Math.floor((p % pcs) / o.pseudo_channels)}.${p % o.pseudo_channels} bank ${bank % this.banks} row ${row}`;
        return { place, share: count / total };
      }),
    };
  }
}

function evenness(counts: Float64Array): Evenness {
  let sum = 0;
  let squares = 0;
  let max = 0;
  for (const n of counts) {
    sum += n;
    squares += n * n;
    max = Math.max(max, n);
  }
  const places = counts.length;
  return {
    places,
    mean_share: 1 / places,
    max_share: sum > 0 ? max / sum : 0,
    effective: squares > 0 ? (sum * sum) / squares : 0,
  };
}
