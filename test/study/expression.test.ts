import { describe, expect, test } from 'vitest';
import { oneOf, parseExpression, type Value } from '../../src/study/expression.js';

const VALUES: Readonly<Record<string, Value>> = {
  rate: { value: 16e9, kind: 'transfer rate' },
  queue: { value: 32, kind: 'number' },
  page: 'open',
  'bandwidth.achieved_bytes_per_s': { value: 3e12, kind: 'bandwidth' },
  makespan_ps: { value: 2e7, kind: 'time' },
};
const where = { file: 'plan.yaml', line: 3, column: 7 };
const value = (text: string): number =>
  parseExpression(text, oneOf([...Object.keys(VALUES), 'absent']), where).evaluate((name) => VALUES[name]);

describe('what expressions come to', () => {
  test.each([
    ['rate >= 12 GT/s', 1],
    ['rate>=12GT/s and queue<=31', 0],
    ['rate < 12 GT/s or queue <= 32', 1],
    ['not (queue > 64) and page == "open"', 1],
    ["page != 'open'", 0],
    ['2 + 3 * 4 - 1', 13], // * before +
    ['(2 + 3) * 4 / 8', 2.5],
    ['7 - 4 - 2', 1], // from the left
    ['16 / 4 / 2', 2],
    ['-queue + 2 * queue', 32],
    ['queue / 4 == 8', 1],
    ['bandwidth.achieved_bytes_per_s >= 3 TB/s', 1],
    ['bandwidth.achieved_bytes_per_s >= 3.0001 TB/s', 0],
    ['makespan_ps <= 20 us', 1],
    ['makespan_ps / 1 us', 20],
    ['1.1 ns', 1100], // no bits of decimal arithmetic
    ['rate / 1 GT/s * 10', 160],
    ['85 %', 0.85],
    ['1e3 + .5', 1000.5],
    ['2 or 0 and 0', 1], // and binds closer than or
  ])('%s = %d', (text, expected) => expect(value(text)).toBe(expected));

  test('a value that is missing makes the whole unknown', () => {
    expect(value('absent > 3')).toBeNaN();
    expect(value('queue + absent')).toBeNaN();
  });
});

describe('what is refused, and where', () => {
  test.each([
    ['rat > 3', "plan.yaml:3:7: found 'rat' at character 1 of 'rat > 3'; expected 'rate'"],
    ['rate > 3 ns', /found '>' at character 6 .* Left of it is a transfer rate, right of it a time/],
    ['page > 3', /Text can only be compared by == and != with text, and here is 'open' > a number/],
    ['queue + ', /found its end at character 9 .*; expected a name, a number with its unit/],
    ['(queue', /expected '\)'/],
    ['queue 3', /found '3' at character 7 .*; expected and, or, a comparison/],
    ['queue ; 3', /found ';' at character 7/],
    ['3 parsec > 2', /found 'parsec' at character 3/], // an unknown unit is no unit
    ['page', /found the text 'open'/],
  ])('%s', (text, message) => expect(() => value(text)).toThrow(message));
});
