/** Many values to one: reduction in one die's memory, and the ring exchange between dies. */
import { InputError } from '../../errors.js';
import { type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

export const reduction: Mix = {
  about: 'sum of all elements: partial sums of each tile, then their sum',
  parameters: {
    elements: { by: 4194304, about: 'elements' },
    tile: { by: 16384, about: 'elements one tile takes' },
    format: { by: 'fp32', about: 'number format' },
  },
  flops: 'elements - 1',
  read: 'e (elements + T);  T = ceil(elements / tile)',
  write: 'e (T + 1)',
  make({ elements, tile, e }) {
    const places = new Places();
    const tiles = Math.ceil(elements / tile);
    const [x, partial, sum] = [elements, tiles, 1].map((count) => new Matrix(places, 1, count, e));
    return {
      kernels: [
        {
          name: 'partial_sums',
          flops: elements - tiles,
          readBytes: e * elements,
          writeBytes: e * tiles,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: Math.min(tile, elements) * e,
        },
        {
          name: 'sum',
          flops: tiles - 1,
          readBytes: e * tiles,
          writeBytes: e,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: tiles * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [i0, i1] of parts(elements, tile)) {
          const at = i0 / tile;
          yield {
            *tiles(): Generator<Tile> {
              const stores = partial.block(0, 1, at, at + 1);
              yield { kernel: 0, flops: i1 - i0 - 1, loads: x.block(0, 1, i0, i1), stores };
            },
          };
        }
        yield {
          *tiles(): Generator<Tile> {
            yield { kernel: 1, flops: tiles - 1, loads: partial.block(0, 1), stores: sum.block(0, 1) };
          },
        };
      },
    };
  },
};

export const ring: Mix = {
  about:
    'ring all-reduce: in D - 1 steps each die adds a piece of its neighbour’s to its own, in D - 1 more it copies the sums',
  parameters: {
    elements: { by: 1048576, about: 'elements each of the D dies has' },
    tile: { by: 16384, about: 'elements one tile takes' },
    format: { by: 'fp32', about: 'number format' },
  },
  flops: '(D - 1) elements',
  read: '3 e (D - 1) elements, of which 2 e (D - 1) elements from another die',
  write: '2 e (D - 1) elements',
  make({ elements, tile, e }, { dies, engines }) {
    if (dies < 2)
      throw new InputError({
        where: { file: 'ring' },
        found: 'one die',
        expected: 'two or more that pass their pieces on',
        hint: 'give --dies and --region, or a --package that has them',
      });
    const places = new Places();
    const buffer = new Matrix(places, 1, elements, e);
    const edge = (chunk: number): number => Math.floor((elements * chunk) / dies);
    const moved = (dies - 1) * elements;
    return {
      kernels: [
        {
          name: 'reduce_scatter',
          flops: moved,
          readBytes: 2 * e * moved,
          writeBytes: e * moved,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: tile * e,
        },
        {
          name: 'all_gather',
          flops: 0,
          readBytes: e * moved,
          writeBytes: e * moved,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: tile * e,
        },
      ],
      space: places.end,
      kernelTrace: false,
      *jobs(): Generator<Job> {
        for (let slice = 0; slice < engines; slice++)
          for (let die = 0; die < dies; die++)
            yield {
              die,
              *tiles(): Generator<Tile> {
                const before = (die + dies - 1) % dies;
                for (let step = 0; step < 2 * (dies - 1); step++) {
                  const gather = step >= dies - 1;
                  // the piece that the neighbour finished in the step before
                  const chunk = (((gather ? die - (step - dies + 1) : die - step - 1) % dies) + dies) % dies;
                  const size = edge(chunk + 1) - edge(chunk);
                  const [s0, s1] = [slice, slice + 1].map((part) => edge(chunk) + Math.floor((size * part) / engines));
                  for (const [from, to] of parts(s1 - s0, tile)) {
                    const own = buffer.block(0, 1, s0 + from, s0 + to);
                    yield {
                      kernel: gather ? 1 : 0,
                      flops: gather ? 0 : to - from,
                      loads: gather ? [] : own,
                      stores: own,
                      far: { die: before, loads: own },
                    };
                  }
                }
              },
            };
      },
    };
  },
};
