import { writeFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { build, Folder, penstock, WAGTAIL } from './penstock.js';

const folder = new Folder();
const trace = folder.at('trace.csv');
beforeAll(async () => {
  await build();
  expect((await penstock(['synth', 'sequential', '--bytes', '1MiB', '-o', trace])).code).toBe(0);
}, 120_000);
afterAll(() => folder.remove());

test('says what is in a trace, with a package and without, in words or JSON', async () => {
  const alone = await penstock(['profile', trace]);
  expect(alone).toMatchObject({ code: 0, err: '' });
  expect(alone.out).toContain('footprint 1.00 MiB in 16.4 k lines of 64 B');
  expect(alone.out).not.toContain('Spread over');
  const spread = await penstock(['profile', trace, '-p', WAGTAIL]);
  expect(spread.out).toMatch(/pseudo-channels +192/);
  const json = await penstock(['profile', trace, '-p', WAGTAIL, '--json']);
  // 1 MiB in granules of 256 B over the 96 pseudo-channels of the first die: 42 or 43 each
  expect(JSON.parse(json.out)).toMatchObject({
    format: 'penstock-profile',
    rows: 4096,
    spread: { atoms: 32_768, stacks: { places: 6 } },
  });
});

test.each([
  ['op,address,bytes\n', /found a header and no rows/],
  [
    'kernel,stream,format,flops,read,write,read_pattern,write_pattern\nk,s,,0,1 MiB,0,sequential,\n',
    /found a kernel trace; expected an access trace/,
  ],
  ['op,address,bytes\nR,0x3000000000,64\n', /bad\.csv:2:3: address: /],
])('%j is refused', async (text, message) => {
  writeFileSync(folder.at('bad.csv'), text);
  const { code, out, err } = await penstock(['profile', folder.at('bad.csv'), '-p', WAGTAIL]);
  expect({ code, out }).toEqual({ code: 2, out: '' });
  expect(err).toMatch(message);
});
