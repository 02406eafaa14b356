/** Traces as the command line opens them. */
import type { Package } from '../config/index.js';
import { openTrace } from '../index.js';
import type { Trace } from '../trace/index.js';
import { wholeNumber } from './command.js';
import { parseClock } from './quantities.js';
import { type ShapeArgs, shapeOf } from './shape.js';

/** Opens a trace for a package: its dies, engines and capacity are what the rows are checked against. */
export function openFor(
  pkg: Package,
  file: string,
  args: ShapeArgs & { readonly 'skip-bad-rows': string },
): Promise<Trace> {
  const skipBadRows = wholeNumber('--skip-bad-rows', args['skip-bad-rows'], 0);
  const { shape, clock } = shapeOf(args);
  const cyclePs = parseClock(clock);
  return openTrace(file, {
    package: pkg,
    skipBadRows,
    shape,
    input: process.stdin,
    ...(cyclePs === undefined ? {} : { cyclePs }),
  });
}

/** Useful bytes of the whole trace, where they are known beforehand: a kernel trace says so, an access trace is read on the way. */
export function usefulBytes(trace: Trace): number {
  if (trace.kind === 'access') return Number.POSITIVE_INFINITY;
  return trace.kernels.reduce((sum, { repeat, readBytes, writeBytes }) => sum + repeat * (readBytes + writeBytes), 0);
}
