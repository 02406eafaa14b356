/** `penstock describe`: the package as resolved, and what follows from it without running anything. */
import { describePackage, loadPackage } from '../../config/index.js';
import { descriptionReport, prettyJson } from '../../report/index.js';
import { command, SET } from '../command.js';

export const describe = command({
  usage: 'describe <package>',
  about: 'show a package as resolved: timings with sources, peaks, ceilings, unloaded latency',
  positionals: {
    package: { type: 'string', demandOption: true, describe: 'package file (YAML)' },
  },
  options: {
    ...SET,
    json: { type: 'boolean', default: false, describe: 'print it as JSON' },
  },
  examples: [
    ['describe configs/wagtail.yaml', 'the demo package'],
    ['describe configs/wagtail.yaml --set memory.0.refresh.mode=per-bank --json', 'with one key changed, for a script'],
  ],
  main: async (args, session) => {
    const description = describePackage(loadPackage(args.package, args.set));
    await session.print(args.json ? `${prettyJson(description)}\n` : descriptionReport(description, session));
  },
});
