import { InputError, nearest } from '../errors.js';

/** The columns of a command log, in the order they are written; read in any order. */
export const LOG_COLUMNS = [
  'ck',
  'stack',
  'channel',
  'pseudo_channel',
  'sid',
  'bank_group',
  'bank',
  'row',
  'column',
  'command',
  'request',
] as const;

/** Which of LOG_COLUMNS stands in each cell of a row; -1: none of them. Throws InputError when one is missing or there twice. */
export function readHeader(text: string, file: string, line: number): Int8Array {
  const cells = text.split(',').map((cell) => cell.trim());
  const order = Int8Array.from(cells, (cell) => (LOG_COLUMNS as readonly string[]).indexOf(cell));
  for (const [index, name] of LOG_COLUMNS.entries()) {
    const first = order.indexOf(index);
    if (first < 0) {
      const unknown = cells.filter((_, i) => order[i] < 0 && cells[i] !== '');
      const near = nearest(name, unknown);
      throw new InputError({
        where: { file, line, path: name },
        found:
          near === undefined ? 'no such column in the header' : `no such column in the header, but '${shown(near)}'`,
        expected: LOG_COLUMNS.join(','),
        hint: 'a command log is what run --command-log writes',
      });
    }
    if (order.lastIndexOf(index) !== first) {
      throw new InputError({ where: { file, line, path: name }, found: 'the column twice', expected: 'it once' });
    }
  }
  return order;
}

/** A cell as messages show it: control characters escaped, not too long. */
export function shown(cell: string): string {
  const text = JSON.stringify(cell).slice(1, -1);
  return text.length > 40 ? `${text.slice(0, 40)}...` : text;
}
