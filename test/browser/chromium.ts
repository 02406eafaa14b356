import { existsSync } from 'node:fs';
import { delimiter, join } from 'node:path';
import { type Browser, chromium } from 'playwright-core';

const NAMES = ['chromium', 'chromium-browser', 'google-chrome', 'google-chrome-stable'];
const PLACES = [
  '/Applications/Chromium.app/Contents/MacOS/Chromium',
  '/Applications/Google Chrome.app/Contents/MacOS/Google Chrome',
];

/** The browser named by CHROMIUM, else the first known one on the path. Throws when there is none. */
function executable(): string {
  const { CHROMIUM: named, PATH = '' } = process.env;
  if (named !== undefined) {
    if (existsSync(named)) return named;
    throw new Error(`CHROMIUM names ${named}, and there is no such file`);
  }
  const places = [...PATH.split(delimiter).flatMap((folder) => NAMES.map((name) => join(folder, name))), ...PLACES];
  const found = places.find((place) => existsSync(place));
  if (found !== undefined) return found;
  throw new Error(
    `no Chromium found: looked for ${NAMES.join(', ')} on the path. Install it (Debian: apt-get install chromium) or name one in CHROMIUM`,
  );
}

/** Starts a headless browser that asks nobody for anything by itself. */
export function launch(): Promise<Browser> {
  return chromium.launch({
    executablePath: executable(),
    args: [
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}
