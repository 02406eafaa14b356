/**
 * Digits in bytes, four at a time: the bytes of a 32-bit word, first digit lowest, are checked and valued together, which halves the
 * time of reading one after the other. The method is known as SWAR, SIMD within a register (Fisher and Dietz, LCPC 1998).
 */

/** Value of each byte as a hexadecimal digit, -1 for every other byte. */
export const HEX_DIGIT: Int8Array = new Int8Array(256).fill(-1);
for (const [i, byte] of [...Buffer.from('0123456789abcdef')].entries()) HEX_DIGIT[byte] = i;
for (const [i, byte] of [...Buffer.from('ABCDEF')].entries()) HEX_DIGIT[byte] = 10 + i;

/** Value of four decimal digits, -1 when any byte is none. */
export function fourDigits(word: number): number {
  // a digit is 0x30 … 0x39: its upper half is 3, and stays 3 when 6 is added
  if ((((word & 0xf0f0f0f0) ^ 0x30303030) | (((word + 0x06060606) & 0xf0f0f0f0) ^ 0x30303030)) !== 0) return -1;
  // neighbours join to pairs, 10 a + b, and pairs to the whole, 100 p + q
  const pairs = (Math.imul(word & 0x0f0f0f0f, 2561) >>> 8) & 0x00ff00ff;
  return Math.imul(pairs, 6553601) >>> 16;
}

/** Value of four hexadecimal digits of either case, -1 when any byte is none. */
export function fourHexDigits(word: number): number {
  const low = word & 0x0f0f0f0f;
  const letter = (word >>> 6) & 0x01010101; // 1 in each byte of 0x40 or more
  const letters = letter * 255;
  // a letter is 0x41 … 0x46 or 0x61 … 0x66, so its lower half is 1 … 6; a digit's is 0 … 9, its upper half 3
  const badLetter =
    ((word ^ 0x40404040) & 0xd8d8d8d8) | ((low + 0x01010101) & 0x08080808) | (~(low + 0x0f0f0f0f) & 0x10101010);
  const badDigit = ((word & 0xf0f0f0f0) ^ 0x30303030) | ((low + 0x06060606) & 0x10101010);
  if (((badLetter & letters) | (badDigit & ~letters)) !== 0) return -1;
  const values = low + letter * 9;
  const pairs = ((values & 0x000f000f) << 4) | ((values >>> 8) & 0x000f000f);
  return ((pairs & 0xff) << 8) | (pairs >>> 16);
}
