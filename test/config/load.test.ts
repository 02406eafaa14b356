import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it, test } from 'vitest';
import { describePackage, loadPackage, packageJsonSchema, parsePackage } from '../../src/config/index.js';
import { TIMING_NAMES } from '../../src/config/package.js';
import { InputError, SystemError } from '../../src/errors.js';

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
  // sweep plans stand beside the packages they are about, and say by their first key what they are
  const isPlan = (name: string): boolean => /^penstock_sweep:/m.test(readFileSync(join(CONFIGS, name), 'utf8'));
  const packages = readdirSync(CONFIGS).filter((name) => name.endsWith('.yaml') && !isPlan(name));
  it.each(packages)('%s loads', (name) => {
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
    // the base is at fault, three files away
    write('worse.yaml', readFileSync(WAGTAIL, 'utf8').replace('stacks: 6', 'stacks: -6'));
    write('above.yaml', 'extends: worse.yaml\n');
    expect(() => loadPackage(write('top2.yaml', '\n\nextends: above.yaml\nname: Top\n'))).toThrow(
      /worse\.yaml:\d+:13: memory\.0\.stacks: found -6; expected at least 1$/,
    );
    // and what only the two together make wrong stands where the upper one said it
    const both = write('both.yaml', 'extends: good.yaml\nmemory:\n  - name: hbm\n    stacks: 7\n');
    expect(() => loadPackage(both)).toThrow(/good\.yaml:\d+:3: links: found no link to stack hbm\.6/);
  });
  it('finds the base beside the file that names it, or by an absolute path', () => {
    mkdirSync(join(folder, 'deep', 'er'), { recursive: true });
    write('root.yaml', readFileSync(WAGTAIL, 'utf8'));
    write('deep/middle.yaml', 'extends: ../root.yaml\nname: Middle\n');
    const relative = write('deep/er/top.yaml', 'extends: ../middle.yaml\n');
    expect(loadPackage(relative).name).toBe('Middle');
    expect(parsePackage(readFileSync(relative, 'utf8'), relative).name).toBe('Middle');
    expect(loadPackage(write('absolute.yaml', `extends: ${join(folder, 'root.yaml')}\n`)).name).toBe('Wagtail');
  });
  it('replaces a list of things without names, and adds things of a new name', () => {
    write('plain.yaml', readFileSync(WAGTAIL, 'utf8'));
    const other = loadPackage(
      write('other.yaml', 'extends: plain.yaml\naddress_map: { interleave: [stack, channel, pseudo_channel] }\n'),
    );
    expect(other.addressMap.interleave).toEqual(['stack', 'channel', 'pseudo_channel']);
    expect(other.addressMap.xor).toHaveLength(4);
    const more = write(
      'more.yaml',
      `extends: plain.yaml
compute: [{ name: north, clock: 2 GHz, engines: 1 }]
memory: [{ name: hbm, stacks: 7 }]
links: [{ name: north, from: north, to: hbm.6, lanes: 64, rate: 16 GT/s }]
`,
    );
    expect(loadPackage(more).dies.map((die) => die.name)).toEqual(['west', 'east', 'north']);
  });
});

describe('YAML', () => {
  const text = readFileSync(WAGTAIL, 'utf8');
  it('anchors, aliases and merge keys say a thing once', () => {
    const short = text.replace(/ {2}- name: west\n[\s\S]*?(?=\nmemory:)/, '').replace(
      'compute:\n',
      `compute:
  - &die
    name: west
    clock: 1.6 GHz
    engines: 32
    window: 256
    buffering: 3
    request: 256 B
    peak: { fp8: 1600 TFLOP/s, bf16: 800 TFLOP/s, fp32: 100 TFLOP/s }
    edge: 32 mm
  - { name: east, <<: *die }
`,
    );
    expect(parsePackage(short, 'a.yaml').hash).toBe(parsePackage(text, 'a.yaml').hash);
    // a key of its own counts, wherever it stands; of several maps the first that has a key
    const own = short.replace('{ name: east, <<: *die }', '{ <<: [{ engines: 7 }, *die], name: east, window: 5 }');
    expect(parsePackage(own, 'a.yaml').dies[1]).toMatchObject({ name: 'east', window: 5, engines: 7, buffering: 3 });
    // what is wrong in a merged map stands at the anchor
    expect(() => parsePackage(short.replace('window: 256', 'window: 0'), 'a.yaml')).toThrow(
      /^a\.yaml:\d+:13: compute\.0/,
    );
  });
  it('a byte order mark, carriage returns and comments change nothing', () => {
    const { hash } = parsePackage(text, 'a.yaml');
    expect(parsePackage(`\uFEFF${text}`, 'a.yaml').hash).toBe(hash);
    expect(parsePackage(text.replaceAll('\n', '\r\n'), 'a.yaml').hash).toBe(hash);
    // and places are counted in the lines of the file
    expect(() => parsePackage(text.replace('stacks: 6', 'stacks: 0').replaceAll('\n', '\r\n'), 'a.yaml')).toThrow(
      `a.yaml:${text.slice(0, text.indexOf('stacks: 6')).split('\n').length}:13: memory.0.stacks`,
    );
  });
});

describe('files', () => {
  it('that cannot be read are no fault of the user’s input', () => {
    symlinkSync('loop.yaml', join(folder, 'loop.yaml'));
    expect(() => loadPackage(join(folder, 'loop.yaml'))).toThrow(SystemError);
    expect(() => loadPackage(join(folder, 'loop.yaml'))).toThrow(/loop\.yaml: cannot be read \(ELOOP\)$/);
  });
  it('below something that is no folder, or taken for packages by mistake', () => {
    const file = write('file.yaml', 'name: x\n');
    expect(() => loadPackage(join(file, 'below.yaml'))).toThrow(/below\.yaml: found no such file/);
    const huge = write('huge.csv', 'R,0,64\n'.repeat(1_000_000));
    const began = performance.now();
    expect(() => loadPackage(huge)).toThrow(/huge\.csv: found a file of more than 4\.00 MiB; expected a package file/);
    expect(() => loadPackage(write('on.yaml', 'extends: huge.csv\n'))).toThrow(
      /on\.yaml:1:10: extends: found '.*huge\.csv', a file of more than 4\.00 MiB/,
    );
    expect(() => loadPackage(write('in.yaml', 'extends: .\n'))).toThrow(
      /in\.yaml:1:10: extends: found '.*', a directory/,
    );
    expect(performance.now() - began).toBeLessThan(2000);
    expect(() => loadPackage(write('null.yaml', 'a: b\0'))).toThrow(InputError);
  });
});

describe('overrides', () => {
  const text = readFileSync(WAGTAIL, 'utf8');
  const set = (...overrides: string[]) => parsePackage(text, 'a.yaml', overrides);
  it('name list items by number or name, and take any YAML value', () => {
    expect(set('compute.1.window=7').dies.map((die) => die.window)).toEqual([256, 7]);
    expect(set('compute.east.window=7').dies.map((die) => die.window)).toEqual([256, 7]);
    expect(set('memory.hbm.refresh={ mode: "off" }').memory[0].refresh.mode).toBe('off');
    expect(set('memory.hbm.refresh.mode=off').memory[0].refresh.mode).toBe('off');
    expect(set('links.west.rate=32 GT/s').links[0].transfersPerS).toBe(32e9);
    expect(set('caution=a = b').caution).toBe('a = b');
    expect(set('caution=""').caution).toBe('');
  });
  it('reach keys that have dots in them', () => {
    expect(
      set('address_map.xor.bank.0=[row.9]').addressMap.xor.find((f) => f.target === 'bank' && f.bit === 0),
    ).toEqual({
      target: 'bank',
      bit: 0,
      rowBits: [9],
    });
    expect(set('compute.west.peak.fp8.e4m3=2 TFLOP/s').dies[0].peakFlops['fp8.e4m3']).toBe(2e12);
  });
  it('go in order, the last one counting', () => {
    expect(set('compute.0.window=7', 'compute.0.window=9').dies[0].window).toBe(9);
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
    const peaks = text.replaceAll('{ fp8: 1600 TFLOP/s, bf16: 800 TFLOP/s,', '{ bf16: 800 TFLOP/s, fp8: 1.6 PFLOP/s,');
    expect(peaks).not.toBe(text);
    expect(parsePackage(peaks, 'b.yaml').hash).toBe(plain.hash);
    const folds = text.replace(/( {4}bank_group.0: .*\n)( {4}bank_group.1: .*\n)/, '$2$1');
    expect(folds).not.toBe(text);
    expect(parsePackage(folds, 'b.yaml')).toEqual({ ...plain, file: 'b.yaml' });
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
  it('rounds the time of a flit once, so that whole times come out whole', () => {
    const flitPs = (lanes: number, rate: string, flit: string): number =>
      parsePackage(text, 'a.yaml', [`links.0.lanes=${lanes}`, `links.0.rate=${rate}`, `links.0.flit=${flit}`]).links[0]
        .flitPs;
    expect(flitPs(512, '16 GT/s', '256 B')).toBe(250);
    expect(flitPs(48, '32 GT/s', '192 B')).toBe(1000);
    // against whole-number arithmetic: bytes x 8e12 / (lanes x rate), to the nearest double
    for (const [lanes, rate, flit] of [
      [3, 7e9, 64],
      [36, 11e9, 68],
      [65535, 999_983e6, 65536],
      [7, 1_234_567_891, 211],
    ] as const) {
      const [over, under] = [BigInt(flit) * 8_000_000_000_000n, BigInt(lanes) * BigInt(rate)];
      const got = flitPs(lanes, `${rate / 1e6} MT/s`, `${flit} B`);
      // 2^70 times the value, exactly, and how far the double is from it: at most half of its last bit
      const exact = (over << 70n) / under;
      const bits = 2 ** (Math.floor(Math.log2(got)) - 52);
      const apart = exact - BigInt(got * 2 ** 60) * 1024n;
      expect(Math.abs(Number(apart)) / 2 ** 70).toBeLessThanOrEqual(bits / 2 + 2 ** -60);
    }
  });
  it('names the package file as source of every rule that it overrides', () => {
    const rules = [
      'memory.0.activate_window_scope=sid',
      'memory.0.refresh={ scope: sid, postpone: 3, pull_in: 2 }',
      'memory.0.command_buses={ act: 3 ck }',
    ];
    const [plain] = describePackage(loadPackage(WAGTAIL)).memory;
    const [over] = describePackage(loadPackage(WAGTAIL, rules)).memory;
    for (const [rule, source] of Object.entries(over.rule_sources)) {
      expect([rule, source]).toEqual([
        rule,
        rule === 'refpb_in_activate_window' ? plain.rule_sources[rule] : 'package file',
      ]);
      expect(plain.rule_sources[rule]).not.toBe('package file');
    }
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
