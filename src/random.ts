/**
 * Seeded random streams. A stream is named by a seed and any number of keys (numbers or words); equal names give equal numbers,
 * and streams of different names are independent for every practical purpose: the name is hashed to 128 bits, which become the
 * state of a xor128 generator (Marsaglia, "Xorshift RNGs", Journal of Statistical Software 8(14), 2003) from seedrandom.
 *
 * Hot code that opens a stream per tile keeps the hash of the fixed part of the name and mixes the rest in as numbers:
 * `streamFrom(mixNumber(copyWords(base, scratch), tile))` equals `stream(seed, …, tile)`.
 */
import seedrandom from 'seedrandom';

/** `()` is a double in [0, 1) of 32 random bits, `.double()` one of 53 bits, `.int32()` a signed 32-bit integer. */
export type RandomStream = seedrandom.PRNG;

export type StreamKey = string | number;

/** The 128-bit hash of a stream's name so far. */
export interface NameHash {
  x: number;
  y: number;
  z: number;
  w: number;
}

/** Opens the stream named by a seed and keys. */
export function stream(seed: string, ...keys: readonly StreamKey[]): RandomStream {
  const hash = hashSeed(seed);
  for (const key of keys) typeof key === 'number' ? mixNumber(hash, key) : mixText(hash, key);
  return streamFrom(hash);
}

export function hashSeed(seed: string): NameHash {
  // the starting words are the first 32-bit fractions of the square roots of 2, 3, 5 and 7: digits nobody chose
  return mixText({ x: 0x6a09e667, y: 0xbb67ae85, z: 0x3c6ef372, w: 0xa54ff53a }, seed);
}

/** Overwrites `to` with `from` and returns `to`. */
export function copyWords(from: NameHash, to: NameHash): NameHash {
  to.x = from.x;
  to.y = from.y;
  to.z = from.z;
  to.w = from.w;
  return to;
}

/** Adds a number below 2^53 in magnitude to the name. */
export function mixNumber(hash: NameHash, key: number): NameHash {
  mixWord(hash, key | 0);
  // the upper half as well, so that 0 and 2^32 are different keys
  if (key !== (key | 0)) mixWord(hash, Math.floor(key / 4294967296) ^ 0x5bd1e995);
  return hash;
}

/** Adds a word to the name; the length goes in too, so that ('ab', 'c') and ('a', 'bc') are different names. */
export function mixText(hash: NameHash, key: string): NameHash {
  mixWord(hash, ~key.length);
  for (let i = 0; i < key.length; i++) mixWord(hash, key.charCodeAt(i));
  return hash;
}

/** Opens the stream of a hashed name. The hash itself is left as it is. */
export function streamFrom(hash: NameHash): RandomStream {
  const x = avalanche(hash.x ^ hash.w);
  const y = avalanche(hash.y + x);
  const z = avalanche(hash.z ^ y);
  // an all-zero state would stay zero for ever, and an odd word rules it out
  const w = avalanche(hash.w + z) | 1;
  return seedrandom.xor128('', { state: { x, y, z, w } });
}

/** A 32-bit integer made of the name, for keyed permutations; `salt` tells several of them apart. */
export function wordFrom(hash: NameHash, salt: number): number {
  return avalanche(
    hash.x + avalanche(hash.y ^ avalanche(hash.z + avalanche(hash.w ^ Math.imul(salt + 1, 0x9e3779b1)))),
  );
}

function mixWord(hash: NameHash, word: number): void {
  // four multiply-rotate lanes, each fed by the one before; odd multipliers keep every step invertible
  hash.x = Math.imul(((hash.x << 5) | (hash.x >>> 27)) ^ word, 0x9e3779b1);
  hash.y = Math.imul(((hash.y << 7) | (hash.y >>> 25)) ^ (word + (hash.x >>> 15)), 0x85ebca77);
  hash.z = Math.imul(((hash.z << 11) | (hash.z >>> 21)) ^ (word + (hash.y >>> 13)), 0xc2b2ae3d);
  hash.w = Math.imul(((hash.w << 13) | (hash.w >>> 19)) ^ (word + (hash.z >>> 16)), 0x27d4eb2f);
}

/** Spreads every input bit over the word: the 32-bit finaliser of MurmurHash3 (Appleby, public domain). */
function avalanche(word: number): number {
  let h = word | 0;
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return h ^ (h >>> 16);
}
