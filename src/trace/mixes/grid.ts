/** Work on grids: convolution and stencil. */
import { impossible, type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

export const convolution: Mix = {
  about: 'two-dimensional convolution, channels innermost, without padding',
  parameters: {
    batch: { by: 1, about: 'images' },
    height: { by: 58, about: 'rows of an image' },
    width: { by: 58, about: 'pixels of a row' },
    channels: { by: 128, about: 'input channels' },
    filters: { by: 128, about: 'output channels' },
    kernel: { by: 3, about: 'rows and columns of a filter' },
    stride: { by: 1, about: 'pixels from one output to the next' },
    rows: { by: 2, about: 'output rows one engine works on' },
    tile: { by: 16, about: 'filters loaded at a time' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops: '2 batch H W filters channels kernel^2;  H = floor((height - kernel) / stride) + 1, W likewise',
  read: 'e batch channels (width ((H - T) stride + T kernel) + T kernel^2 filters);  T = ceil(H / rows), where stride <= kernel',
  write: 'e batch H W filters',
  make(values) {
    const { batch, height, width, channels, filters, kernel: side, stride: step, rows, tile, e } = values;
    if (side > Math.min(height, width))
      throw impossible('convolution', `kernel=${side}`, 'no more than height and width');
    if (step > side)
      throw impossible('convolution', `stride=${step} and kernel=${side}`, 'a stride that skips no pixel');
    const places = new Places();
    const [outHeight, outWidth] = [height, width].map((size) => Math.floor((size - side) / step) + 1);
    const image = new Matrix(places, batch * height, width * channels, e);
    const weights = new Matrix(places, filters, side * side * channels, e);
    const out = new Matrix(places, batch * outHeight, outWidth * filters, e);
    const tiles = Math.ceil(outHeight / rows);
    return {
      kernels: [
        {
          name: 'convolution',
          flops: 2 * batch * outHeight * outWidth * filters * channels * side * side,
          readBytes:
            e *
            batch *
            channels *
            (width * ((outHeight - tiles) * step + tiles * side) + tiles * side * side * filters),
          writeBytes: e * batch * outHeight * outWidth * filters,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: Math.min(tile, filters) * side * side * channels * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (let b = 0; b < batch; b++)
          for (const [y0, y1] of parts(outHeight, rows))
            yield {
              *tiles(): Generator<Tile> {
                const first = b * height + y0 * step;
                for (const [f0, f1] of parts(filters, tile))
                  yield {
                    kernel: 0,
                    flops: 2 * (y1 - y0) * outWidth * (f1 - f0) * channels * side * side,
                    loads: [
                      ...(f0 === 0 ? image.block(first, first + (y1 - y0 - 1) * step + side) : []),
                      ...weights.block(f0, f1),
                    ],
                    stores: f1 === filters ? out.block(b * outHeight + y0, b * outHeight + y1) : [],
                  };
              },
            };
      },
    };
  },
};

export const stencil: Mix = {
  about:
    'seven-point stencil on a grid, in slabs of planes: each plane is loaded once a slab, and its neighbours’ edge planes again',
  parameters: {
    nx: { by: 128, least: 3, about: 'points of a row' },
    ny: { by: 128, least: 3, about: 'rows of a plane' },
    nz: { by: 128, least: 3, about: 'planes' },
    planes: { by: 8, about: 'planes of a slab' },
    format: { by: 'fp32', about: 'number format' },
  },
  flops: '13 (nx - 2) (ny - 2) (nz - 2): seven products, six sums',
  read: 'e nx ny (nz - 2 + 2 ceil((nz - 2) / planes))',
  write: 'e (nx - 2) (ny - 2) (nz - 2)',
  make({ nx, ny, nz, planes, e }) {
    const places = new Places();
    const [from, to] = [new Matrix(places, nz * ny, nx, e), new Matrix(places, nz * ny, nx, e)];
    const inner = (nx - 2) * (ny - 2);
    return {
      kernels: [
        {
          name: 'stencil',
          flops: 13 * inner * (nz - 2),
          readBytes: e * nx * ny * (nz - 2 + 2 * Math.ceil((nz - 2) / planes)),
          writeBytes: e * inner * (nz - 2),
          readPattern: 'sequential',
          writePattern: `strided stride=${nx * e}B granule=${(nx - 2) * e}B`,
          tileBytes: nx * ny * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [z0, z1] of parts(nz - 2, planes))
          yield {
            *tiles(): Generator<Tile> {
              for (let z = z0 + 1; z <= z1; z++) {
                const first = z === z0 + 1 ? z - 1 : z + 1;
                yield {
                  kernel: 0,
                  flops: 13 * inner,
                  loads: from.block(first * ny, (z + 2) * ny),
                  stores: to.block(z * ny + 1, z * ny + ny - 1, 1, nx - 1),
                };
              }
            },
          };
      },
    };
  },
};
