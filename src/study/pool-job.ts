/** What goes to a worker and what comes back: plain data only, since it crosses between threads. */
import type { Result } from '../analysis/index.js';
import type { Progress } from '../engine/index.js';
import { CheckError, InputError, type InputProblem, SystemError } from '../errors.js';
import type { SimulateOptions } from '../index.js';
import type { TraceOptions } from '../trace/index.js';

/** One run: a package with overrides, a trace, and how it is replayed. */
export interface Job {
  readonly package: string; // file
  readonly overrides?: readonly string[]; // path=value, laid over it in order
  readonly trace: string; // file; standard input can be read only once, so not for a pool
  readonly traceOptions?: Pick<TraceOptions, 'skipBadRows' | 'cyclePs' | 'shape'>;
  readonly run?: Pick<SimulateOptions, 'replay' | 'seed' | 'untilPs'>;
}

/** What became of a job. A failure is the error the run threw: InputError, CheckError, SystemError, or another for a defect. */
export type Outcome =
  | { readonly ok: true; readonly result: Result }
  | { readonly ok: false; readonly error: InputError | CheckError | SystemError | Error };

/** An error as data: classes do not survive the way between threads. */
export type SentError =
  | { readonly kind: 'InputError'; readonly problem: InputProblem }
  | { readonly kind: 'CheckError' | 'SystemError' | 'Error'; readonly message: string; readonly stack: string };

/** From a worker to the pool. */
export type Answer =
  | { readonly type: 'progress'; readonly progress: Progress }
  | { readonly type: 'result'; readonly result: Result }
  | { readonly type: 'error'; readonly error: SentError };

/** Makes an error into data. */
export function sentError(error: unknown): SentError {
  if (error instanceof InputError) {
    const { where, found, expected, hint } = error;
    return { kind: 'InputError', problem: { where: { ...where }, found, expected, hint } };
  }
  const { message, stack = '' } = error instanceof Error ? error : new Error(String(error));
  if (error instanceof CheckError) return { kind: 'CheckError', message, stack };
  // what the operating system refused carries the name of the call
  const system = error instanceof SystemError || (error instanceof Error && 'syscall' in error && 'code' in error);
  return { kind: system ? 'SystemError' : 'Error', message, stack };
}

/** The error again, of its own class. */
export function receivedError(sent: SentError): InputError | CheckError | SystemError | Error {
  if (sent.kind === 'InputError') return new InputError(sent.problem);
  const kinds = { CheckError, SystemError, Error };
  const error = new kinds[sent.kind](sent.message);
  if (sent.stack !== '') error.stack = sent.stack;
  return error;
}
