/** Attention, computed block by block so that the scores never reach memory (as in Dao et al., "FlashAttention", NeurIPS 2022). */
import { hashSeed, mixText } from '../../random.js';
import { Scatter } from '../scatter.js';
import { impossible, type Job, Matrix, type Mix, Places, parts, type Tile } from './mix.js';

const HEADS = {
  heads: { by: 16, about: 'query heads' },
  kv_heads: { by: 4, about: 'key and value heads, each shared by heads / kv_heads query heads' },
  dim: { by: 128, about: 'elements of a head' },
};

export const prefill: Mix = {
  about: 'attention over a whole prompt: every query block against the key and value blocks up to it',
  parameters: {
    batch: { by: 1, about: 'sequences' },
    tokens: { by: 1024, about: 'tokens of each' },
    ...HEADS,
    block: { by: 128, about: 'queries, and keys, of a block' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops:
    '4 batch heads dim P;  with q = floor(tokens / block), r = tokens - q block:  P = block^2 q (q + 1) / 2 + r tokens',
  read: 'e batch heads dim (tokens + 2 K);  K = block q (q + 1) / 2, and tokens more when r > 0',
  write: 'e batch heads dim tokens',
  make({ batch, tokens, heads, kv_heads, dim, block, e }) {
    if (kv_heads > heads)
      throw impossible('attention', `kv_heads=${kv_heads} and heads=${heads}`, 'no more kv_heads than heads');
    const places = new Places();
    // a row a token, the heads of a token side by side
    const q = new Matrix(places, batch * tokens, heads * dim, e);
    const k = new Matrix(places, batch * tokens, kv_heads * dim, e);
    const v = new Matrix(places, batch * tokens, kv_heads * dim, e);
    const o = new Matrix(places, batch * tokens, heads * dim, e);
    const whole = Math.floor(tokens / block);
    const rest = tokens - whole * block;
    const pairs = (block * block * whole * (whole + 1)) / 2 + rest * tokens;
    const keys = (block * whole * (whole + 1)) / 2 + (rest > 0 ? tokens : 0);
    const width = dim * e;
    return {
      kernels: [
        {
          name: 'prefill',
          flops: 4 * batch * heads * dim * pairs,
          readBytes: e * batch * heads * dim * (tokens + 2 * keys),
          writeBytes: e * batch * heads * dim * tokens,
          readPattern: `strided stride=${kv_heads * width}B granule=${width}B`,
          writePattern: `strided stride=${heads * width}B granule=${width}B`,
          tileBytes: 2 * Math.min(block, tokens) * width,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (let b = 0; b < batch; b++)
          for (let head = 0; head < heads; head++)
            for (const [q0, q1] of parts(tokens, block)) {
              const [first, kv] = [b * tokens, Math.floor((head * kv_heads) / heads)];
              yield {
                *tiles(): Generator<Tile> {
                  for (const [k0, k1] of parts(q1, block)) {
                    const own = [first + k0, first + k1, kv * dim, (kv + 1) * dim] as const;
                    const rows = [first + q0, first + q1, head * dim, (head + 1) * dim] as const;
                    yield {
                      kernel: 0,
                      flops: 4 * (q1 - q0) * (k1 - k0) * dim,
                      loads: [...(k0 === 0 ? q.block(...rows) : []), ...k.block(...own), ...v.block(...own)],
                      stores: k1 === q1 ? o.block(...rows) : [],
                    };
                  }
                },
              };
            }
      },
    };
  },
};

export const decode: Mix = {
  about: 'attention of one new token of each sequence over its cache of keys and values, kept in pages',
  parameters: {
    batch: { by: 8, about: 'sequences' },
    context: { by: 2048, about: 'tokens in the cache of each' },
    ...HEADS,
    page: { by: 16, about: 'tokens of a page; pages lie scattered over the cache' },
    block: { by: 128, about: 'tokens one tile takes' },
    format: { by: 'bf16', about: 'number format' },
  },
  flops: '4 batch heads dim context',
  read: 'e batch dim (2 kv_heads context + heads)',
  write: 'e batch dim heads',
  make({ batch, context, heads, kv_heads, dim, page, block, e }, { seed }) {
    if (kv_heads > heads)
      throw impossible('attention', `kv_heads=${kv_heads} and heads=${heads}`, 'no more kv_heads than heads');
    const places = new Places();
    const pages = Math.ceil(context / page);
    const row = kv_heads * dim * e; // bytes of a token
    const caches = [0, 1].map(() => places.take(batch * pages * page * row));
    const q = new Matrix(places, batch, heads * dim, e);
    const o = new Matrix(places, batch, heads * dim, e);
    const order = new Scatter();
    order.reset(batch * pages, mixText(hashSeed(seed), 'pages'));
    return {
      kernels: [
        {
          name: 'decode',
          flops: 4 * batch * heads * dim * context,
          readBytes: e * batch * dim * (2 * kv_heads * context + heads),
          writeBytes: e * batch * dim * heads,
          readPattern: `strided stride=${row}B granule=${dim * e}B`,
          writePattern: 'sequential',
          tileBytes: 2 * Math.min(block, context) * dim * e,
        },
      ],
      space: places.end,
      kernelTrace: true,
      *jobs(): Generator<Job> {
        for (let b = 0; b < batch; b++)
          for (let head = 0; head < kv_heads; head++) {
            // query heads of this key and value head
            const [h0, h1] = [Math.ceil((head * heads) / kv_heads), Math.ceil(((head + 1) * heads) / kv_heads)];
            yield {
              *tiles(): Generator<Tile> {
                for (const [t0, t1] of parts(context, block)) {
                  const runs: number[] = [];
                  for (const cache of caches)
                    for (let t = t0; t < t1; t++) {
                      const place = order.place(b * pages + Math.floor(t / page)) * page + (t % page);
                      runs.push(cache + place * row + head * dim * e, dim * e);
                    }
                  const own = [b, b + 1, h0 * dim, h1 * dim] as const;
                  yield {
                    kernel: 0,
                    flops: 4 * (h1 - h0) * dim * (t1 - t0),
                    loads: t0 === 0 ? [...q.block(...own), ...runs] : runs,
                    stores: t1 === context ? o.block(...own) : [],
                  };
                }
              },
            };
          }
      },
    };
  },
};
