/**
 * The granule patterns: uniform, zipf and chase. Every access is `granule` bytes at a granule-aligned place of the region. The
 * bytes of a share become ceil(bytes / granule) accesses, rounded up once a die and side, not once a tile.
 *
 * chase visits the items of the region in the order of a keyed bijection, tile after tile: after as many accesses as there are
 * items each has been visited once, and the round begins again.
 */
import { copyWords, hashSeed, mixNumber, type NameHash, type RandomStream, streamFrom } from '../random.js';
import type { Pattern } from './batch.js';
import { Scatter } from './scatter.js';
import { ZipfRanks } from './zipf.js';

const NO_RANDOM: RandomStream = streamFrom(hashSeed(''));

export class GranuleWalk {
  private pattern: Pattern | null = null;
  private base = 0; // first address of the region
  private granule = 1; // bytes of one access
  private items = 1; // granules in the region
  private readonly regionName: NameHash = { x: 0, y: 0, z: 0, w: 0 }; // what the region's random order depends on
  private readonly tileName: NameHash = { x: 0, y: 0, z: 0, w: 0 }; // the same and the tile
  private readonly scatter = new Scatter();
  private readonly ranks = new ZipfRanks();

  private random = NO_RANDOM; // the tile's stream (uniform, zipf)
  private left = 0; // accesses still to make
  private index = 0; // chase: number in the round of the next access

  /** Points the walk at a region; `name` is the hash its random order depends on. */
  enter(pattern: Pattern, base: number, span: number, name: NameHash): void {
    this.pattern = pattern;
    this.base = base;
    this.granule = pattern.granule;
    this.items = Math.max(1, Math.floor(span / pattern.granule));
    copyWords(name, this.regionName);
    if (pattern.name === 'zipf') this.ranks.reset(this.items, pattern.s);
    if (pattern.name !== 'uniform') this.scatter.reset(this.items, name);
  }

  /** Starts tile `tile`, which stands for bytes `from` … `to` of the share. */
  begin(from: number, to: number, tile: number): void {
    const first = Math.ceil(from / this.granule);
    this.left = Math.ceil(to / this.granule) - first;
    if ((this.pattern as Pattern).name === 'chase') this.index = first % this.items;
    else this.random = streamFrom(mixNumber(copyWords(this.regionName, this.tileName), tile));
  }

  fill(address: Float64Array, bytes: Int32Array, from: number, room: number): number {
    const { random, ranks, scatter, base, granule, items } = this;
    const count = Math.min(room, this.left);
    const end = from + count;
    this.left -= count;
    switch ((this.pattern as Pattern).name) {
      case 'zipf':
        for (let i = from; i < end; i++) {
          address[i] = base + scatter.place(ranks.draw(random) - 1) * granule;
          bytes[i] = granule;
        }
        break;
      case 'chase': {
        let { index } = this;
        for (let i = from; i < end; i++) {
          address[i] = base + scatter.place(index) * granule;
          bytes[i] = granule;
          if (++index === items) index = 0;
        }
        this.index = index;
        break;
      }
      default:
        if (items <= 4194304) {
          // up to 2^22 items, 32 random bits leave them at most 0.1 % unequal in likelihood
          for (let i = from; i < end; i++) {
            address[i] = base + Math.floor(random() * items) * granule;
            bytes[i] = granule;
          }
        } else {
          for (let i = from; i < end; i++) {
            address[i] = base + Math.floor(random.double() * items) * granule;
            bytes[i] = granule;
          }
        }
    }
    return count;
  }
}
