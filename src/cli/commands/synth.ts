/** `penstock synth`: writes an access trace from a pattern. */
import { InputError } from '../../errors.js';
import { type AccessBatch, accessCsv, synthesise } from '../../trace/index.js';
import { command } from '../command.js';
import { OutputFile } from '../output.js';
import { parseSize } from '../quantities.js';
import type { Session } from '../session.js';

export const synth = command({
  usage: 'synth <pattern..>',
  about: 'write an access trace from a pattern, seeded',
  positionals: {
    pattern: {
      type: 'string',
      array: true,
      demandOption: true,
      describe: 'pattern and its parameters: sequential, strided, uniform, zipf, chase, block',
    },
  },
  options: {
    bytes: {
      type: 'string',
      demandOption: true,
      requiresArg: true,
      describe: 'bytes to ask for in all, for example 64MiB',
    },
    out: {
      type: 'string',
      alias: 'o',
      demandOption: true,
      requiresArg: true,
      describe: 'file to write (.csv, .csv.gz), or - for standard output',
    },
    reads: {
      type: 'string',
      default: '1',
      requiresArg: true,
      describe: 'share of the accesses that are reads, 0 to 1',
    },
    seed: { type: 'string', default: '1', requiresArg: true, describe: 'seed of everything drawn at random' },
    request: {
      type: 'string',
      default: '256B',
      requiresArg: true,
      describe: 'longest access of sequential, strided and block',
    },
    base: { type: 'string', default: '0', requiresArg: true, describe: 'first address, decimal, 0x… or a size' },
  },
  examples: [
    ['synth uniform granule=64B span=2GiB --bytes 64MiB --reads 0.7 --out random.csv.gz', 'random reads and writes'],
    ['synth zipf s=1.1 span=8GiB --bytes 16MiB -o - | penstock run - -p configs/wagtail.yaml', 'straight into a run'],
  ],
  main: async (args, session) => {
    const batches = synthesise(args.pattern.join(' '), {
      bytes: parseSize('--bytes', args.bytes, 1),
      readFraction: fraction(args.reads),
      seed: args.seed,
      requestBytes: parseSize('--request', args.request, 1),
      base: address(args.base),
      where: { file: 'synth' },
    });
    if (args.out === '-') {
      for await (const text of accessCsv(whileWanted(batches, session), null)) await session.print(text);
      return;
    }
    const output = new OutputFile(args.out, 'accessTrace');
    for await (const text of accessCsv(whileWanted(batches, session), null)) output.write(text);
    if (session.signal.aborted) output.discard();
    else output.commit();
  },
});

/** Passes batches on until an interrupt, or until nobody reads standard output. */
async function* whileWanted(batches: Iterable<AccessBatch>, session: Session): AsyncGenerator<AccessBatch> {
  for (const batch of batches) {
    if ((await session.breathe()) || !session.heard) return;
    yield batch;
  }
}

function fraction(text: string): number {
  const value = Number(text);
  if (text.trim() !== '' && value >= 0 && value <= 1) return value;
  throw new InputError({
    where: { file: '--reads' },
    found: `'${text}'`,
    expected: 'a share between 0 and 1, for example 0.7',
  });
}

function address(text: string): number {
  const plain = Number(text);
  if (/^(0x[\da-f]+|\d+)$/i.test(text) && plain < 2 ** 52) return plain;
  const bytes = parseSize('--base', text, 0);
  if (bytes < 2 ** 52) return bytes;
  throw new InputError({ where: { file: '--base' }, found: `'${text}'`, expected: 'an address below 2^52' });
}
