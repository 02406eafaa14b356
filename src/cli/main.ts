#!/usr/bin/env node
/** The program: reads the command line, runs one command, and is the only place that decides an exit code. */
import yargs from 'yargs';
import { hideBin } from 'yargs/helpers';
import { CheckError, InputError, SystemError } from '../errors.js';
import { VERSION } from '../index.js';
import { describe } from './commands/describe.js';
import { run } from './commands/run.js';
import { schema } from './commands/schema.js';
import { synth } from './commands/synth.js';
import { discardUnfinished } from './output.js';
import { Interrupted, Session } from './session.js';
import { isSystemError, systemError } from './system-error.js';
import { UsageError, usageError } from './usage.js';

const COMMANDS = [run, describe, synth, schema];
const WIDTH = 100; // columns of the help, at most
const OK = 0;
const BAD_INPUT = 2;
const CHECKS_FAILED = 3;
const SYSTEM_FAILED = 4;
const INTERRUPTED = 130;

const interrupt = new AbortController();
const session = new Session(interrupt.signal);

// the first signal asks the command to stop and say what it has; the second one does not wait for it
for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP'] as const) {
  process.on(signal, () => {
    if (interrupt.signal.aborted) leave(INTERRUPTED);
    session.warn(`${process.stderr.isTTY ? '\n' : ''}penstock: stopping; interrupt again to leave at once`);
    interrupt.abort();
  });
}
// what is left at the end, by whatever way, is not a whole file
process.on('exit', discardUnfinished);
for (const event of ['uncaughtException', 'unhandledRejection'] as const) {
  process.on(event, (error: unknown) => leave(fail(error)));
}

const code = await main(hideBin(process.argv));
if (interrupt.signal.aborted) leave(code); // input that is still open would keep the process
process.exitCode = code;

async function main(argv: string[]): Promise<number> {
  try {
    await parse(argv);
    await session.print(''); // throws what standard output could not take
    return session.exitCode !== OK || !interrupt.signal.aborted ? session.exitCode : INTERRUPTED;
  } catch (error) {
    discardUnfinished();
    return fail(error);
  }
}

async function parse(argv: string[]): Promise<void> {
  const cli = yargs(argv)
    .scriptName('penstock')
    .usage(
      '$0 <command>\n\nSimulates the memory traffic of an accelerator package: what memory delivers, what waits, and why.',
    )
    .locale('en')
    .parserConfiguration({
      'boolean-negation': false,
      'camel-case-expansion': false,
      'dot-notation': false,
      'greedy-arrays': false, // --set a=1 trace.csv: the trace is not a second value
      'parse-numbers': false,
      'parse-positional-numbers': false,
    })
    .strict()
    .demandCommand(1, 1)
    .recommendCommands()
    .version(VERSION)
    .help()
    .alias('help', 'h')
    .wrap(Math.min(WIDTH, process.stdout.columns || WIDTH))
    .exitProcess(false)
    .fail((complaint, error) => {
      throw error instanceof Error && !(complaint && complaint === error.message && error.name === 'YError')
        ? error
        : usageError(complaint, argv, COMMANDS);
    })
    .epilogue(
      'Exit codes: 0 fine, 1 audit found violations, 2 the input is wrong, 3 the program’s own checks\nfailed, 4 the system failed, 130 interrupted.',
    );
  for (const command of COMMANDS) command.add(cli, session);
  await cli.parseAsync();
}

/** Says what went wrong in one paragraph and gives its exit code. */
function fail(error: unknown): number {
  const { PENSTOCK_DEBUG } = process.env;
  if (PENSTOCK_DEBUG && error instanceof Error) session.warn(error.stack ?? error.message);
  if (error instanceof UsageError || error instanceof InputError) {
    session.warn(error.message);
    return BAD_INPUT;
  }
  if (error instanceof Interrupted) return INTERRUPTED;
  if (error instanceof CheckError) {
    session.warn(`penstock: a check of the program itself failed, and its results must not be used: ${error.message}`);
    return CHECKS_FAILED;
  }
  if (error instanceof SystemError) {
    session.warn(error.message);
    return SYSTEM_FAILED;
  }
  if (isSystemError(error)) {
    session.warn((systemError('the system failed', error) as Error).message);
    return SYSTEM_FAILED;
  }
  const said = error instanceof Error ? error.message.split('\n')[0] : String(error);
  session.warn(`penstock: internal error: ${said}. Set PENSTOCK_DEBUG=1 to see where`);
  return CHECKS_FAILED;
}

/** Ends at once. */
function leave(code: number): never {
  discardUnfinished();
  process.exit(code);
}
