import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { CommandLog, LOG_HEADER } from '../../src/cli/command-log.js';
import { loadPackage } from '../../src/config/index.js';
import { COMMANDS } from '../../src/engine/index.js';
import { Folder, WAGTAIL } from './penstock.js';

const pkg = loadPackage(WAGTAIL);
const { stacks, channels, pseudo_channels } = pkg.memory[0].organisation;

let folder: Folder;
beforeEach(() => {
  folder = new Folder();
});
afterEach(() => folder.remove());

const field = fc.integer({ min: -1, max: 1 << 20 });
const commands = fc.tuple(
  fc.maxSafeNat(), // half clocks
  fc.nat({ max: stacks * channels * pseudo_channels - 1 }),
  field, // stack ID
  field, // bank group
  field, // bank
  field, // row
  field, // column
  fc.nat({ max: COMMANDS.length - 1 }),
  fc.oneof(fc.constant(-1), fc.maxSafeNat()),
);

/** A row as the plain way of writing it would have it. */
function plainRow([halfCk, p, sid, group, bank, row, column, command, request]: readonly number[]): string {
  const blank = (value: number) => (value < 0 ? '' : String(value));
  const whole = Math.floor(halfCk / 2);
  return [
    halfCk % 2 === 0 ? `${whole}` : `${whole}.5`,
    Math.floor(p / (channels * pseudo_channels)),
    Math.floor(p / pseudo_channels) % channels,
    p % pseudo_channels,
    ...[sid, group, bank, row, column].map(blank),
    COMMANDS[command],
    blank(request),
  ].join(',');
}

test('rows are those of the plain way of writing them, whatever the numbers', () => {
  fc.assert(
    fc.property(fc.array(commands, { maxLength: 50 }), (rows) => {
      const file = folder.at('log.csv');
      const log = new CommandLog(file, pkg);
      for (const row of rows) log.sink(...row);
      log.finish();
      expect(readFileSync(file, 'utf8')).toBe(LOG_HEADER + rows.map((row) => `${plainRow(row)}\n`).join(''));
    }),
    { numRuns: 50 },
  );
});

test('a log of many buffers has every row once and in order', () => {
  const file = folder.at('log.csv');
  const log = new CommandLog(file, pkg);
  const count = 100_000; // about 3 MB, a dozen buffers
  for (let i = 0; i < count; i++) log.sink(i, i % 12, 0, 1, 2, i, -1, 0, i);
  log.finish();
  const rows = readFileSync(file, 'utf8').trimEnd().split('\n').slice(1);
  expect(rows).toHaveLength(count);
  expect(rows.every((row, i) => row === plainRow([i, i % 12, 0, 1, 2, i, -1, 0, i]))).toBe(true);
});
