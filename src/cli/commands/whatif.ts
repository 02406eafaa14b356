/** `penstock whatif`: the same run with one limit lifted at a time, ranked by the time that would save. */
import { InputError } from '../../errors.js';
import { prettyJson, whatIfReport } from '../../report/index.js';
import { defaultWorkers, LIMITS, whatIf } from '../../study/index.js';
import { OWN_SHAPE } from '../../trace/index.js';
import { command, PACKAGE, SET, wholeNumber } from '../command.js';
import { CHECKS_FAILED } from '../failure.js';
import { parseClock } from '../quantities.js';
import { SHAPE, shapeOf } from '../shape.js';

export const whatif = command({
  usage: 'whatif <trace>',
  about: 'simulate with one limit lifted at a time, ranked by the time saved',
  positionals: {
    trace: { type: 'string', demandOption: true, describe: 'trace file (.csv, .csv.gz)' },
  },
  options: {
    ...PACKAGE,
    ...SET,
    ...SHAPE,
    limits: {
      type: 'string',
      requiresArg: true,
      default: '',
      defaultDescription: 'all',
      describe: `which to lift, with commas: ${LIMITS.map(({ key }) => key).join(', ')}`,
    },
    pairs: { type: 'boolean', default: false, describe: 'every two of them as well: which only help together' },
    replay: {
      choices: ['closed', 'open', 'paced'],
      default: 'closed',
      requiresArg: true,
      describe: 'as in run',
    },
    seed: { type: 'string', default: '1', requiresArg: true, describe: 'seed of the random patterns' },
    workers: {
      type: 'string',
      requiresArg: true,
      default: String(defaultWorkers()),
      defaultDescription: 'as many as cores',
      describe: 'runs side by side; the figures do not depend on it',
    },
    json: { type: 'boolean', default: false, describe: 'print it as JSON, with the --set that gives each run' },
  },
  examples: [
    ['whatif traces/wagtail-step.csv -p configs/wagtail.yaml', 'what would help the demo most'],
    ['whatif traces/wagtail-step.csv -p configs/wagtail.yaml --limits window,credits --pairs', 'and together'],
  ],
  main: async (args, session) => {
    if (args.trace === '-') {
      const expected = 'a trace file: every run reads it again';
      throw new InputError({ where: { file: 'whatif' }, found: 'standard input', expected });
    }
    const workers = wholeNumber('--workers', args.workers, 1);
    const { shape, clock } = shapeOf(args);
    const cyclePs = parseClock(clock);
    const job = {
      package: args.package,
      overrides: args.set,
      trace: args.trace,
      traceOptions: {
        skipBadRows: wholeNumber('--skip-bad-rows', args['skip-bad-rows'], 0),
        ...(shape === OWN_SHAPE ? {} : { shape }), // a copy in another thread is not the same any more
        ...(cyclePs === undefined ? {} : { cyclePs }),
      },
      run: { replay: args.replay as 'closed' | 'open' | 'paced', seed: args.seed },
    };
    const only = args.limits.split(',').flatMap((key) => (key.trim() === '' ? [] : [key.trim()]));
    const live = process.stderr.isTTY === true;
    let runs = 0;
    const found = await whatIf(job, {
      workers,
      signal: session.signal,
      pairs: args.pairs,
      only,
      onPlan: (count, threads, aboutMs) => {
        runs = count;
        session.warn(`penstock: ${count} more runs, ${threads} side by side, about ${duration(aboutMs)}`);
      },
      onRun: (done) => {
        if (live) process.stderr.write(done < runs ? `\r${done} of ${runs} done` : '\r\u001b[K');
      },
    });
    const source = { packageFile: args.package, traceFile: args.trace, overrides: args.set };
    await session.print(args.json ? `${prettyJson(found)}\n` : whatIfReport(found, source, session));
    const rows = [...found.lifted, ...found.pairs, ...(found.everything === null ? [] : [found.everything])];
    const failed = rows.filter(({ checks_ok }) => !checks_ok);
    if (failed.length === 0) return;
    session.warn(
      `penstock: must not be used: self checks failed without ${failed.map(({ label }) => label).join(', ')}`,
    );
    session.exitCode = CHECKS_FAILED;
  },
});

function duration(ms: number): string {
  const seconds = Math.max(1, Math.round(ms / 1000));
  return seconds < 90 ? `${seconds} s` : `${Math.round(seconds / 60)} min`;
}
