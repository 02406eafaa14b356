import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it, test } from 'vitest';
import { describePackage, loadPackage, packageJsonSchema, parsePackage } from '../../src/config/index.js';
import { TIMING_NAMES } from '../../src/config/package.js';

const CONFIGS = fileURLToPath(new URL('../../configs/', import.meta.url));
const WAGTAIL = join(CONFIGS, 'wagtail.yaml');
let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'penstock-config-'));
});
afterAll(() => rmSync(folder, { recursive: true }));
const write = (name: string, text: string): string => {
  writeFileSync(join(folder, name), text);
  return join(folder, name);
};

describe('shipped packages', () => {
  it.each(readdirSync(CONFIGS).filter((name) => name.endsWith('.yaml')))('%s loads', (name) => {
    const pkg = loadPackage(join(CONFIGS, name));
    for (const timing of TIMING_NAMES) expect(pkg.memory[0].timings[timing].source).not.toBe('');
  });
  test('the published schema is the present one: node dist/cli/main.js schema package > configs/penstock.schema.json', () => {
    expect(JSON.parse(readFileSync(join(CONFIGS, 'penstock.schema.json'), 'utf8'))).toEqual(packageJsonSchema());
  });
});

describe('extends', () => {
  it('lays a file over its base, keys over keys, named things over those of their name', () => {
    const base = write('base.yaml', readFileSync(WAGTAIL, 'utf8'));
    const middle = write(
      'middle.yaml',
      'extends: base.yaml\nname: Middle\nmemory: [{ name: hbm, controller: { page: closed } }]\n',
    );
    const top = loadPackage(write('top.yaml', 'extends: middle.yaml\ncompute: [{ name: east, window: 99 }]\n'));
    const plain = loadPackage(base);
    expect(top.name).toBe('Middle');
    expect(top.memory[0].controller).toEqual({ ...plain.memory[0].controller, page: 'closed' });
    expect(top.dies.map((die) => die.window)).toEqual([plain.dies[0].window, 99]);
    expect(top.links).toEqual(plain.links);
    expect(loadPackage(middle).dies).toEqual(plain.dies);
  });
  it('says in which file and line a value stands that is wrong', () => {
    write('good.yaml', readFileSync(WAGTAIL, 'utf8'));
    const bad = write('bad.yaml', 'extends: good.yaml\n\nmemory:\n  - { name: hbm, stacks: none }\n');
    expect(() => loadPackage(bad)).toThrow(/bad\.yaml:4:26: memory\.0\.stacks: found 'none'/);
  });
});

describe('resolving', () => {
  const text = readFileSync(WAGTAIL, 'utf8');
  it('gives equal packages for equal content, whatever the order of keys and the comments', () => {
    const plain = parsePackage(text, 'a.yaml');
    const turned = text
      .replace(/^name: Wagtail\n/m, '')
      .replace(/#.*$/gm, '')
      .concat('\nname: Wagtail\n');
    expect(parsePackage(turned, 'b.yaml').hash).toBe(plain.hash);
    expect(parsePackage(text, 'a.yaml', ['memory.0.stacks=6']).hash).toBe(plain.hash);
    expect(parsePackage(text, 'a.yaml', ['memory.hbm.controller.hit_cap=33']).hash).not.toBe(plain.hash);
  });
  it('freezes all of it', () => {
    const frozen = (value: unknown): boolean =>
      typeof value !== 'object' || value === null || (Object.isFrozen(value) && Object.values(value).every(frozen));
    expect(frozen(parsePackage(text, 'a.yaml'))).toBe(true);
  });
  it('takes the device as it is, and the file over it, and says which', () => {
    const pkg = parsePackage(text, 'a.yaml', [
      'memory.0.timings={ tRP: 20 ns, tRC: 50 ns }',
      'memory.0.organisation.sids=1',
      'address_map.fields=[column:3,bank_group:2,column:2,bank:2,row:14]',
    ]);
    const [{ timings, organisation }] = pkg.memory;
    expect(timings.tRP).toEqual({ ck: 32, ns: 20, source: 'package file' });
    expect(timings.tRAS.source).not.toBe('package file');
    expect(organisation.sids).toBe(1);
    expect(organisation.rows).toBe(16384);
  });
  it('halves tREFI above 85 C, not at it', () => {
    const at = (temperature: string) =>
      parsePackage(text, 'a.yaml', [`memory.0.refresh.temperature=${temperature}`]).memory[0].timings.tREFI.ck;
    expect([at('85 C'), at('85.1 C')]).toEqual([6240, 3120]);
  });
  it('describes capacity, peaks and ceilings by hand', () => {
    const pkg = loadPackage(WAGTAIL);
    const said = JSON.stringify(describePackage(pkg));
    // 6 stacks x 16 channels x 2 pseudo-channels x 32 B / (2 ck x 625 ps) = 4.9152 TB/s; 6 x 16 GiB
    expect(pkg.memory[0].peakBytesPerS * 6).toBeCloseTo(4.9152e12, -3);
    expect(said).toContain(String(6 * 16 * 2 ** 30));
    // 512 lanes x 16 GT/s / 8 = 1024 GB/s raw, 240 of 256 B of it payload; a flit of 256 B takes 250 ps
    expect(pkg.links[0]).toMatchObject({ rawBytesPerS: 1.024e12, payloadBytesPerS: 0.96e12, flitPs: 250 });
  });
});
