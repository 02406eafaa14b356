/** What the operating system said, in plain words. */
import { SystemError } from '../errors.js';

const WORDS: Readonly<Record<string, string>> = {
  EACCES: 'permission denied',
  EDQUOT: 'the disk quota is used up',
  EFBIG: 'the file would be too large for the file system',
  EIO: 'the disk reported an error',
  EISDIR: 'it is a directory',
  ELOOP: 'its links go round in a circle',
  EMFILE: 'too many files are open',
  ENAMETOOLONG: 'the name is too long',
  ENOENT: 'no such file or folder',
  ENOSPC: 'no space left on the disk',
  ENOTDIR: 'a part of the path is not a folder',
  EPERM: 'the operation is not permitted',
  EPIPE: 'the reader has closed the pipe',
  EROFS: 'the file system is read-only',
  ETXTBSY: 'the file is being executed',
};

/** Is this an error of a system call (it carries errno's name)? */
export function isSystemError(error: unknown): error is NodeJS.ErrnoException {
  return error instanceof Error && 'syscall' in error && typeof (error as NodeJS.ErrnoException).code === 'string';
}

/** Wraps what a system call threw; anything else is given back as it is. `what` says what could not be done. */
export function systemError(what: string, error: unknown): unknown {
  if (!isSystemError(error)) return error;
  const code = error.code ?? '';
  return new SystemError(`${what}: ${WORDS[code] ?? error.message} (${code})`, { cause: error });
}
