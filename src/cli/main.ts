#!/usr/bin/env node
/** The program as a process: signals, what is left behind, and the only place that sets an exit code. */
import { hideBin } from 'yargs/helpers';
import { failure, INTERRUPTED, OK } from './failure.js';
import { discardUnfinished } from './output.js';
import { program } from './program.js';
import { Session } from './session.js';

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
  process.on(event, (error: unknown) => leave(explain(error)));
}

const code = await main(hideBin(process.argv));
if (interrupt.signal.aborted) leave(code); // input that is still open would keep the process
process.exitCode = code;

async function main(argv: readonly string[]): Promise<number> {
  try {
    await program(argv, session);
    await session.print(''); // throws what standard output could not take
    return session.exitCode !== OK || !interrupt.signal.aborted ? session.exitCode : INTERRUPTED;
  } catch (error) {
    discardUnfinished();
    return explain(error);
  }
}

/** Says what went wrong and gives its exit code. The stack is for those who work on the program. */
function explain(error: unknown): number {
  const { PENSTOCK_DEBUG } = process.env;
  if (PENSTOCK_DEBUG && error instanceof Error) session.warn(error.stack ?? '');
  const { code, message } = failure(error);
  if (message !== '') session.warn(message);
  return code;
}

/** Ends at once. */
function leave(code: number): never {
  discardUnfinished();
  process.exit(code);
}
