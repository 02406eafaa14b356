import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import fc from 'fast-check';
import { expect, it } from 'vitest';
import { parsePackage } from '../../src/config/index.js';
import type { Package } from '../../src/config/package.js';
import { InputError } from '../../src/errors.js';
import { accessTrace, type Row, simulate } from '../helpers/engine.js';

const WAGTAIL = readFileSync(fileURLToPath(new URL('../../configs/wagtail.yaml', import.meta.url)), 'utf8')
  .replace(/#.*$/gm, '')
  .replace('device: hbm3-6.4', 'device: hbm3-6.4\n    organisation: { channels: 2 }')
  .replace('refresh: { mode: all-bank', 'timings: { tREFI: 1500 ns }\n    refresh: { mode: all-bank');

/** Every number in the file, every word, and every key. */
const NUMBERS = [...WAGTAIL.matchAll(/(?<=[\s:{,[-])\d+(\.\d+)?(?=[\s,}\]]|$)/gm)];
const KEYS = [...WAGTAIL.matchAll(/[a-z_]+(?=:\s)/g)];
const change = fc.oneof(
  fc.tuple(
    fc.constantFrom(...NUMBERS),
    fc.constantFrom(
      '0',
      '-1',
      '1',
      '2',
      '3',
      '7',
      '1.5',
      '0.001',
      '1e9',
      '1e18',
      '1e300',
      'NaN',
      '1 ns',
      '',
      '[]',
      '64',
      '4097',
    ),
  ),
  fc.tuple(fc.constantFrom(...KEYS), fc.constantFrom('', 'x', 'name', 'row', 'stacks')),
);

/*
 * Whatever is done to a package file, it is refused by name or it runs: no crash, no hang, no figure that fails its own checks.
 */
it('a package with a value or key changed is refused as an InputError, or runs', async () => {
  let ran = 0;
  let refused = 0;
  await fc.assert(
    fc.asyncProperty(fc.array(change, { minLength: 1, maxLength: 2 }), async (changes) => {
      let text = WAGTAIL;
      for (const [match, instead] of [...changes].sort((a, b) => b[0].index - a[0].index))
        text = text.slice(0, match.index) + instead + text.slice(match.index + match[0].length);
      let pkg: Package;
      try {
        pkg = parsePackage(text, 'fuzz.yaml');
      } catch (error) {
        if (!(error instanceof InputError)) throw error;
        refused++;
        return;
      }
      const rows = Array.from(
        { length: 500 },
        (_, i): Row => ({ op: i % 3 ? 'R' : 'W', address: (i * 7919 * 64) % 2 ** 26, bytes: 64 }),
      );
      const { recording } = await simulate(pkg, accessTrace(rows), { untilPs: 200e6 });
      expect(recording.checks.every((check) => check.ok)).toBe(true);
      ran++;
    }),
    { seed: 3, numRuns: 500 },
  );
  expect(ran).toBeGreaterThan(30);
  expect(refused).toBeGreaterThan(120);
}, 120_000);
