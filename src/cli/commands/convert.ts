/** `penstock convert`: writes an access trace of any shape and form in our own, as CSV or as columns. */
import { InputError } from '../../errors.js';
import { openTrace } from '../../index.js';
import { type AccessBatch, type AccessTrace, accessCsv, arrowBytes, parquetBytes } from '../../trace/index.js';
import { command, wholeNumber } from '../command.js';
import { INTERRUPTED } from '../failure.js';
import { OutputFile } from '../output.js';
import { parseClock } from '../quantities.js';
import type { Session } from '../session.js';
import { SHAPE, shapeOf } from '../shape.js';

const FORMS = /\.(csv|csv\.gz|parquet|arrow)$/i;

export const convert = command({
  usage: 'convert <in> <out>',
  about: 'write an access trace of any shape as CSV, Parquet or Arrow',
  positionals: {
    in: {
      type: 'string',
      demandOption: true,
      describe: 'trace (.csv, .csv.gz, .parquet, .arrow), or - for standard input',
    },
    out: { type: 'string', demandOption: true, describe: 'file to write (.csv, .csv.gz, .parquet, .arrow)' },
  },
  options: { ...SHAPE },
  examples: [
    ['convert capture.csv trace.parquet --columns-file capture.yaml', 'a captured trace of another shape'],
    ['convert trace.parquet trace.csv.gz', 'and back to text'],
  ],
  main: async (args, session) => {
    const form = FORMS.exec(args.out)?.[1].toLowerCase();
    if (form === undefined)
      throw new InputError({
        where: { file: args.out },
        found: 'a name that says no form',
        expected: 'one that ends in .csv, .csv.gz, .parquet or .arrow',
      });
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

    const output = new OutputFile(
      args.out,
      form === 'parquet' ? 'parquet' : form === 'arrow' ? 'arrow' : 'accessTrace',
    );
    const batches = whileWanted(trace, session);
    const names = await namesOf(trace);
    const pieces =
      form === 'parquet'
        ? parquetBytes(batches, names)
        : form === 'arrow'
          ? arrowBytes(batches, names)
          : accessCsv(batches, names);
    for await (const piece of pieces) output.write(piece);
    if (session.signal.aborted) {
      output.discard();
      session.exitCode = INTERRUPTED;
      return;
    }
    output.commit();
    const { rows, skippedRows } = trace.facts();
    const skipped = skippedRows > 0 ? `, ${skippedRows.toLocaleString('en-US')} bad rows skipped` : '';
    await session.print(`${args.out}: ${rows.toLocaleString('en-US')} rows${skipped}\n`);
  },
});

/** Kernel names are written where the trace has any of its own. */
async function namesOf({ kernelNames }: AccessTrace): Promise<readonly string[] | null> {
  return kernelNames.length === 1 && kernelNames[0] === 'trace' ? null : kernelNames;
}

async function* whileWanted(trace: AccessTrace, session: Session): AsyncGenerator<AccessBatch> {
  for await (const batch of trace.batches()) {
    if (await session.breathe()) return;
    yield batch;
  }
}
