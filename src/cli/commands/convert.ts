/** `penstock convert`: writes an access trace of any shape and form in our own, as CSV or as columns. */
import { InputError } from '../../errors.js';
import { openTrace } from '../../index.js';
import type { AccessTrace } from '../../trace/index.js';
import { command, wholeNumber } from '../command.js';
import { parseClock } from '../quantities.js';
import { SHAPE, shapeOf } from '../shape.js';
import { FORMS, formOfOutput, writeTrace } from '../trace-output.js';

export const convert = command({
  usage: 'convert <in> <out>',
  about: 'write an access trace of any shape as CSV, Parquet or Arrow',
  positionals: {
    in: {
      type: 'string',
      demandOption: true,
      describe: `trace (${FORMS}), or - for standard input`,
    },
    out: { type: 'string', demandOption: true, describe: `file to write (${FORMS}), or - for CSV on standard output` },
  },
  options: { ...SHAPE },
  examples: [
    ['convert capture.csv trace.parquet --columns-file capture.yaml', 'a captured trace of another shape'],
    ['convert trace.parquet trace.csv.gz', 'and back to text'],
  ],
  main: async (args, session) => {
    formOfOutput(args.out);
    const { shape, clock } = shapeOf(args);
    const cyclePs = parseClock(clock);
    const skipBadRows = wholeNumber('--skip-bad-rows', args['skip-bad-rows'], 0);
    const trace = await session.unlessInterrupted(
      openTrace(args.in, { shape, skipBadRows, input: process.stdin, ...(cyclePs === undefined ? {} : { cyclePs }) }),
    );
    if (trace.kind === 'kernel')
      throw new InputError({
        where: { file: args.in },
        found: 'a kernel trace',
        expected: 'an access trace',
        hint: 'kernel traces are CSV, and become accesses only on a package',
      });

    const rows = await writeTrace(
      args.out,
      trace.batches(),
      namesOf(trace),
      session,
      trace.fraction ?? (() => Number.NaN),
    );
    if (rows === null || args.out === '-') return;
    const { skippedRows } = trace.facts();
    const skipped = skippedRows > 0 ? `, ${skippedRows.toLocaleString('en-US')} bad rows skipped` : '';
    await session.print(`${args.out}: ${rows.toLocaleString('en-US')} rows${skipped}\n`);
  },
});

/** Kernel names are written where the trace has any of its own. */
function namesOf({ kernelNames }: AccessTrace): readonly string[] | null {
  return kernelNames.length === 1 && kernelNames[0] === 'trace' ? null : kernelNames;
}
