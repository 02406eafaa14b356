/** `penstock profile`: what is in an access trace, without simulating it. */
import { profile as profileOf } from '../../analysis/index.js';
import { loadPackage } from '../../config/index.js';
import { InputError } from '../../errors.js';
import { openTrace } from '../../index.js';
import { prettyJson, profileReport } from '../../report/index.js';
import { command, PACKAGE, SET, wholeNumber } from '../command.js';
import { INTERRUPTED } from '../failure.js';
import { parseClock } from '../quantities.js';
import { SHAPE, shapeOf } from '../shape.js';

export const profile = command({
  usage: 'profile <trace>',
  about: 'what is in a trace, without simulating it: mix, footprint, order, reuse, spread',
  positionals: {
    trace: {
      type: 'string',
      demandOption: true,
      describe: 'trace (.csv, .csv.gz, .parquet, .arrow), or - for standard input',
    },
  },
  options: {
    package: { ...PACKAGE.package, demandOption: false, describe: 'package file whose address map spreads the trace' },
    ...SET,
    ...SHAPE,
    json: { type: 'boolean', default: false, describe: 'print it as JSON' },
  },
  examples: [
    ['profile trace.csv.gz', 'the trace alone'],
    ['profile trace.parquet -p configs/wagtail.yaml', 'and how the package’s address map spreads it'],
  ],
  main: async (args, session) => {
    const pkg = args.package === undefined ? null : loadPackage(args.package, args.set);
    const { shape, clock } = shapeOf(args);
    const cyclePs = parseClock(clock);
    const trace = await session.unlessInterrupted(
      openTrace(args.trace, {
        shape,
        skipBadRows: wholeNumber('--skip-bad-rows', args['skip-bad-rows'], 0),
        input: process.stdin,
        ...(cyclePs === undefined ? {} : { cyclePs }),
        ...(pkg === null ? {} : { package: pkg }),
      }),
    );
    if (trace.kind === 'kernel') {
      throw new InputError({
        where: { file: args.trace },
        found: 'a kernel trace',
        expected: 'an access trace',
        hint: 'what a kernel trace asks for stands in its rows; run and roofline say what becomes of it',
      });
    }
    const found = await profileOf(trace, pkg, async () => !(await session.breathe()));
    const text = args.json ? `${prettyJson(found)}\n` : profileReport(found, session);
    await session.print(
      session.signal.aborted && !args.json ? `Stopped before the trace ended; so far:\n${text}` : text,
    );
    if (session.signal.aborted) session.exitCode = INTERRUPTED;
  },
});
