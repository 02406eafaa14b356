/** What a mix is: a piece of real work, its sizes as parameters, its flops and bytes in closed form, and its accesses tile by tile. */
import { InputError, nearest, type Where } from '../../errors.js';

/** Bytes of one element of a number format. */
const ELEMENT_BYTES: Readonly<Record<string, number>> = {
  fp64: 8,
  fp32: 4,
  tf32: 4,
  bf16: 2,
  fp16: 2,
  fp8: 1,
  int8: 1,
};

/** A parameter: whole number, number, or number format, by what its default is. */
export interface Parameter {
  readonly by: number | string; // default
  readonly about: string;
  readonly least?: number; // 1 when left out
  readonly fraction?: boolean; // need not be whole
}

/** Parameters as given or by default; `e` is the bytes of an element of `format`. */
export type Values = Readonly<Record<string, number>> & { readonly e: number };

/** Where the work is done. */
export interface Site {
  readonly dies: number;
  readonly engines: number; // of each die
  readonly region: number; // bytes of address space of each die, the first of which begins at `base`
  readonly base: number;
  readonly seed: string;
}

/**
 * What one engine loads, computes and stores as one tile. `loads` and `stores` hold runs, address and bytes in turn, counted from the
 * start of the die's own memory unless `far` says that the loads are of another die.
 */
export interface Tile {
  readonly kernel: number; // index into Work.kernels
  readonly flops: number;
  readonly loads: readonly number[];
  readonly stores: readonly number[];
  readonly far?: { readonly die: number; readonly loads: readonly number[] };
}

/** Tiles that follow each other on one engine. */
export interface Job {
  readonly die?: number; // when only this one can do it
  tiles(): Iterable<Tile>;
}

/** A kernel in closed form, and the nearest pattern a kernel trace has for it. */
export interface MixKernel {
  readonly name: string;
  readonly flops: number;
  readonly readBytes: number;
  readonly writeBytes: number;
  readonly readPattern: string;
  readonly writePattern: string;
  readonly tileBytes: number;
}

/** A mix with its sizes. */
export interface Work {
  readonly kernels: readonly MixKernel[];
  readonly space: number; // bytes of address space it takes on each die
  readonly kernelTrace: boolean; // false: it cannot be said as kernels, whose dies keep to their own memory
  jobs(): Iterable<Job>;
}

export interface Mix {
  readonly about: string;
  readonly parameters: Readonly<Record<string, Parameter>>;
  /** Closed forms in the parameters, e being the bytes of an element. */
  readonly flops: string;
  readonly read: string;
  readonly write: string;
  make(values: Values, site: Site): Work;
}

/** Reads `name=value` parameters of a mix. Throws InputError. */
export function parseValues(
  name: string,
  mix: Mix,
  words: readonly string[],
  where: Where,
): { values: Values; format: string } {
  const values: Record<string, number> = {};
  let format = '';
  const given = new Map<string, string>();
  for (const word of words) {
    const [key, value, more] = word.split('=');
    if (value === undefined || value === '' || more !== undefined)
      throw new InputError({ where, found: `'${word}' after '${name}'`, expected: 'parameters written name=value' });
    if (!Object.hasOwn(mix.parameters, key)) {
      const like = nearest(key, Object.keys(mix.parameters));
      throw new InputError({
        where,
        found: `parameter '${key}' of mix '${name}'`,
        expected: `one of ${Object.keys(mix.parameters).join(', ')}`,
        hint: like === undefined ? undefined : `did you mean '${like}'?`,
      });
    }
    if (given.has(key))
      throw new InputError({ where, found: `parameter '${key}' twice`, expected: 'each parameter once' });
    given.set(key, value);
  }
  for (const [key, { by, least = 1, fraction = false }] of Object.entries(mix.parameters)) {
    const text = given.get(key) ?? String(by);
    const at = { ...where, path: key };
    if (typeof by === 'string') {
      if (!Object.hasOwn(ELEMENT_BYTES, text))
        throw new InputError({
          where: at,
          found: `'${text}'`,
          expected: `a number format: ${Object.keys(ELEMENT_BYTES).join(', ')}`,
        });
      format = text;
      continue;
    }
    const value = (fraction ? /^\d*\.?\d+$/ : /^\d{1,15}$/).test(text) ? Number(text) : Number.NaN;
    if (!(value >= least)) {
      throw new InputError({
        where: at,
        found: `'${text}'`,
        expected: `a ${fraction ? 'number' : 'whole number'} from ${least} up`,
      });
    }
    values[key] = value;
  }
  return { values: { ...values, e: ELEMENT_BYTES[format] ?? 1 }, format };
}

/** The error for sizes that are each possible and not together. */
export function impossible(name: string, found: string, expected: string): InputError {
  return new InputError({ where: { file: name }, found, expected });
}

const PAGE = 4096; // bytes arrays are aligned to: common practice, no source

/** Hands out places for the arrays of a mix, one behind the other. */
export class Places {
  end = 0;

  /** First address of an array of so many bytes. */
  take(bytes: number): number {
    const at = this.end;
    this.end = Math.ceil((at + bytes) / PAGE) * PAGE;
    return at;
  }
}

/** A matrix in row order: its runs of addresses. */
export class Matrix {
  readonly base: number;
  constructor(
    places: Places,
    readonly rows: number,
    readonly columns: number,
    private readonly e: number,
  ) {
    this.base = places.take(rows * columns * e);
  }

  /** Rows r0 up to r1, columns c0 up to c1: one run a row, or one in all where the rows are whole. */
  block(r0: number, r1: number, c0 = 0, c1 = this.columns): number[] {
    const { base, columns, e } = this;
    if (c0 === 0 && c1 === columns) return [base + r0 * columns * e, (r1 - r0) * columns * e];
    const runs: number[] = [];
    for (let row = r0; row < r1; row++) runs.push(base + (row * columns + c0) * e, (c1 - c0) * e);
    return runs;
  }
}

/** Parts of at most `size` that cover 0 … total. */
export function* parts(total: number, size: number): Generator<readonly [from: number, to: number]> {
  for (let from = 0; from < total; from += size) yield [from, Math.min(total, from + size)];
}
