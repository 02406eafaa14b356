import { KIND_COUNT, KINDS } from './commands.js';
import { ruleNumber } from './rule-names.js';
import type { Scope, Separation } from './separations.js';

/** Rows of the table for one kind of later command and one scope, as columns of numbers. */
export interface Rows {
  readonly count: number;
  readonly rule: Uint8Array;
  readonly from: Uint8Array; // kind of the earlier command
  readonly halfCk: Float64Array;
}

/**
 * The rows of `table` in `scope`, by the kind of the later command. Rows that ask for no time are left out, save those from an
 * own precharge, which begins after its command and must be waited for even so.
 */
export function compile(table: readonly Separation[], scope: Scope): readonly Rows[] {
  return Array.from({ length: KIND_COUNT }, (_, to) => {
    const rows = table
      .filter((row) => row.scopes.includes(scope) && row.to.includes(KINDS[to]))
      .flatMap(({ rule, from, halfCk }) => from.map((kind) => ({ rule, from: kind, halfCk })))
      .filter(({ from, halfCk }) => halfCk > 0 || from === 'OWN');
    return {
      count: rows.length,
      rule: Uint8Array.from(rows, ({ rule }) => ruleNumber(rule)),
      from: Uint8Array.from(rows, ({ from }) => KINDS.indexOf(from)),
      halfCk: Float64Array.from(rows, ({ halfCk }) => halfCk),
    };
  });
}
