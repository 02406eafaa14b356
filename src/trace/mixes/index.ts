/** Ready-made mixes: the traffic of the kernels that accelerators run, in sizes of one's own, as accesses or as kernels. */
import { InputError, type Where } from '../../errors.js';
import type { AccessBatch } from '../batch.js';
import { decode, prefill } from './attention.js';
import { reduction, ring } from './collective.js';
import { emit } from './emit.js';
import { convolution, stencil } from './grid.js';
import { matmul, matvec, transpose } from './matrix.js';
import { type Mix, type MixKernel, parseValues, type Site, type Work } from './mix.js';
import { embedding, experts, norm } from './rows.js';
import { permutation, spmv } from './sparse.js';

export type { Mix, MixKernel, Parameter, Site } from './mix.js';

/** All mixes by name. */
export const MIXES: Readonly<Record<string, Mix>> = {
  matmul,
  matvec,
  prefill,
  decode,
  norm,
  embedding,
  experts,
  convolution,
  stencil,
  transpose,
  permutation,
  spmv,
  reduction,
  ring,
};

/** A mix with its sizes, ready to be written. */
export interface MadeMix {
  readonly format: string; // number format, '' where it has none
  readonly kernels: readonly MixKernel[]; // in closed form, all dies together
  readonly kernelTrace: boolean; // whether it can be said as a kernel trace
  /** Its accesses; the batch is used again after each pull. */
  batches(requestBytes: number): Generator<AccessBatch>;
}

/** Understands `name parameter=value …` and lays the arrays out. Throws InputError, also when a die's memory is too small. */
export function makeMix(text: string, site: Site, where: Where): MadeMix {
  const [name, ...words] = text.trim().split(/\s+/);
  const mix = MIXES[name];
  const { values, format } = parseValues(name, mix, words, where);
  const work: Work = mix.make(values, site);
  if (work.space > site.region) {
    throw new InputError({
      where,
      found: `arrays of ${work.space} bytes on each die`,
      expected: `no more than its memory, ${site.region} bytes`,
      hint: 'make the mix smaller, or give the die more memory (--region)',
    });
  }
  return {
    format,
    kernels: work.kernels,
    kernelTrace: work.kernelTrace,
    batches: (requestBytes) => emit(work, site, requestBytes),
  };
}

/** The mix as the text of a kernel trace: one row a kernel, with the nearest pattern there is. */
export function kernelCsv({ kernels, format }: MadeMix): string {
  const size = (bytes: number): string => `${bytes} B`;
  const rows = kernels.map((k) =>
    [
      k.name,
      'main',
      k.flops > 0 ? format : '',
      k.flops > 0 ? k.flops : '',
      size(k.readBytes),
      size(k.writeBytes),
      k.readPattern,
      k.writePattern,
      size(Math.max(1, Math.round(k.tileBytes))),
    ].join(','),
  );
  return `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile\n${rows.join('\n')}\n`;
}
