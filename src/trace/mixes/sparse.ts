/** Scattered work: sparse matrix times vector, permutation. */
import { hashSeed, mixText, stream } from '../../random.js';
import { Scatter } from '../scatter.js';
import { type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

const INDEX = 4; // bytes of a column index and of a row pointer

export const spmv: Mix = {
  about:
    'sparse matrix times vector in compressed rows (CSR): pointers, indices and values in order, the vector gathered',
  parameters: {
    rows: { by: 65536, about: 'rows and columns' },
    nonzeros: { by: 16, about: 'of each row' },
    band: { by: 0, least: 0, about: 'columns the nonzeros of a row lie in, round the diagonal; 0: anywhere' },
    tile: { by: 16, about: 'rows one tile takes' },
    format: { by: 'fp32', about: 'number format' },
  },
  flops: '2 rows nonzeros',
  read: 'rows nonzeros (2 e + 4) + 4 (rows + ceil(rows / tile))',
  write: 'e rows',
  make({ rows, nonzeros, band, tile, e }, { seed }) {
    const places = new Places();
    const pointers = new Matrix(places, 1, rows + 1, INDEX);
    const indices = new Matrix(places, 1, rows * nonzeros, INDEX);
    const values = new Matrix(places, 1, rows * nonzeros, e);
    const [x, y] = [new Matrix(places, 1, rows, e), new Matrix(places, 1, rows, e)];
    const tiles = Math.ceil(rows / tile);
    return {
      kernels: [
        {
          name: 'spmv',
          flops: 2 * rows * nonzeros,
          readBytes: rows * nonzeros * (2 * e + INDEX) + INDEX * (rows + tiles),
          writeBytes: e * rows,
          readPattern: `uniform granule=${Math.max(e, 4)}B span=${rows * e}B`,
          writePattern: 'sequential',
          tileBytes: Math.min(tile, rows) * nonzeros * (2 * e + INDEX),
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        const random = stream(seed, 'columns');
        for (const [r0, r1] of parts(rows, tile)) {
          const gathers: number[] = [];
          for (let row = r0; row < r1; row++)
            for (let i = 0; i < nonzeros; i++) {
              const within = band === 0 ? rows : Math.min(band, rows);
              const first = band === 0 ? 0 : Math.max(0, Math.min(rows - within, row - Math.floor(within / 2)));
              gathers.push(x.base + (first + Math.floor(random.double() * within)) * e, e);
            }
          yield {
            *tiles(): Generator<Tile> {
              yield {
                kernel: 0,
                flops: 2 * (r1 - r0) * nonzeros,
                loads: [
                  ...pointers.block(0, 1, r0, r1 + 1),
                  ...indices.block(0, 1, r0 * nonzeros, r1 * nonzeros),
                  ...values.block(0, 1, r0 * nonzeros, r1 * nonzeros),
                  ...gathers,
                ],
                stores: y.block(0, 1, r0, r1),
              };
            },
          };
        }
      },
    };
  },
};

export const permutation: Mix = {
  about: 'elements read in order and written each to its own place, as the last pass of a sort does',
  parameters: {
    elements: { by: 262144, about: 'elements' },
    bytes: { by: 8, about: 'bytes of an element, key and value' },
    tile: { by: 256, about: 'elements one tile takes' },
  },
  flops: '0',
  read: 'elements bytes',
  write: 'elements bytes',
  make({ elements, bytes, tile }, { seed }) {
    const places = new Places();
    const [from, to] = [new Matrix(places, 1, elements, bytes), new Matrix(places, 1, elements, bytes)];
    const order = new Scatter();
    order.reset(elements, mixText(hashSeed(seed), 'order'));
    return {
      kernels: [
        {
          name: 'permutation',
          flops: 0,
          readBytes: elements * bytes,
          writeBytes: elements * bytes,
          readPattern: 'sequential',
          writePattern: `uniform granule=${bytes}B span=${elements * bytes}B`,
          tileBytes: Math.min(tile, elements) * bytes,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [i0, i1] of parts(elements, tile))
          yield {
            *tiles(): Generator<Tile> {
              const stores: number[] = [];
              for (let i = i0; i < i1; i++) stores.push(to.base + order.place(i) * bytes, bytes);
              yield { kernel: 0, flops: 0, loads: from.block(0, 1, i0, i1), stores };
            },
          };
      },
    };
  },
};
