/** `penstock synth`: writes a trace from a pattern, or from the traffic of a kernel that accelerators run. */
import { domains, loadPackage } from '../../config/index.js';
import { geometryOf } from '../../engine/index.js';
import { InputError } from '../../errors.js';
import { kernelCsv, type MadeMix, MIXES, makeMix, PATTERNS, type Site, synthesise } from '../../trace/index.js';
import { formatBytes, formatCount, formatFlops } from '../../units.js';
import { command, PACKAGE, SET, wholeNumber } from '../command.js';
import { OutputFile } from '../output.js';
import { parseSize } from '../quantities.js';
import type { Session } from '../session.js';
import { FORMS, formOfOutput, writeTrace } from '../trace-output.js';

export const synth = command({
  usage: 'synth <pattern..>',
  about: 'write a trace from a pattern or a ready-made mix, seeded',
  positionals: {
    pattern: {
      type: 'string',
      array: true,
      demandOption: true,
      describe: `pattern (${Object.keys(PATTERNS).join(', ')}) or mix (${Object.keys(MIXES).join(', ')}), and its parameters`,
    },
  },
  options: {
    out: {
      type: 'string',
      alias: 'o',
      demandOption: true,
      requiresArg: true,
      describe: `file to write (${FORMS}), or - for CSV on standard output`,
    },
    bytes: { type: 'string', requiresArg: true, describe: 'of a pattern: bytes to ask for in all, for example 64MiB' },
    reads: {
      type: 'string',
      requiresArg: true,
      defaultDescription: '1',
      describe: 'of a pattern: share of the accesses that are reads, 0 to 1',
    },
    as: {
      choices: ['accesses', 'kernels'],
      default: 'accesses',
      requiresArg: true,
      describe: 'of a mix: every access where it falls, or one row a kernel with the nearest pattern',
    },
    seed: { type: 'string', default: '1', requiresArg: true, describe: 'seed of everything drawn at random' },
    request: { type: 'string', default: '256B', requiresArg: true, describe: 'longest access' },
    base: { type: 'string', default: '0', requiresArg: true, describe: 'first address, decimal, 0x… or a size' },
    package: {
      ...PACKAGE.package,
      demandOption: false,
      describe: 'of a mix: take dies, engines and region from this package',
    },
    ...SET,
    dies: {
      type: 'string',
      requiresArg: true,
      defaultDescription: '1',
      describe: 'of a mix: dies that share the work',
    },
    engines: { type: 'string', requiresArg: true, defaultDescription: '8', describe: 'of a mix: engines of each die' },
    region: {
      type: 'string',
      requiresArg: true,
      defaultDescription: '64GiB',
      describe: 'of a mix: memory of each die, one behind the other',
    },
  },
  examples: [
    ['synth uniform granule=64B span=2GiB --bytes 64MiB --reads 0.7 --out random.csv.gz', 'random reads and writes'],
    ['synth zipf s=1.1 span=8GiB --bytes 16MiB -o - | penstock run - -p configs/wagtail.yaml', 'straight into a run'],
    ['synth matmul m=2048 n=2048 k=2048 -p configs/wagtail.yaml -o matmul.parquet', 'a matrix product on both dies'],
    ['synth decode batch=16 context=8192 --as kernels -o decode.csv', 'attention as one row of a kernel trace'],
  ],
  main: async (args, session) => {
    const text = args.pattern.join(' ');
    formOfOutput(args.out);
    const request = parseSize('--request', args.request, 1);
    const base = address(args.base);
    if (Object.hasOwn(MIXES, args.pattern[0])) {
      only(args, ['bytes', 'reads'], 'the sizes of a mix are its parameters');
      const mix = makeMix(text, { ...siteOf(args), base, seed: args.seed }, { file: 'synth' });
      if (args.as === 'kernels') await writeKernels(args.out, mix, session);
      else await writeMix(args.out, mix, request, session);
      return;
    }
    only(args, ['dies', 'engines', 'region', 'package'], 'a pattern names neither dies nor engines');
    if (args.as === 'kernels')
      throw new InputError({ where: { file: '--as' }, found: 'kernels', expected: 'accesses, for a pattern' });
    if (args.bytes === undefined)
      throw new InputError({ where: { file: '--bytes' }, found: 'none', expected: 'the bytes to ask for in all' });
    const bytes = parseSize('--bytes', args.bytes, 1);
    let made = 0;
    const batches = synthesise(text, {
      bytes,
      readFraction: fraction(args.reads ?? '1'),
      seed: args.seed,
      requestBytes: request,
      base,
      where: { file: 'synth' },
    });
    async function* counted() {
      for (const batch of batches) {
        for (let i = 0; i < batch.count; i++) made += batch.bytes[i];
        yield batch;
      }
    }
    await writeTrace(args.out, counted(), null, session, () => made / bytes);
  },
});

async function writeMix(out: string, mix: MadeMix, request: number, session: Session): Promise<void> {
  const whole = mix.kernels.reduce((sum, { readBytes, writeBytes }) => sum + readBytes + writeBytes, 0);
  let made = 0;
  async function* counted() {
    for (const batch of mix.batches(request)) {
      for (let i = 0; i < batch.count; i++) made += batch.bytes[i];
      yield batch;
    }
  }
  const names = mix.kernels.map(({ name }) => name);
  const rows = await writeTrace(out, counted(), names, session, () => made / whole);
  if (rows !== null && out !== '-') await session.print(`${out}: ${formatCount(rows)} rows\n${inWords(mix)}`);
}

async function writeKernels(out: string, mix: MadeMix, session: Session): Promise<void> {
  if (!mix.kernelTrace) {
    throw new InputError({
      where: { file: '--as' },
      found: 'kernels',
      expected: 'accesses, for this mix',
      hint: 'the kernels of a kernel trace keep to the memory of their own die',
    });
  }
  if (!/^-$|\.csv(\.gz)?$/i.test(out))
    throw new InputError({
      where: { file: out },
      found: 'a name of columns',
      expected: 'a kernel trace is .csv or .csv.gz',
    });
  const text = kernelCsv(mix);
  if (out === '-') return session.print(text);
  const output = new OutputFile(out, 'kernelTrace');
  output.write(text);
  output.commit();
  await session.print(`${out}: ${mix.kernels.length} kernels\n${inWords(mix)}`);
}

/** What a mix asks for, a line a kernel. */
function inWords({ kernels }: MadeMix): string {
  return kernels
    .map((k) => {
      const intensity = k.flops > 0 ? `, ${(k.flops / (k.readBytes + k.writeBytes)).toPrecision(3)} FLOP/B` : '';
      return `  ${k.name}: ${formatFlops(k.flops).replace('/s', '')}, reads ${formatBytes(k.readBytes)}, writes ${formatBytes(k.writeBytes)}${intensity}\n`;
    })
    .join('');
}

type Places = Readonly<Record<'package' | 'dies' | 'engines' | 'region', string | undefined>> & {
  readonly set: string[];
};

/** Dies, engines and memory: those of the package, or as given, or small. */
function siteOf(args: Places): Omit<Site, 'base' | 'seed'> {
  const given = (name: 'dies' | 'engines', least: number, most: number): number | undefined => {
    const text = args[name];
    if (text === undefined) return undefined;
    const value = wholeNumber(`--${name}`, text, least);
    if (value <= most) return value;
    throw new InputError({ where: { file: `--${name}` }, found: text, expected: `${least} to ${most}` });
  };
  const own = { dies: given('dies', 1, 1024), engines: given('engines', 1, 2 ** 20) };
  const region = args.region === undefined ? undefined : parseSize('--region', args.region, 4096);
  if (args.package === undefined)
    return { dies: own.dies ?? 1, engines: own.engines ?? 8, region: region ?? 64 * 2 ** 30 };
  const pkg = loadPackage(args.package, args.set);
  const geometry = geometryOf(pkg, domains(pkg));
  return {
    dies: own.dies ?? geometry.length,
    engines: own.engines ?? Math.min(...geometry.map((die) => die.engines)),
    region: region ?? (geometry.length > 1 ? geometry[1].base - geometry[0].base : geometry[0].capacity),
  };
}

/** Refuses options that have no meaning here. */
function only(args: Readonly<Record<string, unknown>>, names: readonly string[], because: string): void {
  for (const name of names)
    if (args[name] !== undefined)
      throw new InputError({ where: { file: `--${name}` }, found: `'${args[name]}'`, expected: 'none', hint: because });
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
