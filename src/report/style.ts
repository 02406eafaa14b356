import { Chalk, type ChalkInstance } from 'chalk';
import Table from 'cli-table3';
import { formatFlops } from '../units.js';

/** How a report for people looks: whether it has colours, and how wide it may be. */
export interface TextStyle {
  readonly colour: boolean;
  readonly width: number; // columns
}

export interface Ink {
  readonly chalk: ChalkInstance;
  readonly width: number;
}

export function ink({ colour, width }: TextStyle): Ink {
  return { chalk: new Chalk({ level: colour ? 1 : 0 }), width };
}

const EIGHTHS = ['', '▏', '▎', '▍', '▌', '▋', '▊', '▉'];

/** A bar for a fraction (0 … 1) of `cells` columns, filled up with blanks; eighths of a column are drawn. */
export function bar(fraction: number, cells: number): string {
  const eighths = Math.round(Math.min(1, Math.max(0, fraction)) * cells * 8);
  return `${'█'.repeat(eighths >> 3)}${EIGHTHS[eighths & 7]}`.padEnd(cells);
}

/** Names from files and traces: nothing in them may steer the terminal, and they fit in `most` columns. */
export function plain(text: string, most = Number.POSITIVE_INFINITY): string {
  const printable = text.replaceAll(/[\p{Cc}\p{Cf}\p{Zl}\p{Zp}]/gu, '?');
  const letters = [...printable];
  return letters.length <= most ? printable : `${letters.slice(0, most - 1).join('')}…`;
}

/** Blanks where a line may break: not between a number and its per cent or bytes a second. */
const BREAKS = / (?!%|[kMGT]?B\/s)/;

/** Breaks text at blanks into lines of at most `width` columns; lines after the first are indented. */
export function wrap(text: string, width: number, indent = ''): string {
  const lines: string[] = [];
  let line = '';
  for (const word of text.split(BREAKS)) {
    const room = width - (lines.length > 0 ? indent.length : 0);
    if (line !== '' && line.length + 1 + word.length > room) {
      lines.push(line);
      line = word;
    } else {
      line = line === '' ? word : `${line} ${word}`;
    }
  }
  return [...lines, line].map((part, i) => (i === 0 ? part : indent + part)).join('\n');
}

/** Joins short facts with a dot between, breaking lines between facts. */
export function facts(items: readonly string[], width: number, indent: string): string {
  const lines: string[] = [];
  let line = '';
  for (const item of items) {
    const longer = line === '' ? item : `${line} · ${item}`;
    if (line !== '' && indent.length + longer.length > width) {
      lines.push(line);
      line = item;
    } else {
      line = longer;
    }
  }
  return [...lines, line].map((text) => indent + text).join('\n');
}

/** FLOP/s under a heading that says so: 1.55 P. */
export function prefixed(flopsPerS: number): string {
  return formatFlops(flopsPerS).replace('FLOP/s', '').trimEnd();
}

const NO_BORDER = {
  top: '',
  'top-mid': '',
  'top-left': '',
  'top-right': '',
  bottom: '',
  'bottom-mid': '',
  'bottom-left': '',
  'bottom-right': '',
  left: '  ',
  'left-mid': '',
  mid: '',
  'mid-mid': '',
  right: '',
  'right-mid': '',
  middle: '  ',
};

/** A table without lines: the first column to the left, the others to the right; `left` names more columns to the left. */
export function table(
  head: readonly string[],
  rows: readonly (readonly string[])[],
  left: readonly number[] = [],
): string {
  const out = new Table({
    head: [...head],
    chars: NO_BORDER,
    style: { head: [], border: [], 'padding-left': 0, 'padding-right': 0 },
    colAligns: head.map((_, i) => (i === 0 || left.includes(i) ? 'left' : 'right')),
  });
  out.push(...rows.map((row) => [...row]));
  return out
    .toString()
    .split('\n')
    .map((line) => line.trimEnd())
    .join('\n');
}
