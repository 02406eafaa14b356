import type { Organisation } from '../config/package.js';
import { COMMANDS, KIND_OF, MANY_BANKS, NEEDS_COLUMN, NEEDS_ROW, REFAB } from './commands.js';
import type { LoggedCommand } from './shape.js';

/** Where a command goes; fields it does not use are -1. */
export type Place = { readonly [K in Exclude<keyof LoggedCommand, 'ck' | 'command' | 'line'>]: number };

/** The command in hand as reports name it. */
export function logged(halfCk: number, place: Place, command: number, line: number): LoggedCommand {
  const used = (field: number): number | null => (field < 0 ? null : field);
  return {
    ck: halfCk / 2,
    stack: place.stack,
    channel: place.channel,
    pseudo_channel: place.pseudo_channel,
    sid: used(place.sid),
    bank_group: used(place.bank_group),
    bank: used(place.bank),
    row: used(place.row),
    column: used(place.column),
    command: COMMANDS[command],
    line,
  };
}

/** What is out of the device's range, or missing, in words; '' when nothing is. `refreshPerSid`: a REFab needs its stack ID. */
export function outOfRange(
  o: Organisation,
  refreshPerSid: boolean,
  stack: number,
  channel: number,
  pc: number,
  sid: number,
  bankGroup: number,
  bank: number,
  row: number,
  column: number,
  command: number,
): string {
  const one = MANY_BANKS[command] === 0;
  const needsSid = one || (KIND_OF[command] === REFAB && refreshPerSid);
  // written so that NaN is out of range too
  if (!(stack >= 0 && stack < o.stacks)) return beyond('stack', stack, o.stacks);
  if (!(channel >= 0 && channel < o.channels)) return beyond('channel', channel, o.channels);
  if (!(pc >= 0 && pc < o.pseudo_channels)) return beyond('pseudo_channel', pc, o.pseudo_channels);
  if (!(sid >= (needsSid ? 0 : -1) && sid < o.sids)) return beyond('sid', sid, o.sids);
  if (one && !(bankGroup >= 0 && bankGroup < o.bank_groups)) return beyond('bank_group', bankGroup, o.bank_groups);
  if (one && !(bank >= 0 && bank < o.banks_per_group)) return beyond('bank', bank, o.banks_per_group);
  if (!(row >= (NEEDS_ROW[command] === 1 ? 0 : -1) && row < o.rows)) return beyond('row', row, o.rows);
  const firstColumn = NEEDS_COLUMN[command] === 1 ? 0 : -1;
  if (!(column >= firstColumn && column < o.columns)) return beyond('column', column, o.columns);
  return '';
}

const beyond = (field: string, found: number, count: number): string =>
  found < 0 ? `no ${field}` : `${field} ${found}, the device has 0 to ${count - 1}`;
