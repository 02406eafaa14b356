/** Turns what the argument parser objects to into one sentence that says what would do. */
import { nearest } from '../errors.js';

/** The command line itself is wrong (exit code 2). */
export class UsageError extends Error {
  override readonly name = 'UsageError';
}

/** What usage errors must know of a command. */
export interface Usable {
  readonly name: string; // 'run'
  readonly usage: string; // 'run <trace>'
  readonly options: readonly string[]; // names without dashes, '--help' and '--version' not among them
}

const EVERYWHERE = ['help', 'version'];

/**
 * Words a complaint of the parser for the user. `argv` is the command line after the program's name, `commands` all there are.
 */
export function usageError(complaint: string, argv: readonly string[], commands: readonly Usable[]): UsageError {
  const command = commands.find(({ name }) => name === argv[0]);
  const problem = command === undefined ? noCommand(argv, commands) : inCommand(complaint, argv, command);
  const help = command === undefined ? 'penstock --help' : `penstock ${command.name} --help`;
  return new UsageError(`penstock: ${problem}. See ${help}`);
}

function noCommand(argv: readonly string[], commands: readonly Usable[]): string {
  const names = commands.map(({ name }) => name);
  const list = `the commands are ${names.join(', ')}`;
  const word = argv[0];
  if (word === undefined) return `no command was given; ${list}`;
  if (word.startsWith('-')) return `found ${word}; expected a command first; ${list}`;
  const like = nearest(word, names);
  return `there is no command '${word}'; ${like === undefined ? list : `did you mean '${like}'?`}`.replace(/\?$/, '');
}

function inCommand(complaint: string, argv: readonly string[], { name, usage, options }: Usable): string {
  const [, unknown] = /^Unknown arguments?: (.*)$/.exec(complaint) ?? [];
  if (unknown !== undefined) {
    const words = unknown.split(', ');
    const option = words.find((word) => isOption(word, argv));
    if (option === undefined) return `${name}: found '${words[0]}', which is one argument too many; expected ${usage}`;
    const given = `${option.length === 1 ? '-' : '--'}${option}`;
    const like = nearest(option, [...options, ...EVERYWHERE]);
    const known = `its options are ${[...options, ...EVERYWHERE].map((o) => `--${o}`).join(', ')}`;
    return `${name}: there is no option ${given}; ${like === undefined ? known : `did you mean --${like}`}`;
  }
  const [, missing] = /^Missing required arguments?: (.*)$/.exec(complaint) ?? [];
  if (missing !== undefined) {
    const needed = missing.split(', ').map((option) => `--${option}`);
    return `${name}: ${needed.join(' and ')} must be given`;
  }
  const [, valueless] = /^Not enough arguments following: (.*)$/.exec(complaint) ?? [];
  if (valueless !== undefined) return `${name}: --${valueless} needs a value`;
  if (complaint.startsWith('Not enough non-option arguments'))
    return `${name}: something is missing; expected ${usage}`;
  const [, argument, given, choices] = /Argument: (.*?), Given: (.*?), Choices: (.*)/.exec(complaint) ?? [];
  if (argument !== undefined) {
    const like = nearest(
      given.replaceAll('"', ''),
      choices.split(', ').map((choice) => choice.replaceAll('"', '')),
    );
    const what = options.includes(argument) ? `--${argument}` : argument;
    return `${name}: ${what}: found ${given}; expected one of ${choices}${like === undefined ? '' : `; did you mean ${like}`}`;
  }
  return `${name}: ${complaint}`;
}

/** Was `word` given as an option, not as an argument of its own? */
function isOption(word: string, argv: readonly string[]): boolean {
  const dashed =
    word.length === 1 ? new RegExp(`^-[^-]*${literally(word)}`) : new RegExp(`^--?${literally(word)}(=|$)`);
  return argv.some((argument) => dashed.test(argument));
}

function literally(text: string): string {
  return text.replace(/[^\w]/g, '\\$&');
}
