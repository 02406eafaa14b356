/** What a command is to the command line: its words and options, and the function that does it. */
import type { Argv, InferredOptionTypes, Options, PositionalOptions } from 'yargs';
import { InputError } from '../errors.js';
import type { Session } from './session.js';
import { type Usable, UsageError } from './usage.js';

export interface Command extends Usable {
  add(cli: Argv, session: Session): Argv;
}

interface Definition<P extends Record<string, PositionalOptions>, O extends Record<string, Options>> {
  readonly usage: string; // as in the help: 'run <trace>'
  readonly about: string;
  readonly positionals: P;
  readonly options: O;
  readonly examples: readonly (readonly [command: string, does: string])[];
  /** Commands of two words: their usage begins with the second. */
  readonly subcommands?: readonly Command[];
  /** Does the work. What it throws decides the exit code; Session.exitCode does otherwise. */
  readonly main: (args: InferredOptionTypes<P> & InferredOptionTypes<O>, session: Session) => Promise<void>;
}

export function command<P extends Record<string, PositionalOptions>, O extends Record<string, Options>>(
  definition: Definition<P, O>,
): Command {
  const { usage, about, positionals, options, examples, main, subcommands = [] } = definition;
  const single = Object.keys(options).filter((name) => !options[name].array);
  return {
    name: usage.split(' ')[0],
    usage,
    subcommands,
    options: Object.keys(options),
    letters: Object.fromEntries(
      Object.entries(options).flatMap(([name, { alias }]) => (typeof alias === 'string' ? [[alias, name]] : [])),
    ),
    add: (cli, session) =>
      cli.command(
        usage,
        about,
        (own) => {
          for (const sub of subcommands) sub.add(own, session);
          for (const [name, positional] of Object.entries(positionals)) {
            own.positional(name, positional);
            if (!('array' in positional)) own.nargs(name, 1); // so that - is a value too
          }
          return own
            .options(
              // a command's options are not those of the commands below it
              Object.fromEntries(Object.entries(options).map(([name, option]) => [name, { ...option, global: false }])),
            )
            .epilogue(`Examples:\n${examples.map(([line, does]) => `  # ${does}\n  penstock ${line}`).join('\n')}`)
            .check((args) => {
              const twice = single.find((name) => Array.isArray(args[name]));
              if (twice === undefined) return true;
              throw new UsageError(`penstock: ${usage.split(' ')[0]}: --${twice} was given more than once`);
            });
        },
        (args) => main(args as unknown as InferredOptionTypes<P> & InferredOptionTypes<O>, session),
      ),
  };
}

/** Options that several commands share. */
export const PACKAGE = {
  package: {
    alias: 'p',
    type: 'string',
    demandOption: true,
    requiresArg: true,
    describe: 'package file (YAML)',
  },
} as const satisfies Record<string, Options>;

export const SET = {
  set: {
    type: 'string',
    array: true,
    requiresArg: true,
    default: [] as string[],
    defaultDescription: 'nothing',
    describe: 'override one key of the package, path=value; may be given again',
  },
} as const satisfies Record<string, Options>;

/** A whole number from an option, `least` or more. Throws InputError. */
export function wholeNumber(option: string, text: string, least: number): number {
  const value = Number(text);
  if (/^\d+$/.test(text) && Number.isSafeInteger(value) && value >= least) return value;
  throw new InputError({ where: { file: option }, found: `'${text}'`, expected: `a whole number, ${least} or more` });
}
