/** The HTML report as a file: the page's program stands beside the compiled report, where the build put it. */
import { readFileSync } from 'node:fs';
import type { Result } from '../analysis/index.js';
import { htmlReport } from '../report/index.js';
import { systemError } from './system-error.js';

const CLIENT = new URL('../report/html/client.js', import.meta.url);

/** The page for a result. Throws SystemError when the program is not whole. */
export function htmlPage(result: Result): string {
  let client: string;
  try {
    client = readFileSync(CLIENT, 'utf8');
  } catch (error) {
    throw systemError('the HTML report’s own program cannot be read (npm run build makes it)', error);
  }
  return htmlReport(result, client);
}
