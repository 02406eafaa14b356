/**
 * A keyed bijection on 0 … items - 1 that needs no table: it scatters zipf ranks over a region, so that hot items are not
 * neighbours, and orders a pointer chase, so that every item is visited once a round.
 *
 * Method: an alternating Feistel network (Luby and Rackoff, 1988, made unbalanced so that any number of bits will do) on the
 * least power of two that holds all items; a result outside is sent through again until it falls inside (cycle walking: Black
 * and Rogaway, "Ciphers with arbitrary finite domains", 2002), which keeps the whole a bijection and takes under two turns on
 * average. No cryptographic strength is meant or needed.
 */
import { type NameHash, wordFrom } from '../random.js';

export class Scatter {
  private items = 1;
  private lowSize = 1; // 2^lowBits
  private lowMask = 0;
  private highMask = 0;
  private readonly keys = new Int32Array(4); // one a round

  /** Points the bijection at a number of items (1 … 2^52) and a key. */
  reset(items: number, key: NameHash): void {
    let bits = 0;
    while (2 ** bits < items) bits++;
    this.items = items;
    const lowBits = Math.ceil(bits / 2);
    this.lowSize = 2 ** lowBits;
    this.lowMask = this.lowSize - 1;
    this.highMask = 2 ** (bits - lowBits) - 1;
    for (let round = 0; round < 4; round++) this.keys[round] = wordFrom(key, round);
  }

  /** The place of item number `index`. */
  place(index: number): number {
    const { items, lowSize, lowMask, highMask, keys } = this;
    let value = index;
    do {
      let high = Math.floor(value / lowSize);
      let low = value - high * lowSize;
      high ^= round(low ^ keys[0]) & highMask;
      low ^= round(high ^ keys[1]) & lowMask;
      high ^= round(low ^ keys[2]) & highMask;
      low ^= round(high ^ keys[3]) & lowMask;
      value = high * lowSize + low;
    } while (value >= items);
    return value;
  }
}

/** Mixes a half of up to 26 bits and a key into bits of which the lower ones are good. */
function round(word: number): number {
  let h = Math.imul(word ^ (word >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return h ^ (h >>> 16);
}
