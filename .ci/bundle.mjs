// Bundles the HTML report's own program into one file beside the compiled report, after tsc.
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { build } from 'esbuild';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
await build({
  entryPoints: [join(root, 'src/report/html/client/main.ts')],
  outfile: join(root, 'dist/report/html/client.js'),
  bundle: true,
  minify: true,
  format: 'iife',
  target: 'es2022',
  legalComments: 'inline',
  logLevel: 'warning',
  define: { 'process.env.NODE_ENV': '"production"' },
});
