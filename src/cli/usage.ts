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
  readonly options: readonly string[]; // names without dashes, 'help' and 'version' not among them
  readonly subcommands?: readonly Usable[]; // commands of two words
  readonly letters: Readonly<Record<string, string>>; // one-letter forms and the option each stands for
}

const EVERYWHERE = ['help', 'version'];

/**
 * Words a complaint of the parser for the user. `argv` is the command line after the program's name, `commands` all there are.
 */
export function usageError(complaint: string, argv: readonly string[], commands: readonly Usable[]): UsageError {
  const first = commands.find(({ name }) => name === argv[0]);
  const second = first?.subcommands?.find(({ name }) => name === argv[1]);
  const command = first === undefined || second === undefined ? first : belowOf(first, second);
  const problem = command === undefined ? noCommand(argv, commands) : inCommand(complaint, argv, command);
  const help = command === undefined ? 'penstock --help' : `penstock ${command.name} --help`;
  return new UsageError(`penstock: ${problem}${problem.endsWith('?') ? '' : '.'} See ${help}`);
}

/** A command of two words, as one. */
function belowOf(first: Usable, second: Usable): Usable {
  return { ...second, name: `${first.name} ${second.name}`, usage: `${first.name} ${second.usage}` };
}

function noCommand(argv: readonly string[], commands: readonly Usable[]): string {
  const names = commands.map(({ name }) => name);
  const list = `the commands are ${names.join(', ')}`;
  const word = argv[0];
  if (word === undefined) return `no command was given; ${list}`;
  if (word.startsWith('-')) return `found ${word}; expected a command first; ${list}`;
  const like = nearest(word, names);
  return `there is no command '${word}'; ${like === undefined ? list : `did you mean '${like}'?`}`;
}

function inCommand(
  complaint: string,
  argv: readonly string[],
  { name, usage, options, letters, subcommands = [] }: Usable,
): string {
  const all = [...options, ...EVERYWHERE];
  // a misspelt option is the cause of whatever else is missing
  const strange = optionsIn(argv).find((given) =>
    given.startsWith('--') ? !all.includes(given.slice(2)) : !['h', ...Object.keys(letters)].includes(given.slice(1)),
  );
  if (strange !== undefined) {
    const like = nearest(strange.replace(/^-+/, ''), all);
    const known = `its options are ${all.map((option) => `--${option}`).join(', ')}`;
    return `${name}: there is no option ${strange}; ${like === undefined ? known : `did you mean --${like}?`}`;
  }
  const [, unknown] = /^Unknown arguments?: (.*)$/.exec(complaint) ?? [];
  if (unknown !== undefined) {
    const word = argv[1] ?? '';
    const like = nearest(
      word,
      subcommands.map((sub) => sub.name),
    );
    if (like !== undefined) return `${name}: found '${word}'; did you mean '${name} ${like}'?`;
    return `${name}: found '${unknown.split(', ')[0]}', which is one argument too many; expected ${usage}`;
  }
  const [, missing] = /^Missing required arguments?: (.*)$/.exec(complaint) ?? [];
  if (missing !== undefined) {
    const needed = missing.split(', ').map((option) => `--${option}`);
    return `${name}: ${needed.join(' and ')} must be given`;
  }
  const [, valueless] = /^Not enough arguments following: (.*)$/.exec(complaint) ?? [];
  if (valueless !== undefined) return `${name}: --${letters[valueless] ?? valueless} needs a value`;
  if (complaint.startsWith('Not enough non-option arguments'))
    return `${name}: something is missing; expected ${usage}`;
  const [, argument, given, choices] = /Argument: (.*?), Given: (.*?), Choices: (.*)/.exec(complaint) ?? [];
  if (argument !== undefined) {
    const like = nearest(
      given.replaceAll('"', ''),
      choices.split(', ').map((choice) => choice.replaceAll('"', '')),
    );
    const what = options.includes(argument) ? `--${argument}` : argument;
    return `${name}: ${what}: found ${given}; expected one of ${choices}${like === undefined ? '' : `; did you mean ${like}?`}`;
  }
  return `${name}: ${complaint}`;
}

/** The options of a command line as they were given, without their values: '--json', '-p'. */
function optionsIn(argv: readonly string[]): string[] {
  const end = argv.indexOf('--');
  const before = end < 0 ? argv : argv.slice(0, end);
  return before.flatMap((argument) => /^(--[a-z][^=]*|-[a-z])/i.exec(argument)?.[1] ?? []);
}
