// Makes a fresh clone runnable: installs what is locked and builds, each only when needed. Built-ins only.
import { spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

const root = dirname(dirname(fileURLToPath(import.meta.url)));
const at = (...parts) => join(root, ...parts);
const json = (...parts) => JSON.parse(readFileSync(at(...parts), 'utf8'));

/** Runs a child with its output on stderr, so that stdout stays the program's. */
function run(command, args, shell = false) {
  const child = spawnSync(command, args, { cwd: root, stdio: ['ignore', 2, 2], shell });
  if (child.error) throw child.error;
  if (child.status !== 0) process.exit(child.status ?? 1);
}

/** Whether node_modules holds every version the lockfile names. */
function installed() {
  if (!existsSync(at('node_modules', '.package-lock.json'))) return false;
  const wanted = json('package-lock.json').packages;
  const present = json('node_modules', '.package-lock.json').packages;
  return Object.entries(wanted).every(
    ([name, entry]) =>
      name === '' || entry.link || entry.optional || entry.devOptional || present[name]?.version === entry.version,
  );
}
if (!installed()) {
  const args = ['ci', '--include=dev', '--ignore-scripts', '--no-audit', '--no-fund', '--loglevel=error'];
  const npm = process.env.npm_execpath;
  if (npm?.endsWith('.js')) run(process.execPath, [npm, ...args]);
  else run('npm', args, process.platform === 'win32');
}

/** Time of the newest file below a folder, ms. */
const newest = (folder) =>
  Math.max(
    0,
    ...readdirSync(folder, { withFileTypes: true, recursive: true })
      .filter((entry) => entry.isFile())
      .map((entry) => statSync(join(entry.parentPath ?? entry.path, entry.name)).mtimeMs),
  );
const stamp = at('node_modules', '.build-stamp');
const sources = Math.max(
  newest(at('src')),
  statSync(at('tsconfig.json')).mtimeMs,
  statSync(at('package-lock.json')).mtimeMs,
);
if (
  !existsSync(at('dist', 'cli', 'main.js')) ||
  !existsSync(at('dist', 'report', 'html', 'client.js')) ||
  !existsSync(stamp) ||
  statSync(stamp).mtimeMs < sources
) {
  rmSync(at('dist'), { recursive: true, force: true });
  const { bin } = json('node_modules', 'typescript', 'package.json');
  run(process.execPath, [at('node_modules', 'typescript', bin.tsc), '-p', at('tsconfig.json')]);
  run(process.execPath, [at('.ci', 'bundle.mjs')]);
  writeFileSync(stamp, '');
}
// where `npm start` puts its HTML report
mkdirSync(at('out'), { recursive: true });
