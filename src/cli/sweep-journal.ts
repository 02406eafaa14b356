/**
 * The folder of a sweep. Every process that works on it appends to a file of its own (points-….jsonl), one whole line a finished
 * point, on the disk before the next one; what all files hold together is what is done. So a killed process leaves at worst a torn
 * last line in its own file, which readers leave out, and any number of processes and machines may share the folder.
 */
import {
  closeSync,
  fsyncSync,
  ftruncateSync,
  mkdirSync,
  openSync,
  readdirSync,
  readFileSync,
  unlinkSync,
  writeSync,
} from 'node:fs';
import { hostname } from 'node:os';
import { join } from 'node:path';
import { CheckError, InputError } from '../errors.js';
import { difference, type PointRecord, readLines, type SweepHeader, worthAnotherTry } from '../study/index.js';
import { OutputFile } from './output.js';
import { systemError } from './system-error.js';

const WHOLE = 'sweep.jsonl'; // all points in order, once they are done
const PIECE = /^points-.*\.jsonl$/;

export class Journal {
  private readonly lines = new Map<number, string>(); // point -> its line
  private readonly header: string;
  private piece: { readonly file: string; readonly fd: number; length: number; points: number } | null = null;

  /** Reads what is done. Throws InputError when the folder holds another sweep, SystemError when it cannot be read. */
  constructor(
    readonly folder: string,
    private readonly sweep: SweepHeader,
  ) {
    this.header = JSON.stringify(sweep);
    for (const file of this.files()) this.readFile(join(folder, file));
  }

  /** Points that are done, or failed for a reason that stays. */
  has(point: number): boolean {
    const line = this.lines.get(point);
    return line !== undefined && !worthAnotherTry(line);
  }

  /** All that is known, in point order. */
  records(): PointRecord[] {
    return this.ordered().map((line) => JSON.parse(line) as PointRecord);
  }

  /** Points of the plan of which nothing is known. */
  missing(): number[] {
    return Array.from({ length: this.sweep.points }, (_, i) => i).filter((point) => !this.lines.has(point));
  }

  /** Makes the folder where there is none yet; the one it is in must be there. */
  prepare(): void {
    try {
      mkdirSync(this.folder);
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code !== 'EEXIST')
        throw systemError(`${this.folder}: cannot be made`, error);
    }
  }

  /** Makes this process's own file, so that a bad place is known before anything is run. Throws SystemError. */
  open(shard: string): void {
    this.prepare();
    const own = `${process.pid}-${hostname().replaceAll(/[^\w.-]/g, '_')}`;
    const file = join(this.folder, `points-${Date.now().toString(36)}-${shard}${own}.jsonl`);
    const fd = this.attempt(() => openSync(file, 'ax', 0o666));
    this.piece = { file, fd, length: 0, points: 0 };
    this.write(`${this.header}\n`);
    this.attempt(() => syncFolder(this.folder));
  }

  /** Puts a point on the disk. Throws SystemError; what was there before stays as it was. */
  append(record: PointRecord): void {
    const line = JSON.stringify(record);
    this.write(`${line}\n`);
    this.lines.set(record.point, line);
    if (this.piece !== null) this.piece.points++;
  }

  /** Closes this process's file; one without points is taken away. */
  close(): void {
    const { piece } = this;
    if (piece === null) return;
    this.piece = null;
    this.attempt(() => closeSync(piece.fd));
    if (piece.points === 0) this.attempt(() => unlinkSync(piece.file));
  }

  /** Joins all files into one, in point order, when every point is there. */
  join(): void {
    this.close();
    const pieces = this.files().filter((file) => PIECE.test(file));
    const whole = new OutputFile(join(this.folder, WHOLE), 'sweep');
    whole.write([this.header, ...this.ordered(), ''].join('\n'));
    whole.commit();
    this.attempt(() => syncFolder(this.folder));
    // what they held is on the disk in the one file now
    for (const file of pieces) this.attempt(() => unlinkSync(join(this.folder, file)));
  }

  /** Takes over what another folder holds of this sweep. */
  take(folder: string): void {
    const files = this.files(folder);
    if (files.length === 0) {
      throw new InputError({
        where: { file: folder },
        found: 'no points of a sweep',
        expected: 'a folder of this sweep',
      });
    }
    for (const file of files) this.readFile(join(folder, file));
  }

  private ordered(): string[] {
    return [...this.lines].sort(([a], [b]) => a - b).map(([, line]) => line);
  }

  private files(folder = this.folder): string[] {
    try {
      return readdirSync(folder)
        .filter((name) => name === WHOLE || PIECE.test(name))
        .sort();
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
      throw systemError(`${folder}: cannot be read`, error);
    }
  }

  private readFile(file: string): void {
    const text = this.attempt(() => readFileSync(file, 'utf8'), `${file}: cannot be read`);
    const lines = readLines(text, file);
    if (lines === null) return; // killed before its first line was whole
    if (lines.header !== this.header) {
      const other = JSON.parse(lines.header) as SweepHeader;
      throw new InputError({
        where: { file },
        found: `points of another sweep: what differs is ${difference(other, this.sweep)}`,
        expected: 'points of this one',
        hint: 'Name a new folder with --out, or remove this one to run all points again',
      });
    }
    for (const [point, line] of lines.records) this.accept(point, line, file);
  }

  private accept(point: number, line: string, file: string): void {
    const there = this.lines.get(point);
    if (there === undefined || there === line || worthAnotherTry(there)) this.lines.set(point, line);
    else if (!worthAnotherTry(line)) {
      throw new CheckError(`${file}: point ${point} has another result here than elsewhere in the folder`);
    }
  }

  private write(text: string): void {
    const { piece } = this;
    if (piece === null) throw new CheckError('a point was to be written before the folder was open');
    const bytes = Buffer.from(text);
    try {
      for (let from = 0; from < bytes.length; ) from += writeSync(piece.fd, bytes, from);
      fsyncSync(piece.fd);
      piece.length += bytes.length;
    } catch (error) {
      try {
        ftruncateSync(piece.fd, piece.length); // no half line stays behind, where the disk lets us
      } catch {
        // readers leave a torn end out
      }
      throw systemError(`${piece.file}: cannot be written`, error);
    }
  }

  private attempt<T>(step: () => T, what = `${this.folder}: cannot be written`): T {
    try {
      return step();
    } catch (error) {
      throw systemError(what, error);
    }
  }
}

/** Makes names in a folder durable, where the system lets a folder be opened. */
function syncFolder(folder: string): void {
  let fd: number;
  try {
    fd = openSync(folder, 'r');
  } catch {
    return; // Windows
  }
  try {
    fsyncSync(fd);
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    if (code !== 'EINVAL' && code !== 'EPERM' && code !== 'EISDIR') throw error; // not for folders on this file system
  } finally {
    closeSync(fd);
  }
}
