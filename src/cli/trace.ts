/** Traces as the command line opens them. */
import type { Package } from '../config/index.js';
import { openTrace } from '../index.js';
import type { Trace } from '../trace/index.js';
import { parseClock } from './quantities.js';

/** Opens a trace for a package: its dies, engines and capacity are what the rows are checked against. */
export function openFor(
  pkg: Package,
  file: string,
  { skipBadRows, clock }: { readonly skipBadRows: number; readonly clock: string | undefined },
): Promise<Trace> {
  const cyclePs = parseClock(clock);
  return openTrace(file, {
    package: pkg,
    skipBadRows,
    input: process.stdin,
    ...(cyclePs === undefined ? {} : { cyclePs }),
  });
}

/** Useful bytes of the whole trace, where they are known beforehand: a kernel trace says so, an access trace is read on the way. */
export function usefulBytes(trace: Trace): number {
  if (trace.kind === 'access') return Number.POSITIVE_INFINITY;
  return trace.kernels.reduce((sum, { repeat, readBytes, writeBytes }) => sum + repeat * (readBytes + writeBytes), 0);
}
