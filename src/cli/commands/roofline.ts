/** `penstock roofline`: simulates a trace and sets each kernel against its bound and against the trace's own estimate. */
import { standings } from '../../analysis/index.js';
import { loadPackage } from '../../config/index.js';
import { InputError } from '../../errors.js';
import { simulate } from '../../index.js';
import { prettyJson, rooflineReport } from '../../report/index.js';
import { command, PACKAGE, SET } from '../command.js';
import { CHECKS_FAILED } from '../failure.js';
import { ProgressBar } from '../progress.js';
import { SHAPE } from '../shape.js';
import { openFor, usefulBytes } from '../trace.js';

export const roofline = command({
  usage: 'roofline <trace>',
  about: 'simulate, and set each kernel against its bound and its own estimate',
  positionals: {
    trace: {
      type: 'string',
      demandOption: true,
      describe: 'trace (.csv, .csv.gz, .parquet, .arrow), or - for standard input',
    },
  },
  options: {
    ...PACKAGE,
    ...SET,
    ...SHAPE,
    within: {
      type: 'string',
      default: '10%',
      requiresArg: true,
      describe: 'how far off an estimate may be and still hold',
    },
    seed: { type: 'string', default: '1', requiresArg: true, describe: 'seed of the random patterns' },
    json: { type: 'boolean', default: false, describe: 'print it as JSON' },
  },
  examples: [
    ['roofline traces/wagtail-step.csv -p configs/wagtail.yaml', 'which of the spreadsheet’s estimates hold'],
    ['roofline traces/wagtail-step.csv -p configs/wagtail.yaml --within 25%', 'with more patience'],
  ],
  main: async (args, session) => {
    const within = share(args.within);
    const pkg = loadPackage(args.package, args.set);
    const trace = await session.unlessInterrupted(openFor(pkg, args.trace, args));
    const untilPs = Number.POSITIVE_INFINITY;
    const progress = ProgressBar.on(process.stderr, { bytes: usefulBytes(trace), untilPs }, process.env);
    const result = await simulate(pkg, trace, {
      seed: args.seed,
      overrides: args.set,
      onProgress: progress?.show ?? null,
      signal: session.signal,
    }).finally(() => progress?.stop());
    const found = standings(result, within);
    await session.print(args.json ? `${prettyJson(found)}\n` : rooflineReport(result, found, within, session));
    const failed = result.checks.filter((check) => !check.ok);
    if (failed.length === 0) return;
    session.warn(`penstock: the result must not be used: ${failed.map(({ name }) => name).join(', ')} failed`);
    session.exitCode = CHECKS_FAILED;
  },
});

function share(text: string): number {
  const match = /^(\d+(?:\.\d+)?)\s*%$/.exec(text.trim());
  if (match !== null && Number(match[1]) > 0) return Number(match[1]) / 100;
  throw new InputError({
    where: { file: '--within' },
    found: `'${text}'`,
    expected: 'a share in per cent, for example 10%',
  });
}
