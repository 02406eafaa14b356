import { createHash } from 'node:crypto';
import { readFileSync, statSync, writeFileSync } from 'node:fs';
import { pathToFileURL } from 'node:url';
import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest';
import { simulate } from '../../src/index.js';
import { htmlReport } from '../../src/report/index.js';
import { formatTime } from '../../src/units.js';
import { Folder, penstock, ROOT } from '../cli/penstock.js';
import { kernelTrace } from '../helpers/engine.js';
import { smallPackage } from '../helpers/packages.js';
import { launch } from './chromium.js';

const EVIL = '<img src=x onerror=alert(1)>';
const TRACE = `kernel,stream,format,flops,read,write,read_pattern,write_pattern,tile,repeat,estimate_us
${EVIL},main,bf16,4 MFLOP,1 MiB,256 KiB,sequential,sequential,32 KiB,2,2
b&b</script><script>alert(2)</script>,main,,0,512 KiB,512 KiB,uniform granule=64B span=256MiB,sequential,16 KiB,1,
"quote"" onmouseover=""alert(3)",side,fp8,9 MFLOP,128 KiB,0,chase granule=64B span=16MiB,,4 KiB,1,4
`;
const CHARTS = ['stacks', 'time', 'delays', 'roofline', 'reached', 'banks'];

const folder = new Folder();
let browser: Browser;
let pages: Page[] = [];
const [evil, demo] = [folder.at('evil.html'), folder.at('demo.html')];

beforeAll(async () => {
  const pkg = smallPackage('memory.0.refresh.mode=all-bank');
  const result = await simulate(pkg, await kernelTrace(pkg, TRACE));
  writeFileSync(evil, htmlReport(result, readFileSync(`${ROOT}dist/report/html/client.js`, 'utf8')));
  const ended = await penstock(['run', 'traces/wagtail-step.csv', '-p', 'configs/wagtail.yaml', '--html', demo]);
  expect(ended.code).toBe(0);
  browser = await launch();
});
afterEach(async () => {
  await Promise.all(pages.map((page) => page.close()));
  pages = [];
});
afterAll(async () => {
  await browser?.close();
  folder.remove();
});

interface Opened {
  readonly page: Page;
  /** What went wrong so far: messages on the console, errors, dialogs, requests other than for the page itself. */
  readonly trouble: string[];
}

async function open(file: string, options: Parameters<Browser['newPage']>[0] = {}): Promise<Opened> {
  const page = await browser.newPage({ viewport: { width: 1280, height: 900 }, colorScheme: 'light', ...options });
  pages.push(page);
  const trouble: string[] = [];
  const url = pathToFileURL(file).href;
  page.on('console', (message) => trouble.push(`console ${message.type()}: ${message.text()}`));
  page.on('pageerror', (error) => trouble.push(`error: ${error.message}`));
  page.on('request', (request) => {
    if (request.url() !== url) trouble.push(`request: ${request.url()}`);
  });
  page.on('requestfailed', (request) => trouble.push(`refused: ${request.failure()?.errorText}`));
  page.on('dialog', (dialog) => {
    trouble.push(`dialog: ${dialog.message()}`);
    void dialog.dismiss();
  });
  await page.goto(url);
  return { page, trouble };
}

/** How many colours the canvases of a chart hold: an empty one has a single one. */
function colours(page: Page, chart: string): Promise<number> {
  return page.locator(`[data-chart="${chart}"] canvas`).evaluateAll((layers: unknown[]) => {
    const seen = new Set<number>();
    for (const layer of layers) {
      const canvas = layer as {
        width: number;
        height: number;
        getContext(kind: string): { getImageData(...of: number[]): { data: Uint8ClampedArray } };
      };
      const { data } = canvas.getContext('2d').getImageData(0, 0, canvas.width, canvas.height);
      for (const word of new Uint32Array(data.buffer)) seen.add(word);
    }
    return seen.size;
  });
}

/** A short text that is equal for equal pictures of a chart. */
async function picture(page: Page, chart: string): Promise<string> {
  const layers = await page
    .locator(`[data-chart="${chart}"] canvas`)
    .evaluateAll((all: unknown[]) => all.map((canvas) => (canvas as { toDataURL(): string }).toDataURL()).join(' '));
  return createHash('sha256').update(layers).digest('hex');
}

const kernelColumn = (page: Page, column: number): Promise<string[]> =>
  page.locator(`#kernel-table tbody tr > :nth-child(${column})`).allTextContents();

describe.each([
  ['the demo', demo],
  ['names that try to be markup', evil],
])('%s', (_, file) => {
  test('nothing on the console, no request leaves the page, every chart is drawn', async () => {
    const { page, trouble } = await open(file);
    for (const chart of CHARTS) expect(await colours(page, chart), chart).toBeGreaterThan(8);
    await page.mouse.wheel(0, 20_000); // to the end
    expect(await page.evaluate('document.documentElement.dataset.drawn')).toBe(String(CHARTS.length));
    expect(trouble).toEqual([]);
  });

  test('nothing is wider than the window, at 1280 and at 800 and at 360', async () => {
    for (const width of [1280, 800, 360]) {
      const { page } = await open(file, { viewport: { width, height: 900 } });
      expect(await page.evaluate('document.documentElement.scrollWidth - innerWidth'), `${width} px`).toBe(0);
    }
  });
});

test('the demo takes less than 2 MB', () => {
  expect(statSync(demo).size).toBeLessThan(2_000_000);
});

test('names from the trace stay text, in the page, its title and its tooltips', async () => {
  const { page, trouble } = await open(evil);
  expect(await page.locator('img, iframe, object, embed').count()).toBe(0);
  expect(await page.locator('script').count()).toBe(2); // the data, and the page's own program
  expect(await page.locator('[onerror], [onmouseover]').count()).toBe(0);
  expect(await kernelColumn(page, 1)).toContain(EVIL);
  // over the first bar of the stacks chart, which is that kernel's
  const chart = page.locator('[data-chart="stacks"]');
  await chart.scrollIntoViewIfNeeded();
  await chart.hover({ position: { x: 500, y: 20 } });
  await expect.poll(() => page.locator('[data-chart="stacks"] .tip b').textContent()).toBe(EVIL);
  expect(await page.locator('img').count()).toBe(0);
  expect(trouble).toEqual([]);
});

test('a script that did get into the page would not run', async () => {
  const { page, trouble } = await open(evil);
  await page.evaluate(`{
    const script = document.createElement('script');
    script.textContent = 'document.title = "taken"';
    document.body.append(script);
    const box = document.createElement('div');
    box.innerHTML = '<img src="http://example.invalid/x.png" onerror="document.title = \\'taken\\'">';
    document.body.append(box);
  }`);
  await page.waitForTimeout(200);
  expect(await page.title()).toContain('small');
  // the policy says what it refused, and the picture got no further than the policy
  expect(trouble.filter((line) => line.includes('Content Security Policy')).length).toBeGreaterThanOrEqual(2);
  expect(trouble.filter((line) => line.startsWith('refused'))).toEqual(['refused: csp']);
  expect(trouble.filter((line) => line.startsWith('dialog'))).toEqual([]);
});

test('the kernel table sorts by number and by name, both ways, and says so', async () => {
  const { page } = await open(demo);
  const time = page.getByRole('button', { name: 'time', exact: true });
  const order = (): Promise<string[]> => kernelColumn(page, 1);
  const given = await order();
  await time.click();
  const durations = await page
    .locator('#kernel-table tbody tr > :nth-child(4)')
    .evaluateAll((cells: unknown[]) => cells.map((cell) => Number((cell as { dataset: { by: string } }).dataset.by)));
  expect(durations).toHaveLength(given.length);
  expect(durations).toEqual([...durations].sort((a, b) => b - a));
  const longest = (await order())[0];
  expect(await page.locator('#kernel-table th[aria-sort]').getAttribute('aria-sort')).toBe('descending');
  expect(await page.locator('#sorted').textContent()).toBe('sorted by time, descending');
  await time.press('Enter');
  expect((await order()).at(-1)).toBe(longest);
  expect(await page.locator('#kernel-table th[aria-sort]').getAttribute('aria-sort')).toBe('ascending');
  await page.getByRole('button', { name: 'kernel', exact: true }).click();
  expect(await order()).toEqual([...given].sort());
  // kernels without an estimate stay below in both directions
  const estimate = page.getByRole('button', { name: 'x estimate' });
  for (const _ of ['descending', 'ascending']) {
    await estimate.click();
    expect((await kernelColumn(page, 16)).slice(-2)).toEqual(['-', '-']);
  }
});

test('dark and light: as the system has it, by choice, and always light on paper', async () => {
  const { page, trouble } = await open(demo, { colorScheme: 'dark' });
  const paper = (): Promise<string> => page.evaluate('getComputedStyle(document.body).backgroundColor');
  const fill = (): Promise<string> => picture(page, 'reached');
  expect(await paper()).toBe('rgb(20, 25, 27)');
  const dark = await fill();
  await page.getByLabel('Theme').selectOption('light');
  expect(await paper()).toBe('rgb(250, 249, 245)');
  expect(await fill()).not.toEqual(dark);
  await page.getByLabel('Theme').selectOption('dark');
  expect(await fill()).toEqual(dark);
  await page.emulateMedia({ media: 'print' });
  expect(await paper()).toBe('rgb(250, 249, 245)');
  expect(await fill()).not.toEqual(dark);
  await page.emulateMedia({ media: 'screen' });
  expect(await fill()).toEqual(dark);
  expect((await page.pdf({ format: 'A4' })).length).toBeGreaterThan(50_000);
  expect(trouble).toEqual([]);
});

test('text is dark enough on its ground, in both themes (WCAG 2: 4.5 to 1)', async () => {
  for (const colorScheme of ['light', 'dark'] as const) {
    const { page } = await open(demo, { colorScheme });
    const colour = (name: string): Promise<string> =>
      page.evaluate(`getComputedStyle(document.documentElement).getPropertyValue('--${name}').trim()`);
    for (const text of ['ink', 'soft', 'accent', 'alarm']) {
      for (const ground of ['paper', 'sheet']) {
        expect(contrast(await colour(text), await colour(ground)), `${text} on ${ground}`).toBeGreaterThanOrEqual(4.5);
      }
    }
  }
});

/** Contrast of two colours given as #rrggbb, by the relative luminances of WCAG 2. */
function contrast(a: string, b: string): number {
  const luminance = (hex: string): number => {
    const [red, green, blue] = [1, 3, 5].map((at) => {
      const part = Number.parseInt(hex.slice(at, at + 2), 16) / 255;
      return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4;
    });
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue;
  };
  const [low, high] = [luminance(a), luminance(b)].sort((x, y) => x - y);
  return (high + 0.05) / (low + 0.05);
}

test('the keyboard reaches every control', async () => {
  const { page } = await open(demo);
  const all = await page.evaluate(`{
    const controls = [...document.querySelectorAll('a, button, select, summary, [tabindex="0"]')].filter((at) => at.checkVisibility());
    controls.forEach((at, i) => { at.dataset.control = i; });
    controls.length;
  }`);
  expect(all).toBeGreaterThan(50);
  const reached = new Set<string>();
  for (let i = 0; i <= Number(all); i++) {
    await page.keyboard.press('Tab');
    const at = await page.evaluate('document.activeElement?.dataset.control ?? ""');
    if (at !== '') reached.add(String(at));
  }
  expect(reached.size).toBe(all);
});

test('the time axis zooms and moves from the keyboard; a class can be hidden', async () => {
  const { page } = await open(demo);
  const view = page.locator('[data-zoomed]');
  const end = Number(await page.evaluate('JSON.parse(document.getElementById("data").textContent).time.endPs'));
  const span = (from: number, to: number): string => `${formatTime(from * end)} to ${formatTime(to * end)}`;
  const press = (name: string): Promise<void> => page.getByRole('button', { name, exact: true }).press('Enter');
  await press('Zoom in');
  expect(await view.textContent()).toBe(span(0.25, 0.75)); // the middle half
  await press('Earlier');
  expect(await view.textContent()).toBe(span(0, 0.5));
  await press('Whole run');
  expect(await view.textContent()).toBe('');
  const before = await picture(page, 'stacks');
  const button = page.getByRole('button', { name: 'read data', exact: true });
  await button.press('Space');
  expect(await button.getAttribute('aria-pressed')).toBe('false');
  expect(await picture(page, 'stacks')).not.toBe(before);
});

test('the heat map shows what is chosen', async () => {
  const { page } = await open(demo);
  const bytes = await picture(page, 'banks');
  await page.locator('[data-metric]').selectOption('row conflicts');
  expect(await picture(page, 'banks')).not.toBe(bytes);
});

test('on paper nothing is wider than the page, and the map of banks is drawn at once', async () => {
  const { page } = await open(demo, { viewport: { width: 690, height: 900 } }); // A4 less its margins
  await page.emulateMedia({ media: 'print' });
  expect(await page.evaluate('document.documentElement.scrollWidth - innerWidth')).toBe(0);
  const bottom = (): Promise<number[]> =>
    page
      .locator('[data-chart="banks"] canvas')
      .first()
      .evaluate((canvas: unknown) => {
        const { width, height, ...made } = canvas as { width: number; height: number };
        const context = (
          canvas as typeof made & {
            getContext(kind: string): { getImageData(...of: number[]): { data: ArrayLike<number> } };
          }
        ).getContext('2d');
        return Array.from(context.getImageData(width / 2, height - 100, 1, 1).data);
      });
  expect((await bottom())[3]).toBe(255); // the last rows are painted
});

test('without scripts every figure is still there, in tables', async () => {
  const { page } = await open(demo, { javaScriptEnabled: false });
  expect(await page.locator('noscript, .alarm').first().isVisible()).toBe(true);
  expect(await kernelColumn(page, 1)).toHaveLength(11);
  expect(await page.locator('table').count()).toBeGreaterThan(12);
});

test('a screen reader finds one heading 1, named regions, and a name and a table for every chart', async () => {
  const { page } = await open(demo);
  expect(await page.locator('h1').count()).toBe(1);
  const ids: string[] = await page.evaluate('[...document.querySelectorAll("[id]")].map((at) => at.id)');
  expect(new Set(ids).size).toBe(ids.length);
  for (const chart of await page.locator('[data-chart]').all()) {
    expect(await chart.getAttribute('role')).toBe('img');
    expect((await chart.getAttribute('aria-label'))?.length).toBeGreaterThan(20);
    expect(await chart.locator('xpath=ancestor::section').locator('table caption').count()).toBeGreaterThan(0);
  }
  for (const name of ['Where the DRAM clocks went', 'Over time', 'Roofline', 'Kernels']) {
    expect(await page.getByRole('region', { name, exact: true }).first().count(), name).toBe(1);
  }
  expect(await page.locator('html').getAttribute('lang')).toBe('en');
});
