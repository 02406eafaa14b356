/**
 * Files the user asked for. Each is written whole or not at all: under a temporary name in its own folder, then renamed. An
 * existing file is replaced only by the same kind of output, so that a slip of the hand cannot cost someone a trace.
 */
import {
  closeSync,
  fchmodSync,
  fsyncSync,
  openSync,
  readSync,
  realpathSync,
  renameSync,
  type Stats,
  statSync,
  unlinkSync,
  writeSync,
} from 'node:fs';
import { basename, dirname, join, resolve } from 'node:path';
import { constants, gunzipSync, gzipSync } from 'node:zlib';
import { InputError, SystemError } from '../errors.js';
import { TABLE_NAMES, tableHead } from '../report/index.js';
import { systemError } from './system-error.js';

/** What each kind of output is called, and how a file that holds it begins. */
export const KINDS = {
  result: { name: 'a penstock result', begins: (head: string) => /^\{\s*"format":\s*"penstock-result"/.test(head) },
  commandLog: {
    name: 'a command log',
    begins: (head: string) =>
      head.startsWith('ck,stack,channel,pseudo_channel,sid,bank_group,bank,row,column,command,'),
  },
  html: {
    name: 'a penstock HTML report',
    begins: (head: string) =>
      head.startsWith('<!doctype html>') && head.includes('<meta name="generator" content="penstock">'),
  },
  table: {
    name: 'a penstock table',
    begins: (head: string) => TABLE_NAMES.some((name) => head.startsWith(`${tableHead(name)}\n`)),
  },
  sweep: { name: 'points of a sweep', begins: (head: string) => head.startsWith('{"format":"penstock-sweep"') },
  sweepRuns: {
    name: 'a sweep’s table of runs',
    begins: (head: string) => head.startsWith('point,configuration,package,trace,'),
  },
  sweepConfigurations: {
    name: 'a sweep’s table of configurations',
    begins: (head: string) => head.startsWith('configuration,package,trace,'),
  },
  gate: { name: 'a gate’s JSON', begins: (head: string) => /^\{\s*"format":\s*"penstock-gate"/.test(head) },
  markdown: { name: 'a gate’s Markdown', begins: (head: string) => /^### (Same|Better|Worse|Changed): /.test(head) },
  junit: { name: 'JUnit XML', begins: (head: string) => head.startsWith('<?xml') && head.includes('<testsuites ') },
  accessTrace: { name: 'an access trace', begins: isAccessTrace },
  kernelTrace: {
    name: 'a kernel trace',
    begins: (head: string) => {
      const columns = columnsOf(head);
      return ['kernel', 'read', 'write', 'read_pattern'].every((column) => columns.includes(column));
    },
  },
  zstd: { name: 'a zstd file', begins: (head: string) => head.startsWith('\x28\xb5\x2f\xfd') },
  parquet: { name: 'a Parquet file', begins: (head: string) => head.startsWith('PAR1') },
  arrow: { name: 'an Arrow IPC file', begins: (head: string) => head.startsWith('ARROW1') },
} as const;
export type Kind = keyof typeof KINDS;

const HEAD_BYTES = 4096; // enough of an existing file to tell its kind
const GZIP_LEVEL = 4; // near the knee of size against time on command logs; common practice, no source

const unfinished = new Set<OutputFile>();

const cleanups = new Set<() => void>();

/** Removes the temporary files of outputs that are still being written; for the way out after a failure or an interrupt. */
export function discardUnfinished(): void {
  for (const output of unfinished) output.discard();
  for (const clean of cleanups) {
    try {
      clean();
    } catch {
      // the way out must not fail over a leftover
    }
  }
  cleanups.clear();
}

/** Has `discardUnfinished` call `clean` too, unless the function returned was called before. */
export function atTheEnd(clean: () => void): () => void {
  cleanups.add(clean);
  return () => void cleanups.delete(clean);
}

/** A name of its own beside `name`: no two programs share it, and no leftover of one that was killed. */
export function temporaryName(name: string): string {
  return `.${name}.${process.pid}-${Date.now().toString(36)}.tmp`;
}

/** One output file. A name that ends in .gz is compressed, one gzip member for each piece written (RFC 1952, section 2.2). */
export class OutputFile {
  readonly target: string; // what is replaced: links are followed
  private readonly temporary: string | null; // null: not a regular file (a pipe, /dev/null), written as it is
  private readonly fd: number;
  private readonly zipped: boolean;
  private open = true;

  /** Checks the place and opens the temporary file. Throws InputError for a file of another kind, SystemError for the rest. */
  constructor(
    private readonly file: string,
    kind: Kind,
  ) {
    this.zipped = file.endsWith('.gz');
    const there = standing(file);
    if (there?.isDirectory()) throw new SystemError(`${file}: cannot be written: it is a directory. Name a file in it`);
    if (there?.isFile() && there.size > 0) refuseForeign(file, kind);
    const special = there !== undefined && !there.isFile();
    this.target = there === undefined ? file : attempt(file, () => realpathSync(file));
    if (!special) refuseTwice(file, this.target);
    this.temporary = special ? null : join(dirname(this.target), temporaryName(basename(this.target)));
    this.fd = attempt(file, () => openSync(this.temporary ?? this.target, special ? 'w' : 'wx', 0o666));
    unfinished.add(this);
    // a replaced file keeps its permissions, where the file system has them
    if (there?.isFile()) attempt(file, () => fchmodSync(this.fd, there.mode & 0o777));
  }

  /** Writes all of a piece before it returns. Throws SystemError when the system will not take it. */
  write(piece: string | Uint8Array): void {
    const plain = typeof piece === 'string' ? Buffer.from(piece) : piece;
    if (plain.length === 0) return;
    const bytes = this.zipped ? gzipSync(plain, { level: GZIP_LEVEL }) : plain;
    attempt(this.file, () => {
      for (let from = 0; from < bytes.length; ) from += writeSync(this.fd, bytes, from);
    });
  }

  /** Puts the file in its place: from here on it is there, whole. */
  commit(): void {
    try {
      attempt(this.file, () => {
        if (this.temporary !== null) fsyncSync(this.fd);
        closeSync(this.fd);
        this.open = false;
        if (this.temporary !== null) renameSync(this.temporary, this.target);
      });
      unfinished.delete(this);
    } catch (error) {
      this.discard();
      throw error;
    }
  }

  /** Gives the file up and leaves nothing behind. Does nothing after `commit`. */
  discard(): void {
    if (!unfinished.delete(this)) return;
    try {
      if (this.open) closeSync(this.fd);
      this.open = false;
      if (this.temporary !== null) unlinkSync(this.temporary);
    } catch {
      // the way out must not fail over a leftover
    }
  }
}

/** What stands at `file`, or undefined. A missing folder is told apart from a missing file. */
function standing(file: string): Stats | undefined {
  const there = attempt(file, () => statSync(file, { throwIfNoEntry: false }));
  const folder = dirname(file);
  if (there === undefined && statSync(folder, { throwIfNoEntry: false }) === undefined) {
    throw new SystemError(`${file}: cannot be written: there is no folder ${folder}. Make it first`);
  }
  return there;
}

function refuseForeign(file: string, kind: Kind): void {
  if (KINDS[kind].begins(headOf(file))) return;
  const same = KINDS[kind].name;
  throw new InputError({
    where: { file },
    found: `a file that is not ${same}`,
    expected: `a new name, or ${same} to replace`,
    hint: 'Nothing was written; name another file, or remove this one',
  });
}

/** One run cannot write two outputs to one file. */
function refuseTwice(file: string, target: string): void {
  for (const other of unfinished) {
    if (resolve(other.target) !== resolve(target)) continue;
    const expected = 'a file of its own for each output';
    throw new InputError({ where: { file }, found: 'a file that another output of this run goes to', expected });
  }
}

/** The first characters of a file, un-gzipped when it is gzip. */
function headOf(file: string): string {
  return attempt(file, () => {
    const fd = openSync(file, 'r');
    try {
      const bytes = Buffer.alloc(HEAD_BYTES);
      const head = bytes.subarray(0, readSync(fd, bytes, 0, HEAD_BYTES, 0));
      if (head[0] !== 0x1f || head[1] !== 0x8b) return head.toString('latin1');
      return gunzipSync(head, { finishFlush: constants.Z_SYNC_FLUSH }).toString('latin1');
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code?.startsWith('Z_')) return ''; // damaged gzip: not ours
      throw error;
    } finally {
      closeSync(fd);
    }
  });
}

/** Names in the header row of a trace. */
function columnsOf(head: string): string[] {
  const first = head.split(/\r?\n/, 40).find((line) => line !== '' && !line.startsWith('#')) ?? '';
  return first.split(',').map((column) => column.trim().toLowerCase());
}

function isAccessTrace(head: string): boolean {
  const columns = columnsOf(head);
  return ['op', 'address', 'bytes'].every((column) => columns.includes(column));
}

/** Runs a step of writing `file` and says in plain words what the system had against it. */
function attempt<T>(file: string, step: () => T): T {
  try {
    return step();
  } catch (error) {
    throw systemError(`${file}: cannot be written`, error);
  }
}
