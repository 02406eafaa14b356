import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { prettyJson } from '../../src/report/index.js';

describe('JSON text', () => {
  test('reads back as what it was made of', () => {
    fc.assert(
      fc.property(fc.jsonValue(), (value) => {
        const text = prettyJson(value);
        expect(JSON.parse(text)).toEqual(JSON.parse(JSON.stringify(value)));
      }),
    );
  });

  test('short things stand on one line, long ones are broken, columns of numbers are filled', () => {
    const text = prettyJson({ short: { a: 1, b: [1, 2] }, long: Array.from({ length: 100 }, (_, i) => i) });
    const lines = text.split('\n');
    expect(lines[1]).toBe('  "short": {"a":1,"b":[1,2]},');
    expect(lines.length).toBeLessThan(12);
    expect(Math.max(...lines.map((line) => line.length))).toBeLessThanOrEqual(121);
  });

  test('keys without a value are left out, as JSON has it', () => {
    const value = { name: 'x'.repeat(130), gone: undefined };
    expect(JSON.parse(prettyJson(value))).toEqual({ name: value.name });
  });
});
