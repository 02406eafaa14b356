/** What went wrong, as an exit code and one paragraph. */
import { CheckError, InputError, SystemError } from '../errors.js';
import { Interrupted } from './session.js';
import { isSystemError, systemError } from './system-error.js';
import { UsageError } from './usage.js';

export const OK = 0;
export const FOUND_WORSE = 1; // an audit that found violations
export const BAD_INPUT = 2;
export const CHECKS_FAILED = 3;
export const SYSTEM_FAILED = 4;
export const INTERRUPTED = 130;

export interface Failure {
  readonly code: number;
  readonly message: string; // '' when there is nothing to say
}

export function failure(error: unknown): Failure {
  if (error instanceof UsageError || error instanceof InputError) return { code: BAD_INPUT, message: error.message };
  if (error instanceof Interrupted) return { code: INTERRUPTED, message: '' };
  if (error instanceof SystemError) return { code: SYSTEM_FAILED, message: error.message };
  if (isSystemError(error)) return failure(systemError('the system failed', error));
  if (error instanceof CheckError) {
    const message = `penstock: a check of the program itself failed, and its results must not be used: ${error.message}`;
    return { code: CHECKS_FAILED, message };
  }
  const said = error instanceof Error ? error.message.split('\n')[0] : String(error);
  return { code: CHECKS_FAILED, message: `penstock: internal error: ${said}. Set PENSTOCK_DEBUG=1 to see where` };
}
