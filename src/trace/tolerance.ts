/** Bad rows: how many may be skipped, and how many were. */
import { InputError } from '../errors.js';

export class Tolerance {
  skipped = 0;

  constructor(private readonly most: number) {}

  /** Lets a bad row go, or throws its error when there have been too many. Anything that is not about the input is thrown. */
  skip(error: unknown): void {
    if (!(error instanceof InputError)) throw error;
    if (this.skipped < this.most) {
      this.skipped++;
      return;
    }
    if (this.most === 0) throw error;
    throw new InputError({
      where: error.where,
      found: error.found,
      expected: error.expected,
      hint: `${error.hint ?? ''} (${this.skipped} bad rows were skipped before this one, as many as allowed)`.trimStart(),
    });
  }
}

/** The error for a trace with a header and nothing under it. */
export function noRows(file: string, skipped: number): InputError {
  return new InputError({
    where: { file },
    found: skipped > 0 ? `no good row: all ${skipped} were skipped` : 'a header and no rows',
    expected: 'at least one row under the header',
    hint: 'check how the trace was written',
  });
}
