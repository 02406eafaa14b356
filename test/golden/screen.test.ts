import { execFileSync } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { expect, it } from 'vitest';
import { build } from '../cli/penstock.js';

const ROOT = fileURLToPath(new URL('../../', import.meta.url));
const README = `${ROOT}README.md`;
const [BEGIN, END] = ['<!-- screen:begin (npm start) -->\n```text\n', '\n```\n<!-- screen:end -->'];

/*
 * The demo's screen stands in README.md, so it is also the golden record of the demo's figures. A meant change is accepted with
 *
 *     UPDATE_SCREEN=1 npx vitest run test/golden
 */
it('README shows what the demo prints', async () => {
  await build();
  const args = ['dist/cli/main.js', 'run', 'traces/wagtail-step.csv', '--package', 'configs/wagtail.yaml'];
  const env = { ...process.env, NO_COLOR: '1' };
  const printed = execFileSync(process.execPath, args, { cwd: ROOT, encoding: 'utf8', env }).trimEnd();
  const text = readFileSync(README, 'utf8');
  const [from, to] = [text.indexOf(BEGIN) + BEGIN.length, text.indexOf(END)];
  const { UPDATE_SCREEN } = process.env;
  if (UPDATE_SCREEN) writeFileSync(README, text.slice(0, from) + printed + text.slice(to));
  else expect(text.slice(from, to).split('\n')).toEqual(printed.split('\n'));
}, 120_000);
