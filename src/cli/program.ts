/** The command line's grammar: every command with its options, and what is said when something else was typed. */
import yargs from 'yargs';
import { VERSION } from '../index.js';
import { audit } from './commands/audit.js';
import { convert } from './commands/convert.js';
import { describe } from './commands/describe.js';
import { gate } from './commands/gate.js';
import { profile } from './commands/profile.js';
import { roofline } from './commands/roofline.js';
import { run } from './commands/run.js';
import { schema } from './commands/schema.js';
import { sweep } from './commands/sweep.js';
import { synth } from './commands/synth.js';
import { whatif } from './commands/whatif.js';
import type { Session } from './session.js';
import { usageError } from './usage.js';

const COMMANDS = [run, roofline, whatif, sweep, gate, describe, profile, synth, convert, audit, schema];
const WIDTH = 100; // columns of the help, at most

/** Understands the words after the program's name and does what they ask. Throws UsageError, or what the command throws. */
export async function program(argv: readonly string[], session: Session): Promise<void> {
  const cli = yargs([...argv])
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
    .version(VERSION)
    .help()
    .alias('help', 'h')
    .wrap(Math.min(WIDTH, process.stdout.columns || WIDTH))
    .exitProcess(false)
    .fail((complaint, error) => {
      // what a command throws comes by here too; what the parser itself finds wrong is a complaint or a YError
      const own = error instanceof Error && error.name !== 'YError';
      throw own ? error : usageError(complaint ?? error.message, argv, COMMANDS);
    })
    .epilogue(
      'Exit codes: 0 fine, 1 the gate found worse or the audit violations, 2 the input is wrong, 3 the\nprogram’s own checks failed, 4 the system failed, 130 interrupted.',
    );
  for (const command of COMMANDS) command.add(cli, session);
  await cli.parseAsync();
}
