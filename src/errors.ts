/** The three ways a run can fail, and how each is worded. Only the command line turns them into exit codes. */

/** A place in something the user gave: a file, or an option of the command line. */
export interface Where {
  readonly file: string;
  readonly line?: number | undefined; // from 1
  readonly column?: number | undefined; // from 1
  readonly path?: string | undefined; // key or column the trouble is in
}

export interface InputProblem {
  readonly where: Where;
  readonly found: string; // what was there
  readonly expected: string; // what would do
  readonly hint?: string | undefined; // what to do next
}

/** The user's input is wrong (exit code 2). The message is one paragraph: place, what was found, what would do. */
export class InputError extends Error {
  override readonly name = 'InputError';
  readonly where: Where;
  readonly found: string;
  readonly expected: string;
  readonly hint: string | undefined;

  constructor({ where, found, expected, hint }: InputProblem) {
    const place = [visible(where.file), where.line, where.line === undefined ? undefined : where.column]
      .filter((part) => part !== undefined)
      .join(':');
    const path = where.path === undefined ? '' : `${shown(where.path)}: `;
    super(
      `${place}: ${path}found ${shown(found)}; expected ${visible(expected)}${hint === undefined ? '' : `. ${shown(hint)}`}`,
    );
    this.where = where;
    this.found = found;
    this.expected = expected;
    this.hint = hint;
  }
}

/** Text of the user's with control characters written out, so that a message is one line and a terminal is told nothing by it. */
function visible(text: string): string {
  return text.replace(/\p{Cc}/gu, (character) => `\\x${character.charCodeAt(0).toString(16).padStart(2, '0')}`);
}

const MOST_SHOWN = 400; // characters; the ends say most: what the value begins with, and what is wrong with it

/** The same, with the middle left out where it is long. */
function shown(text: string): string {
  if (text.length <= MOST_SHOWN) return visible(text);
  return visible(`${text.slice(0, MOST_SHOWN / 2)}…${text.slice(-MOST_SHOWN / 2)}`);
}

/** The program's own checks failed (exit code 3): its results must not be used. */
export class CheckError extends Error {
  override readonly name = 'CheckError';
}

/** The system failed (exit code 4): a file that cannot be read, a full disk. */
export class SystemError extends Error {
  override readonly name = 'SystemError';
}

/** The word of `words` nearest to `word` by edit distance, or undefined when none is near enough to be meant. */
export function nearest(word: string, words: readonly string[]): string | undefined {
  let best: string | undefined;
  let least = Math.min(Math.max(2, Math.floor(word.length / 2)) + 1, word.length); // something of the word must be left
  for (const candidate of words) {
    const distance = editDistance(word.toLowerCase(), candidate.toLowerCase());
    if (distance < least) {
      least = distance;
      best = candidate;
    }
  }
  return best;
}

/** Levenshtein distance: insertions, deletions and substitutions from `a` to `b`. */
function editDistance(a: string, b: string): number {
  let row = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const next = [i];
    for (let j = 1; j <= b.length; j++) {
      next[j] = Math.min(row[j] + 1, next[j - 1] + 1, row[j - 1] + (a[i - 1] === b[j - 1] ? 0 : 1));
    }
    row = next;
  }
  return row[b.length];
}
