import { chmodSync, existsSync, readdirSync, readFileSync, statSync, symlinkSync, writeFileSync } from 'node:fs';
import { gunzipSync, gzipSync } from 'node:zlib';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { discardUnfinished, type Kind, OutputFile } from '../../src/cli/output.js';
import { InputError, SystemError } from '../../src/errors.js';
import { Folder } from './penstock.js';

const LOG = 'ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,request\n';
const RESULT = '{\n  "format": "penstock-result",\n  "version": 1\n}\n';
const TRACE = '# made by hand\nop,address,bytes\nR,0,64\n';

let folder: Folder;
beforeEach(() => {
  folder = new Folder();
});
afterEach(() => folder.remove());

function written(name: string, kind: Kind, ...pieces: string[]): string {
  const output = new OutputFile(folder.at(name), kind);
  for (const piece of pieces) output.write(piece);
  output.commit();
  return folder.at(name);
}

describe('whole or not at all', () => {
  test('nothing stands under the name before commit, and no other file is left after it', () => {
    const output = new OutputFile(folder.at('r.json'), 'result');
    output.write(RESULT);
    expect(existsSync(folder.at('r.json'))).toBe(false);
    output.commit();
    expect(readFileSync(folder.at('r.json'), 'utf8')).toBe(RESULT);
    expect(readdirSync(folder.path)).toEqual(['r.json']);
  });

  test('discarding leaves nothing, and the old file as it was', () => {
    writeFileSync(folder.at('r.json'), RESULT);
    const output = new OutputFile(folder.at('r.json'), 'result');
    output.write('half');
    output.discard();
    expect(readFileSync(folder.at('r.json'), 'utf8')).toBe(RESULT);
    expect(readdirSync(folder.path)).toEqual(['r.json']);
  });

  test('all that is unfinished is discarded together, what is finished stays', () => {
    written('a.csv', 'commandLog', LOG);
    new OutputFile(folder.at('b.csv'), 'commandLog').write(LOG);
    new OutputFile(folder.at('c.csv'), 'commandLog');
    discardUnfinished();
    expect(readdirSync(folder.path)).toEqual(['a.csv']);
  });

  test('two outputs of one run cannot go to one file', () => {
    const first = new OutputFile(folder.at('both'), 'result');
    expect(() => new OutputFile(`${folder.path}/./both`, 'commandLog')).toThrow(/another output of this run/);
    first.discard();
    written('both', 'commandLog', LOG);
  });

  test('.gz is gzip, one member a piece', () => {
    const file = written('log.csv.gz', 'commandLog', LOG, '1,0,0,0,0,0,0,5,,ACT,0\n');
    expect(gunzipSync(readFileSync(file)).toString()).toBe(`${LOG}1,0,0,0,0,0,0,5,,ACT,0\n`);
  });

  test('a replaced file keeps its permissions, a link stays a link', () => {
    writeFileSync(folder.at('real.json'), RESULT);
    chmodSync(folder.at('real.json'), 0o600);
    symlinkSync('real.json', folder.at('link.json'));
    written('link.json', 'result', `${RESULT}\n`);
    expect(readFileSync(folder.at('real.json'), 'utf8')).toBe(`${RESULT}\n`);
    expect(statSync(folder.at('real.json')).mode & 0o777).toBe(0o600);
    expect(readdirSync(folder.path).sort()).toEqual(['link.json', 'real.json']);
  });

  test('what is no regular file is written to, not replaced', () => {
    const output = new OutputFile('/dev/null', 'result');
    output.write(RESULT);
    output.commit();
    expect(statSync('/dev/null').isCharacterDevice()).toBe(true);
  });
});

describe('replacing', () => {
  const same: readonly (readonly [Kind, string])[] = [
    ['result', RESULT],
    ['result', '{"format":"penstock-result","version":9}'],
    ['commandLog', LOG],
    ['accessTrace', TRACE],
    ['accessTrace', 'Address,Bytes,Op\n'],
  ];
  test.each(same)('%s replaces its own kind: %j', (kind, text) => {
    writeFileSync(folder.at('f'), text);
    written('f', kind, 'new');
    expect(readFileSync(folder.at('f'), 'utf8')).toBe('new');
  });

  test('an empty file, and gzip of the same kind, may be replaced', () => {
    writeFileSync(folder.at('e.json'), '');
    written('e.json', 'result', RESULT);
    writeFileSync(folder.at('l.csv.gz'), gzipSync(LOG.repeat(50_000)));
    written('l.csv.gz', 'commandLog', LOG);
    expect(gunzipSync(readFileSync(folder.at('l.csv.gz'))).toString()).toBe(LOG);
  });

  const foreign: readonly (readonly [Kind, string | Buffer])[] = [
    ['result', '{"name": "penstock"}'],
    ['result', 'penstock'],
    ['commandLog', TRACE],
    ['commandLog', gzipSync(TRACE)],
    ['commandLog', Buffer.from([0x1f, 0x8b, 1, 2, 3])],
    ['accessTrace', 'kernel,read,read_pattern\n'],
    ['accessTrace', RESULT],
  ];
  test.each(foreign)('%s does not replace %j', (kind, content) => {
    writeFileSync(folder.at('f'), content);
    expect(() => new OutputFile(folder.at('f'), kind)).toThrow(InputError);
    expect(() => new OutputFile(folder.at('f'), kind)).toThrow(/expected a new name/);
    expect(readFileSync(folder.at('f'))).toEqual(Buffer.from(content));
  });
});

describe('what the system does not allow', () => {
  test('a directory, a missing folder, a file as folder', () => {
    writeFileSync(folder.at('file'), RESULT);
    expect(() => new OutputFile(folder.path, 'result')).toThrow(/it is a directory/);
    expect(() => new OutputFile(folder.at('no/r.json'), 'result')).toThrow(/there is no folder/);
    expect(() => new OutputFile(folder.at('file/r.json'), 'result')).toThrow(SystemError);
    expect(readdirSync(folder.path)).toEqual(['file']);
  });

  test.skipIf(!existsSync('/dev/full'))('a full disk', () => {
    const output = new OutputFile('/dev/full', 'result');
    expect(() => output.write(RESULT)).toThrow(/no space left on the disk \(ENOSPC\)/);
    output.discard();
  });
});
