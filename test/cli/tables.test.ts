import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { buildResult, type Result } from '../../src/analysis/index.js';
import { discardUnfinished } from '../../src/cli/output.js';
import { TableFolder } from '../../src/cli/tables.js';
import { csvTable, TABLE_NAMES } from '../../src/report/index.js';
import { made } from '../analysis/recording.js';
import { Folder } from './penstock.js';

const ORIGIN = {
  version: '9.9.9',
  options: { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY },
  overrides: [],
} as const;

let folder: Folder;
let result: Result;
beforeEach(() => {
  folder = new Folder();
  const { pkg, trace, recording, delays } = made();
  result = buildResult(pkg, trace, ORIGIN, recording, delays);
});
afterEach(() => folder.remove());

describe('tables in a folder', () => {
  test('a new folder is not there before commit, and then holds every table', () => {
    const tables = new TableFolder(folder.at('t'));
    tables.write(result);
    expect(existsSync(folder.at('t'))).toBe(false);
    tables.commit();
    expect(readdirSync(folder.path)).toEqual(['t']);
    expect(readdirSync(folder.at('t')).sort()).toEqual([...TABLE_NAMES].sort());
    for (const name of TABLE_NAMES) {
      expect(readFileSync(folder.at(`t/${name}`), 'utf8')).toBe(csvTable(result, name));
    }
    discardUnfinished(); // what is finished stays
    expect(readdirSync(folder.at('t'))).toHaveLength(TABLE_NAMES.length);
  });

  test('given up, it leaves nothing', () => {
    new TableFolder(folder.at('t')).write(result);
    discardUnfinished();
    expect(readdirSync(folder.path)).toEqual([]);
  });

  test('in a standing folder tables are replaced and other files stay', () => {
    mkdirSync(folder.at('t'));
    writeFileSync(folder.at('t/notes.txt'), 'mine');
    for (let run = 0; run < 2; run++) {
      const tables = new TableFolder(folder.at('t'));
      tables.write(result);
      tables.commit();
    }
    expect(readdirSync(folder.at('t')).sort()).toEqual([...TABLE_NAMES, 'notes.txt'].sort());
    new TableFolder(folder.at('t'));
    discardUnfinished();
    expect(readdirSync(folder.at('t'))).toHaveLength(TABLE_NAMES.length + 1);
  });

  test('a file that is no table of ours is not replaced, nor any other', () => {
    mkdirSync(folder.at('t'));
    writeFileSync(folder.at('t/timeline.csv'), 'day,hours\n1,8\n');
    expect(() => new TableFolder(folder.at('t'))).toThrow(/timeline\.csv.*not a penstock table/s);
    discardUnfinished();
    expect(readdirSync(folder.at('t'))).toEqual(['timeline.csv']);
  });

  test('a file where the folder should be, and a folder in no folder', () => {
    writeFileSync(folder.at('t'), '');
    expect(() => new TableFolder(folder.at('t'))).toThrow(/t: the tables cannot be written: it is no folder/);
    expect(() => new TableFolder(folder.at('a/b'))).toThrow(/no such file or folder/);
  });
});
