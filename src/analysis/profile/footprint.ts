/**
 * How many different lines a trace touches: counted exactly up to a size, estimated beyond it with HyperLogLog (Flajolet, Fusy,
 * Gandouet and Meunier, 2007), whose standard error with 2^14 registers is 1.04 / sqrt(2^14) = 0.81 %.
 */
const EXACT = 1 << 20; // lines counted one by one
const SLOTS = EXACT * 4; // of the table: at most a quarter full, so that probing stays short
const REGISTER_BITS = 14;
const REGISTERS = 1 << REGISTER_BITS;
const ALPHA = 0.7213 / (1 + 1.079 / REGISTERS);

export const FOOTPRINT_ERROR = 1.04 / Math.sqrt(REGISTERS);

/** A 32-bit hash of a whole number below 2^53: two rounds of the finaliser of MurmurHash3 over its halves. */
export function hash32(value: number, seed = 0): number {
  let h = Math.imul(((value % 4294967296) | 0) ^ seed, 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35) ^ Math.imul(Math.floor(value / 4294967296) | 0, 0x9e3779b1);
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return h ^ (h >>> 16);
}

export class Footprint {
  private readonly slots = new Float64Array(SLOTS).fill(-1); // line numbers
  private count = 0;
  private readonly registers = new Uint8Array(REGISTERS);

  /** Takes a line's number. */
  add(line: number): void {
    const hash = hash32(line);
    const register = hash >>> (32 - REGISTER_BITS);
    // the rank needs more bits than are left of 32: a second hash gives them
    const rank = Math.clz32(hash32(line, 0x2545f491)) + 1;
    if (rank > this.registers[register]) this.registers[register] = rank;
    if (this.count > EXACT) return;
    let at = hash & (SLOTS - 1);
    while (this.slots[at] >= 0) {
      if (this.slots[at] === line) return;
      at = (at + 1) & (SLOTS - 1);
    }
    this.slots[at] = line;
    this.count++;
  }

  /** Whether `lines` is exact. */
  get exact(): boolean {
    return this.count <= EXACT;
  }

  get lines(): number {
    if (this.exact) return this.count;
    let sum = 0;
    for (const rank of this.registers) sum += 2 ** -rank;
    return (ALPHA * REGISTERS * REGISTERS) / sum;
  }
}
