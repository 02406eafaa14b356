/** `penstock schema`: the JSON Schemas of what the program reads and writes, for editors and for other programs. */
import { resultJsonSchema } from '../../analysis/index.js';
import { packageJsonSchema } from '../../config/index.js';
import { gateJsonSchema, planJsonSchema } from '../../study/index.js';
import { command } from '../command.js';

const SCHEMAS = { package: packageJsonSchema, result: resultJsonSchema, sweep: planJsonSchema, gate: gateJsonSchema };

export const schema = command({
  usage: 'schema <document>',
  about: 'print the JSON Schema of a package file, of the result document, of a sweep plan or of tolerances',
  positionals: {
    document: {
      type: 'string',
      choices: Object.keys(SCHEMAS) as (keyof typeof SCHEMAS)[],
      demandOption: true,
      describe: 'which document',
    },
  },
  options: {},
  examples: [
    ['schema package > penstock.schema.json', 'for an editor: # yaml-language-server: $schema=penstock.schema.json'],
    ['schema result', 'what run --json writes'],
  ],
  main: async (args, session) => {
    await session.print(`${JSON.stringify(SCHEMAS[args.document](), null, 2)}\n`);
  },
});
