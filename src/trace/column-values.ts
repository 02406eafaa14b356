/** The values of a column of an Arrow or Parquet file, whatever it holds them in, as numbers, operations or text. */

/** A column of a block: typed numbers, 64-bit integers, or whatever else its file holds; or indices into a short list of words. */
export type BlockColumn =
  | ArrayLike<unknown>
  | { readonly indices: ArrayLike<number>; readonly words: readonly unknown[] };

/**
 * Writes `count` values from row `from` on into `out` at `to`: NaN where there is no number, -Infinity where there is nothing.
 * Returns false when the column holds words, which have to be read as text.
 */
export function numbersOf(
  column: BlockColumn | undefined,
  from: number,
  count: number,
  out: Float64Array,
  to: number,
): boolean {
  if (column === undefined) {
    out.fill(Number.NEGATIVE_INFINITY, to, to + count);
    return true;
  }
  if ('indices' in column) {
    for (let i = 0; i < count; i++) {
      const value = numberOf(column.words[column.indices[from + i]]);
      if (value === null) return false;
      out[to + i] = value;
    }
    return true;
  }
  if (column instanceof BigInt64Array || column instanceof BigUint64Array) {
    // 64-bit integers by their halves: no BigInt is made
    const halves = new Int32Array(column.buffer, column.byteOffset + 8 * from, 2 * count);
    for (let i = 0; i < count; i++) out[to + i] = halves[2 * i + 1] * 4294967296 + (halves[2 * i] >>> 0);
    return true;
  }
  if (ArrayBuffer.isView(column)) {
    out.set((column as unknown as Float64Array).subarray(from, from + count), to);
    return true;
  }
  for (let i = 0; i < count; i++) {
    const value = numberOf(column[from + i]);
    if (value === null) return false;
    out[to + i] = value;
  }
  return true;
}

/** A value as a number; null when it is a word. */
function numberOf(value: unknown): number | null {
  if (typeof value === 'number') return value;
  if (typeof value === 'bigint') return Number(value);
  return value === null || value === undefined ? Number.NEGATIVE_INFINITY : null;
}

/** Writes the operations of `count` rows into `out`, -1 where the word is none. */
export function operationsOf(
  column: BlockColumn | undefined,
  from: number,
  count: number,
  words: ReadonlyMap<string, number>,
  out: Int8Array,
): void {
  const codeOf = (word: unknown): number => words.get(String(word).trim().toLowerCase()) ?? -1;
  if (column === undefined) {
    out.fill(-1, 0, count);
    return;
  }
  if ('indices' in column) {
    const { indices } = column;
    const byWord = Int8Array.from(column.words, codeOf);
    for (let i = 0; i < count; i++) out[i] = byWord[indices[from + i]];
    return;
  }
  let [word, code]: [unknown, number] = [null, -1];
  let [other, otherCode]: [unknown, number] = [null, -1];
  for (let i = 0; i < count; i++) {
    const value = column[from + i];
    // two words are all that most traces have
    if (value === other) [word, code, other, otherCode] = [other, otherCode, word, code];
    else if (value !== word) {
      [other, otherCode] = [word, code];
      word = value;
      code = codeOf(value);
    }
    out[i] = code;
  }
}

/** A cell as text; '' where there is nothing. */
export function textOf(column: BlockColumn | undefined, row: number): string {
  if (column === undefined) return '';
  const value = 'indices' in column ? column.words[column.indices[row]] : column[row];
  if (value === null || value === undefined) return '';
  return value instanceof Uint8Array ? Buffer.from(value).toString('utf8') : String(value);
}
