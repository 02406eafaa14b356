/**
 * `penstock run`: the map of the house. From top to bottom: load the package, open the trace, run it, work out what the figures
 * mean, report. Each step is one call into one folder of src.
 */
import { buildResult, Delays } from '../../analysis/index.js';
import { loadPackage } from '../../config/index.js';
import { run as simulate } from '../../engine/index.js';
import { VERSION } from '../../index.js';
import { jsonReport, textReport } from '../../report/index.js';
import { command, PACKAGE, SET } from '../command.js';
import { CommandLog } from '../command-log.js';
import { CHECKS_FAILED } from '../failure.js';
import { htmlPage } from '../html.js';
import { OutputFile } from '../output.js';
import { ProgressBar } from '../progress.js';
import { parseUntil } from '../quantities.js';
import { SHAPE } from '../shape.js';
import { TableFolder } from '../tables.js';
import { openFor, usefulBytes } from '../trace.js';

export const run = command({
  usage: 'run <trace>',
  about: 'simulate a trace on a package and report',
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
    replay: {
      choices: ['closed', 'open', 'paced'],
      default: 'closed',
      requiresArg: true,
      describe: 'closed: as fast as windows let; open: recorded times are arrivals; paced: recorded gaps are kept',
    },
    seed: { type: 'string', default: '1', requiresArg: true, describe: 'seed of the random patterns' },
    until: { type: 'string', requiresArg: true, describe: 'stop at this simulated time, for example 2ms' },
    ...SHAPE,
    json: {
      type: 'string',
      requiresArg: true,
      describe: 'write the result document; - writes it to standard output, in place of the report',
    },
    html: { type: 'string', requiresArg: true, describe: 'write the report as one HTML page that works offline' },
    csv: {
      type: 'string',
      requiresArg: true,
      describe: 'write the tables as CSV into this folder: kernels, bandwidth stack, delays, banks and more',
    },
    'command-log': { type: 'string', requiresArg: true, describe: 'write every DRAM command (.csv, .csv.gz)' },
  },
  examples: [
    ['run traces/wagtail-step.csv -p configs/wagtail.yaml', 'the demo'],
    ['run traces/wagtail-step.csv -p configs/wagtail.yaml --json step.json', 'the same, with every figure kept'],
    ['run traces/wagtail-step.csv -p configs/wagtail.yaml --html step.html', 'with charts, to open in a browser'],
    [
      'run traces/wagtail-step.csv -p configs/wagtail.yaml --set memory.0.controller.page=closed',
      'one key of the package changed',
    ],
    [
      'run traces/wagtail-step.csv -p configs/wagtail.yaml --until 20us --command-log log.csv.gz',
      'the first 20 us, with every DRAM command',
    ],
    ['run access.csv.gz -p configs/wagtail.yaml --replay open', 'recorded times as arrivals'],
    ['run capture.csv -p configs/wagtail.yaml --columns-file capture.yaml', 'a captured trace of another shape'],
  ],
  main: async (args, session) => {
    // the package, with the overrides laid over it
    const pkg = loadPackage(args.package, args.set);

    // the trace: its rows are read as the engine asks for them
    const trace = await session.unlessInterrupted(openFor(pkg, args.trace, args));

    // the files asked for are opened before anything is computed, so that a bad place costs no waiting
    const untilPs = parseUntil(args.until);
    const jsonFile = args.json === undefined || args.json === '-' ? null : new OutputFile(args.json, 'result');
    const htmlFile = args.html === undefined ? null : new OutputFile(args.html, 'html');
    const tables = args.csv === undefined ? null : new TableFolder(args.csv);
    const log = args['command-log'] === undefined ? null : new CommandLog(args['command-log'], pkg);
    const progress = ProgressBar.on(process.stderr, { bytes: usefulBytes(trace), untilPs }, process.env);

    // the engine does the work and hands finished requests to the collector on the way
    const delays = new Delays();
    const options = {
      replay: args.replay as 'closed' | 'open' | 'paced',
      seed: args.seed,
      untilPs,
      windowPs: Number.POSITIVE_INFINITY,
      attribution: true,
      onCommand: log?.sink ?? null,
      onProgress: progress?.show ?? null,
      signal: session.signal,
    };
    const recording = await simulate(pkg, trace, options, [delays]).finally(() => progress?.stop());

    // what was recorded becomes figures, and the figures become words
    const result = buildResult(pkg, trace, { version: VERSION, options, overrides: args.set }, recording, delays);
    const document = args.json === undefined ? '' : jsonReport(result);
    jsonFile?.write(document);
    htmlFile?.write(htmlPage(result));
    tables?.write(result);
    log?.finish();
    jsonFile?.commit();
    htmlFile?.commit();
    tables?.commit();
    await session.print(args.json === '-' ? document : textReport(result, session));
    if (args.html !== undefined && args.json !== '-') await session.print(`HTML report: ${args.html}\n`);
    const failed = result.checks.filter((check) => !check.ok);
    if (failed.length === 0) return;
    session.warn(`penstock: the result must not be used: ${failed.map(({ name }) => name).join(', ')} failed`);
    session.exitCode = CHECKS_FAILED;
  },
});
