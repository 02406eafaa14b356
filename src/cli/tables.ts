/** The tables of a result as CSV files in a folder: a new folder appears whole, in a standing one each file is replaced whole. */
import { mkdirSync, renameSync, rmSync, statSync } from 'node:fs';
import { basename, dirname, join, resolve } from 'node:path';
import type { Result } from '../analysis/index.js';
import { SystemError } from '../errors.js';
import { csvTable, TABLE_NAMES } from '../report/index.js';
import { atTheEnd, OutputFile, temporaryName } from './output.js';
import { systemError } from './system-error.js';

export class TableFolder {
  private readonly files: ReadonlyMap<(typeof TABLE_NAMES)[number], OutputFile>;
  private readonly made: string | null; // the folder under its temporary name; null: the folder was there
  private readonly finished: () => void;

  /** Checks the place and opens every file. Throws InputError where one would replace something else, SystemError for the rest. */
  constructor(private readonly folder: string) {
    const there = this.attempt(() => statSync(folder, { throwIfNoEntry: false }));
    if (there !== undefined && !there.isDirectory()) {
      throw new SystemError(`${folder}: the tables cannot be written: it is no folder. Name a folder, new or standing`);
    }
    const whole = resolve(folder);
    this.made = there === undefined ? join(dirname(whole), temporaryName(basename(whole))) : null;
    const place = this.made ?? folder;
    if (this.made !== null) this.attempt(() => mkdirSync(place));
    this.finished = atTheEnd(() => {
      if (this.made !== null) rmSync(this.made, { recursive: true, force: true });
    });
    this.files = new Map(TABLE_NAMES.map((name) => [name, new OutputFile(join(place, name), 'table')]));
  }

  write(result: Result): void {
    for (const [name, file] of this.files) file.write(csvTable(result, name));
  }

  /** Puts all the tables in their places. */
  commit(): void {
    for (const file of this.files.values()) file.commit();
    const { made } = this;
    if (made !== null) this.attempt(() => renameSync(made, this.folder));
    this.finished();
  }

  private attempt<T>(step: () => T): T {
    try {
      return step();
    } catch (error) {
      throw systemError(`${this.folder}: the tables cannot be written`, error);
    }
  }
}
