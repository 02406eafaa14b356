/** Dense matrices: product, matrix times vector, transpose. */
import { type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

const FORMAT = { by: 'bf16', about: 'number format' };

export const matmul: Mix = {
  about: 'matrix product C = A B, A of m x k and B of k x n, in tiles',
  parameters: {
    m: { by: 1024, about: 'rows of A and C' },
    n: { by: 1024, about: 'columns of B and C' },
    k: { by: 1024, about: 'columns of A, rows of B' },
    tile_m: { by: 128, about: 'rows of C one engine works on' },
    tile_n: { by: 128, about: 'columns of C one engine works on' },
    tile_k: { by: 64, about: 'of k loaded at a time' },
    format: FORMAT,
  },
  flops: '2 m n k',
  read: 'e (m k ceil(n / tile_n) + k n ceil(m / tile_m))',
  write: 'e m n',
  make({ m, n, k, tile_m, tile_n, tile_k, e }) {
    const places = new Places();
    const [a, b, c] = [new Matrix(places, m, k, e), new Matrix(places, k, n, e), new Matrix(places, m, n, e)];
    const [width, outWidth] = [Math.min(tile_k, k) * e, Math.min(tile_n, n) * e];
    return {
      kernels: [
        {
          name: 'matmul',
          flops: 2 * m * n * k,
          readBytes: e * (m * k * Math.ceil(n / tile_n) + k * n * Math.ceil(m / tile_m)),
          writeBytes: e * m * n,
          readPattern: `block rows=${tile_m} width=${width}B pitch=${k * e}B`,
          writePattern: `block rows=${tile_m} width=${outWidth}B pitch=${n * e}B`,
          tileBytes: (Math.min(tile_m, m) + Math.min(tile_n, n)) * width,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [i0, i1] of parts(m, tile_m))
          for (const [j0, j1] of parts(n, tile_n))
            yield {
              *tiles(): Generator<Tile> {
                for (const [k0, k1] of parts(k, tile_k))
                  yield {
                    kernel: 0,
                    flops: 2 * (i1 - i0) * (j1 - j0) * (k1 - k0),
                    loads: [...a.block(i0, i1, k0, k1), ...b.block(k0, k1, j0, j1)],
                    stores: k1 === k ? c.block(i0, i1, j0, j1) : [],
                  };
              },
            };
      },
    };
  },
};

export const matvec: Mix = {
  about: 'matrix times vector y = A x, A of m x n, as in decoding one token at a time',
  parameters: {
    m: { by: 4096, about: 'rows of A' },
    n: { by: 4096, about: 'columns of A' },
    tile_m: { by: 8, about: 'rows one tile takes' },
    format: FORMAT,
  },
  flops: '2 m n',
  read: 'e (m n + n ceil(m / tile_m))',
  write: 'e m',
  make({ m, n, tile_m, e }) {
    const places = new Places();
    const [a, x, y] = [new Matrix(places, m, n, e), new Matrix(places, 1, n, e), new Matrix(places, m, 1, e)];
    return {
      kernels: [
        {
          name: 'matvec',
          flops: 2 * m * n,
          readBytes: e * (m * n + n * Math.ceil(m / tile_m)),
          writeBytes: e * m,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: (Math.min(tile_m, m) + 1) * n * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [r0, r1] of parts(m, tile_m))
          yield {
            *tiles(): Generator<Tile> {
              yield {
                kernel: 0,
                flops: 2 * (r1 - r0) * n,
                loads: [...x.block(0, 1), ...a.block(r0, r1)],
                stores: y.block(r0, r1),
              };
            },
          };
      },
    };
  },
};

export const transpose: Mix = {
  about: 'transpose of a matrix of rows x columns, in square tiles',
  parameters: {
    rows: { by: 2048, about: 'rows' },
    columns: { by: 2048, about: 'columns' },
    tile: { by: 64, about: 'rows and columns of a tile' },
    format: { by: 'fp32', about: 'number format' },
  },
  flops: '0',
  read: 'e rows columns',
  write: 'e rows columns',
  make({ rows, columns, tile, e }) {
    const places = new Places();
    const [from, to] = [new Matrix(places, rows, columns, e), new Matrix(places, columns, rows, e)];
    const bytes = e * rows * columns;
    const [width, height] = [Math.min(tile, columns), Math.min(tile, rows)];
    return {
      kernels: [
        {
          name: 'transpose',
          flops: 0,
          readBytes: bytes,
          writeBytes: bytes,
          readPattern: `block rows=${height} width=${width * e}B pitch=${columns * e}B`,
          writePattern: `block rows=${width} width=${height * e}B pitch=${rows * e}B`,
          tileBytes: width * height * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [r0, r1] of parts(rows, tile))
          for (const [c0, c1] of parts(columns, tile))
            yield {
              *tiles(): Generator<Tile> {
                yield { kernel: 0, flops: 0, loads: from.block(r0, r1, c0, c1), stores: to.block(c0, c1, r0, r1) };
              },
            };
      },
    };
  },
};
