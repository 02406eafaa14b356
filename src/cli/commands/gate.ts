/** `penstock gate`: results against an agreed one, figure by figure; exit 1 when something got worse. */
import { existsSync, readFileSync } from 'node:fs';
import { CheckError, InputError } from '../../errors.js';
import { gateJunit, gateMarkdown, gateReport, prettyJson } from '../../report/index.js';
import { gate as compare, DEFAULT_TOLERANCES, parseTolerances, type Tolerances } from '../../study/index.js';
import { command } from '../command.js';
import { FOUND_WORSE } from '../failure.js';
import { OutputFile } from '../output.js';
import { readResult } from '../result-file.js';
import { systemError } from '../system-error.js';

export const gate = command({
  usage: 'gate <baseline> <candidate..>',
  about: 'check results against a baseline: better, same or worse, and why',
  positionals: {
    baseline: { type: 'string', demandOption: true, describe: 'result document that was agreed on (run --json)' },
    candidate: { type: 'string', array: true, demandOption: true, describe: 'result documents to check' },
  },
  options: {
    tolerances: { type: 'string', requiresArg: true, describe: 'how far figures may move (YAML), over the defaults' },
    markdown: { type: 'string', requiresArg: true, describe: 'write it as Markdown, for a pull request' },
    junit: { type: 'string', requiresArg: true, describe: 'write it as JUnit XML, for a CI server' },
    json: {
      type: 'string',
      requiresArg: true,
      describe: 'write it as JSON; - for standard output, in place of the report',
    },
    update: { type: 'boolean', default: false, describe: 'make the candidate the new baseline, and end with 0' },
  },
  examples: [
    ['gate baselines/step.json step.json', 'did anything get worse'],
    ['gate baselines/step.json step.json --markdown gate.md --junit gate.xml', 'the same for a CI job'],
    ['gate baselines/step.json step.json --tolerances gate.yaml', 'with limits of your own'],
    ['gate baselines/step.json step.json --update', 'the new result is the agreed one from now on'],
  ],
  main: async (args, session) => {
    const tolerances = tolerancesOf(args.tolerances);
    const candidates = args.candidate.map((file) => ({ file, ...readResult(file) }));
    for (const { file, result } of candidates) {
      const failed = result.checks.filter(({ ok }) => !ok).map(({ name }) => name);
      if (failed.length > 0) throw new CheckError(`${file}: ${failed.join(', ')} failed when it was run`);
    }
    if (args.update && candidates.length > 1) {
      throw new InputError({
        where: { file: '--update' },
        found: `${candidates.length} candidates`,
        expected: 'one, which becomes the baseline',
      });
    }
    if (args.update && !existsSync(args.baseline)) {
      update(args.baseline, candidates[0].text);
      await session.print(`${args.baseline}: made from ${candidates[0].file}\n`);
      return;
    }
    const { result } = readResult(args.baseline, 'To make it from the candidate, add --update');
    const table = compare({ file: args.baseline, result }, candidates, tolerances);

    // all that is asked for is written before the verdict ends the process
    const outputs = [
      [args.markdown, 'markdown', () => gateMarkdown(table)],
      [args.junit, 'junit', () => gateJunit(table)],
      [args.json === '-' ? undefined : args.json, 'gate', () => `${prettyJson(table)}\n`],
    ] as const;
    const files = outputs.flatMap(([file, kind, make]) =>
      file === undefined ? [] : [{ output: new OutputFile(file, kind), text: make() }],
    );
    for (const { output, text } of files) output.write(text);
    for (const { output } of files) output.commit();
    await session.print(args.json === '-' ? `${prettyJson(table)}\n` : gateReport(table, session));
    if (args.update) {
      update(args.baseline, candidates[0].text);
      if (args.json !== '-') await session.print(`${args.baseline}: now that of ${candidates[0].file}\n`);
    } else if (table.verdict === 'worse') session.exitCode = FOUND_WORSE;
  },
});

function update(baseline: string, text: string): void {
  const output = new OutputFile(baseline, 'result');
  output.write(text);
  output.commit();
}

function tolerancesOf(file: string | undefined): Tolerances {
  if (file === undefined) return DEFAULT_TOLERANCES;
  let text: string;
  try {
    text = readFileSync(file, 'utf8');
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    const found = code === 'ENOENT' || code === 'ENOTDIR' ? 'no such file' : code === 'EISDIR' ? 'a directory' : '';
    if (found === '') throw systemError(`${file}: cannot be read`, error);
    throw new InputError({ where: { file }, found, expected: 'a file of tolerances (YAML)' });
  }
  return parseTolerances(text, file);
}
