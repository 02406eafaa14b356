/** Runs the built program as a user would, for the tests of the command line. */
import { execFileSync, spawn } from 'node:child_process';
import { mkdirSync, mkdtempSync, rmdirSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const ROOT = fileURLToPath(new URL('../../', import.meta.url));
export const WAGTAIL = join(ROOT, 'configs/wagtail.yaml');
const MAIN = join(ROOT, 'dist/cli/main.js');
const LOCK = join(ROOT, 'node_modules/.cli-build-lock');
const STALE_MS = 120_000; // a build that takes longer than this was killed

/** Builds `dist` when a source is newer. Test files that run side by side wait for each other. */
export async function build(): Promise<void> {
  for (;;) {
    try {
      mkdirSync(LOCK);
      break;
    } catch {
      const since = statSync(LOCK, { throwIfNoEntry: false })?.mtimeMs ?? 0;
      if (Date.now() - since > STALE_MS) rmSync(LOCK, { recursive: true, force: true });
      await new Promise((resolve) => setTimeout(resolve, 100));
    }
  }
  try {
    execFileSync(process.execPath, [join(ROOT, '.ci/ensure.mjs')], { cwd: ROOT, stdio: 'pipe' });
  } finally {
    rmdirSync(LOCK);
  }
}

export interface Ended {
  readonly code: number | null;
  readonly signal: NodeJS.Signals | null;
  readonly out: string;
  readonly err: string;
}

interface Asked {
  readonly input?: string;
  readonly env?: Record<string, string>;
  readonly cwd?: string;
  /** Called with each piece of standard error and a way to send signals. */
  readonly onStart?: (kill: (signal: NodeJS.Signals) => void) => void;
}

/** Runs `penstock` with these arguments to its end. */
export function penstock(
  args: readonly string[],
  { input, env = {}, cwd = ROOT, onStart }: Asked = {},
): Promise<Ended> {
  return new Promise((resolve, reject) => {
    const { FORCE_COLOR: _, NO_COLOR: __, ...clean } = process.env;
    const child = spawn(process.execPath, [MAIN, ...args], { cwd, env: { ...clean, ...env } });
    let out = '';
    let err = '';
    child.stdout.setEncoding('utf8').on('data', (text) => {
      out += text;
    });
    child.stderr.setEncoding('utf8').on('data', (text) => {
      err += text;
    });
    child.on('error', reject);
    child.on('close', (code, signal) => resolve({ code, signal, out, err }));
    child.stdin.on('error', () => {}); // a program that ends early does not read on
    child.stdin.end(input ?? '');
    onStart?.((signal) => child.kill(signal));
  });
}

/** A folder of its own that is gone after the test. */
export class Folder {
  readonly path = mkdtempSync(join(tmpdir(), 'penstock-cli-'));

  at(name: string): string {
    return join(this.path, name);
  }

  remove(): void {
    rmSync(this.path, { recursive: true, force: true });
  }
}
