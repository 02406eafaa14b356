/** Work on rows of a table: normalisation, embedding gather, expert selection. */
import { stream } from '../../random.js';
import { ZipfRanks } from '../zipf.js';
import { impossible, type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

export const norm: Mix = {
  about: 'root-mean-square normalisation of every row, with a weight for each column',
  parameters: {
    rows: { by: 2048, about: 'rows' },
    width: { by: 4096, about: 'elements of a row' },
    tile: { by: 4, about: 'rows one tile takes' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops: '4 rows width: square, add, scale by the root, scale by the weight',
  read: 'e (rows width + width ceil(rows / tile))',
  write: 'e rows width',
  make({ rows, width, tile, e }) {
    const places = new Places();
    const [x, weights, y] = [
      new Matrix(places, rows, width, e),
      new Matrix(places, 1, width, e),
      new Matrix(places, rows, width, e),
    ];
    return {
      kernels: [
        {
          name: 'norm',
          flops: 4 * rows * width,
          readBytes: e * (rows * width + width * Math.ceil(rows / tile)),
          writeBytes: e * rows * width,
          readPattern: 'sequential',
          writePattern: 'sequential',
          tileBytes: (Math.min(tile, rows) + 1) * width * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (const [r0, r1] of parts(rows, tile))
          yield {
            *tiles(): Generator<Tile> {
              yield {
                kernel: 0,
                flops: 4 * (r1 - r0) * width,
                loads: [...weights.block(0, 1), ...x.block(r0, r1)],
                stores: y.block(r0, r1),
              };
            },
          };
      },
    };
  },
};

const INDEX = 4; // bytes of an index

export const embedding: Mix = {
  about: 'rows of a table gathered by token, frequent tokens more often than rare ones (Zipf)',
  parameters: {
    tokens: { by: 4096, about: 'tokens' },
    vocabulary: { by: 131072, about: 'rows of the table' },
    width: { by: 4096, about: 'elements of a row' },
    s: { by: 1, least: 0.01, fraction: true, about: 'exponent of Zipf’s law' },
    tile: { by: 16, about: 'tokens one tile takes' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops: '0',
  read: 'tokens (e width + 4)',
  write: 'e tokens width',
  make({ tokens, vocabulary, width, s, tile, e }, { seed }) {
    const places = new Places();
    const ids = new Matrix(places, 1, tokens, INDEX);
    const table = new Matrix(places, vocabulary, width, e);
    const out = new Matrix(places, tokens, width, e);
    return {
      kernels: [
        {
          name: 'embedding',
          flops: 0,
          readBytes: tokens * (e * width + INDEX),
          writeBytes: e * tokens * width,
          readPattern: `zipf s=${s} granule=${width * e}B span=${vocabulary * width * e}B`,
          writePattern: 'sequential',
          tileBytes: Math.min(tile, tokens) * width * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        const ranks = new ZipfRanks();
        ranks.reset(vocabulary, s);
        const random = stream(seed, 'tokens');
        for (const [t0, t1] of parts(tokens, tile)) {
          const rows = Array.from({ length: t1 - t0 }, () => ranks.draw(random) - 1); // drawn in order, whoever runs it
          yield {
            *tiles(): Generator<Tile> {
              yield {
                kernel: 0,
                flops: 0,
                loads: [...ids.block(0, 1, t0, t1), ...rows.flatMap((row) => table.block(row, row + 1))],
                stores: out.block(t0, t1),
              };
            },
          };
        }
      },
    };
  },
};

export const experts: Mix = {
  about: 'a layer of experts: each token goes to top_k of them, whose three weight matrices are read once each',
  parameters: {
    tokens: { by: 64, about: 'tokens' },
    experts: { by: 64, about: 'experts' },
    top_k: { by: 4, about: 'experts of each token' },
    width: { by: 2048, about: 'elements of a token' },
    hidden: { by: 1024, about: 'elements between the matrices' },
    s: { by: 0.5, least: 0.01, fraction: true, about: 'skew of the choice: exponent of Zipf’s law' },
    tile: { by: 8, about: 'hidden elements, or tokens, one tile takes' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops: '6 tokens top_k width hidden',
  read: 'e width (3 A hidden + tokens top_k);  A: experts that any token chose, drawn by the seed',
  write: 'e width tokens top_k',
  make(values, { seed }) {
    const { tokens, experts: count, top_k, width, hidden, s, tile, e } = values;
    if (top_k > count) throw impossible('experts', `top_k=${top_k} of ${count} experts`, 'no more than there are');
    const places = new Places();
    const weights = new Matrix(places, count * 3 * hidden, width, e);
    const x = new Matrix(places, tokens, width, e);
    const y = new Matrix(places, tokens * top_k, width, e);
    const chosen = choose(count, tokens, top_k, s, seed);
    const active = chosen.filter((list) => list.length > 0).length;
    const choices = tokens * top_k;
    return {
      kernels: [
        {
          name: 'experts',
          flops: 6 * choices * width * hidden,
          readBytes: e * width * (3 * active * hidden + choices),
          writeBytes: e * width * choices,
          readPattern: `uniform granule=${width * e}B span=${count * 3 * hidden * width * e}B`,
          writePattern: 'sequential',
          tileBytes: 3 * Math.min(tile, hidden) * width * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        let out = 0;
        for (const [expert, list] of chosen.entries()) {
          if (list.length === 0) continue;
          const first = out;
          out += list.length;
          yield {
            *tiles(): Generator<Tile> {
              for (const [t0, t1] of parts(list.length, tile))
                yield {
                  kernel: 0,
                  flops: 0,
                  loads: list.slice(t0, t1).flatMap((token) => x.block(token, token + 1)),
                  stores: [],
                };
              for (const [h0, h1] of parts(hidden, tile))
                yield {
                  kernel: 0,
                  flops: 6 * list.length * width * (h1 - h0),
                  loads: [0, 1, 2].flatMap((matrix) => {
                    const row = (expert * 3 + matrix) * hidden;
                    return weights.block(row + h0, row + h1);
                  }),
                  stores: [],
                };
              for (const [t0, t1] of parts(list.length, tile))
                yield { kernel: 0, flops: 0, loads: [], stores: y.block(first + t0, first + t1) };
            },
          };
        }
      },
    };
  },
};

/** Tokens of each expert: every token takes `each` different ones, by Zipf's law. */
function choose(experts: number, tokens: number, each: number, s: number, seed: string): number[][] {
  const chosen: number[][] = Array.from({ length: experts }, () => []);
  const random = stream(seed, 'experts');
  const ranks = new ZipfRanks();
  ranks.reset(experts, s);
  for (let token = 0; token < tokens; token++) {
    const own = new Set<number>();
    // after so many draws the next free ones are taken: the law is steep enough to draw the same for ever
    for (let draw = 0; own.size < each; draw++) {
      let expert = draw < 64 * each ? ranks.draw(random) - 1 : 0;
      while (draw >= 64 * each && own.has(expert)) expert++;
      own.add(expert);
    }
    for (const expert of own) chosen[expert].push(token);
  }
  return chosen;
}
