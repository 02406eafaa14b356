import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

const folder = new Folder();
const trace = folder.at('kernels.csv');
beforeAll(async () => {
  await build();
  writeFileSync(
    trace,
    'kernel,stream,format,flops,read,write,read_pattern,write_pattern,estimate_us\n' +
      'read,main,,0,8 MiB,0,sequential,,1.9\nwalk,main,,0,64 KiB,0,chase granule=64B span=1GiB,,0.1\n',
  );
}, 120_000);
afterAll(() => folder.remove());

const roofline = (...more: string[]) => penstock(['roofline', trace, '-p', WAGTAIL, ...more]);

test('says which estimates hold, within what one is content with, in words or JSON', async () => {
  const { code, out, err } = await roofline();
  expect({ code, err }).toEqual({ code: 0, err: '' });
  expect(out).toMatch(/^1 of 2 estimates hold within 10 %; farthest off is walk, which takes [\d.]+ x of its/);
  expect((await roofline('--within', '0.1%')).out).toMatch(/^0 of 2 estimates hold within 0\.1 %/);
  const found = JSON.parse((await roofline('--json')).out);
  expect(found.map((kernel: { name: string; verdict: string }) => [kernel.name, kernel.verdict])).toEqual([
    ['read', 'holds'],
    ['walk', 'too hopeful'],
  ]);
});

test.each([['10'], ['0%'], ['ten per cent']])('--within %s is refused', async (within) => {
  expect(await roofline('--within', within)).toMatchObject({
    code: 2,
    out: '',
    err: `--within: found '${within}'; expected a share in per cent, for example 10%\n`,
  });
});
