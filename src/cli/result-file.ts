/** Result documents that a user names. */
import { readFileSync } from 'node:fs';
import { RESULT_FORMAT, type Result, resultProblems } from '../analysis/index.js';
import { InputError } from '../errors.js';
import { systemError } from './system-error.js';

const MOST_PROBLEMS = 3; // named one by one

/** Reads a result document; `hint` goes into the error when there is no such file. Throws InputError, SystemError. */
export function readResult(file: string, hint?: string): { readonly result: Result; readonly text: string } {
  const expected = 'a result document, as penstock run --json writes it';
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    const found = code === 'ENOENT' || code === 'ENOTDIR' ? 'no such file' : code === 'EISDIR' ? 'a directory' : '';
    if (found === '') throw systemError(`${file}: cannot be read`, error);
    throw new InputError({ where: { file }, found, expected, hint });
  }
  let document: unknown;
  try {
    document = JSON.parse(text);
  } catch {
    throw new InputError({ where: { file }, found: text.trim() === '' ? 'an empty file' : 'no JSON', expected });
  }
  if ((document as { format?: unknown } | null)?.format !== RESULT_FORMAT) {
    throw new InputError({ where: { file }, found: 'another kind of document', expected });
  }
  const problems = resultProblems(document);
  if (problems.length > 0) {
    const more = problems.length > MOST_PROBLEMS ? ` and ${problems.length - MOST_PROBLEMS} more` : '';
    throw new InputError({
      where: { file },
      found: `a result of another shape (${problems.slice(0, MOST_PROBLEMS).join('; ')}${more})`,
      expected: 'one of this version of penstock',
      hint: 'Run it again with this version',
    });
  }
  return { result: document as Result, text };
}
