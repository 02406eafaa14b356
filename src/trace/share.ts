/**
 * Cutting a whole number into parts that differ by at most one and add up to it exactly: part i of n is
 * [cut(total, i, n), cut(total, i + 1, n)).
 */
export function cut(total: number, index: number, parts: number): number {
  // the last edge is given, not computed: index x total may pass 2^53 and lose its last bits
  return index >= parts ? total : Math.floor((index * total) / parts);
}
