/** `penstock audit`: reads a command log back and holds every command against the device's rules, apart from the engine. */
import { auditLines, createAudit, createLogReader } from '../../audit/index.js';
import { loadPackage } from '../../config/index.js';
import { prettyJson } from '../../report/index.js';
import { openBytes } from '../../trace/index.js';
import { command, PACKAGE, SET, wholeNumber } from '../command.js';
import { FOUND_WORSE, INTERRUPTED } from '../failure.js';
import { Interrupted, type Session } from '../session.js';

export const audit = command({
  usage: 'audit <command-log>',
  about: 'check a log of DRAM commands against the device’s rules',
  positionals: {
    'command-log': {
      type: 'string',
      demandOption: true,
      describe: 'log that run --command-log wrote (.csv, .csv.gz), or - for standard input',
    },
  },
  options: {
    ...PACKAGE,
    ...SET,
    show: {
      type: 'string',
      default: '10',
      requiresArg: true,
      describe: 'violations to show in full; the first hundred and the first of each rule are kept',
    },
    json: { type: 'boolean', default: false, describe: 'print the findings as JSON' },
  },
  examples: [
    ['audit commands.csv.gz -p configs/wagtail.yaml', 'a log that run --command-log wrote'],
    ['audit commands.csv -p configs/wagtail.yaml --set memory.0.timings.tFAW=18ns', 'would it keep a longer tFAW?'],
  ],
  main: async (args, session) => {
    const pkg = loadPackage(args.package, args.set);
    const show = wholeNumber('--show', args.show, 0);
    const file = args['command-log'];
    const log = await openBytes(file, { input: process.stdin, expected: 'a command log, .csv or .csv.gz' });

    // the rules see the commands as the log is read: nothing is kept but the last command of each kind and place
    const checker = createAudit(pkg);
    const reader = createLogReader(file, pkg, (...fields) => checker.command(...fields));
    const stopped = !(await readAll(log, (bytes) => reader.push(bytes), session));
    if (!stopped) reader.end();
    const report = { ...checker.finish(), partial: stopped };
    const text = args.json ? prettyJson(report) : auditLines(report, show).join('\n');
    await session.print(`${stopped && !args.json ? 'Stopped before the log ended; so far:\n' : ''}${text}\n`);
    session.exitCode = stopped ? INTERRUPTED : report.ok ? session.exitCode : FOUND_WORSE;
  },
});

/** Hands all bytes on; false when an interrupt came first, which may be while nothing comes. */
async function readAll(
  log: AsyncIterable<Uint8Array>,
  take: (bytes: Uint8Array) => void,
  session: Session,
): Promise<boolean> {
  const source = log[Symbol.asyncIterator]();
  try {
    for (;;) {
      const { value, done } = await session.unlessInterrupted(source.next());
      if (done) return true;
      take(value);
      if (await session.breathe()) return false;
    }
  } catch (error) {
    if (error instanceof Interrupted) return false;
    void source.return?.(); // closes the file
    throw error;
  }
}
