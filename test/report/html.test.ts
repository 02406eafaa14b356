import { createHash } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import { buildResult, type Result, standings } from '../../src/analysis/index.js';
import { STACK_CLASSES } from '../../src/engine/recording.js';
import { pageData } from '../../src/report/html/data.js';
import { html, scriptJson } from '../../src/report/html/markup.js';
import { together } from '../../src/report/html/sections/figure.js';
import { lossTable } from '../../src/report/html/sections/losses.js';
import { htmlReport } from '../../src/report/index.js';
import { LABELS } from '../../src/report/labels.js';
import { formatTime } from '../../src/units.js';
import { made } from '../analysis/recording.js';

const ORIGIN = {
  version: '9.9.9',
  options: { replay: 'closed', seed: '7', untilPs: Number.POSITIVE_INFINITY },
  overrides: [],
} as const;
const CLIENT = 'const text = "</script>";'; // stands for the bundle

function sample(): Result {
  const { pkg, trace, recording, delays } = made();
  return buildResult(pkg, trace, ORIGIN, recording, delays);
}

/** What stands in the page's script and style elements. */
function elements(page: string, name: 'script' | 'style'): string[] {
  return [...page.matchAll(new RegExp(`<${name}[^>]*>([\\s\\S]*?)</${name}>`, 'g'))].map(([, text]) => text);
}

describe('markup', () => {
  test('values are escaped, markup is not, nothing is shown of null and false', () => {
    const inner = html`<b>${'<&>'}</b>`;
    expect(html`${inner}|${`"'`}|${null}${false}|${['a', 1]}`.text).toBe('<b>&lt;&amp;&gt;</b>|&quot;&#39;||a1');
  });

  test('control and direction characters do not get through', () => {
    expect(html`${'a\u202eb\u0000c'}`.text).toBe('a?b?c');
  });

  test('JSON cannot end its script element', () => {
    const text = scriptJson({ name: '</script><!--' }).text;
    expect(text).not.toContain('<');
    expect(JSON.parse(text)).toEqual({ name: '</script><!--' });
  });
});

describe('page', () => {
  test('its policy allows exactly the style and the program that stand in it', () => {
    const page = htmlReport(sample(), CLIENT);
    const policy = /http-equiv="Content-Security-Policy" content="([^"]*)"/.exec(page)?.[1].replaceAll('&#39;', "'");
    expect(policy).toContain("default-src 'none'");
    expect(policy).not.toContain('unsafe');
    const hashes = [...(policy?.matchAll(/'sha256-([^']+)'/g) ?? [])].map(([, hash]) => hash);
    const [style] = elements(page, 'style');
    const program = elements(page, 'script').at(-1) ?? '';
    expect(program).toBe('const text = "<\\/script>";');
    expect(hashes.sort()).toEqual(
      [style, program].map((text) => createHash('sha256').update(text).digest('base64')).sort(),
    );
  });

  test('nothing in it is fetched', () => {
    const page = htmlReport(sample(), CLIENT);
    expect(page).not.toMatch(/\b(src|href)="(?!#)/);
    expect(page).not.toMatch(/url\(|@import/);
  });

  test('equal results give equal pages', () => {
    expect(htmlReport(sample(), CLIENT)).toBe(htmlReport(sample(), CLIENT));
  });

  test('foreign names stay text wherever they stand', () => {
    const evil = '<img src=x onerror=alert(1)>"\'</script>';
    const result = sample();
    const page = htmlReport(
      {
        ...result,
        kernels: result.kernels.map((kernel) => ({ ...kernel, name: evil, format: evil })),
        links: result.links.map((link) => ({ ...link, name: evil, die: evil })),
        provenance: { ...result.provenance, trace_file: evil, package_file: evil, seed: evil },
        package: { ...result.package, name: evil, caution: evil },
      },
      CLIENT,
    );
    expect(page).not.toContain('<img');
    expect(elements(page, 'script')).toHaveLength(2);
    expect(page).toContain('&lt;img src=x onerror=alert(1)&gt;&quot;&#39;&lt;/script&gt;');
  });

  test('a run of nothing, a failed check and a partial run have their pages', () => {
    const result = sample();
    const failed = { ...result, partial: true, checks: result.checks.map((check) => ({ ...check, ok: false })) };
    expect(htmlReport(failed, CLIENT)).toMatch(/must not be used[\s\S]*Partial/);
    const zero = Object.fromEntries([...STACK_CLASSES, 'total'].map((name) => [name, 0]));
    const nothing = {
      ...result,
      makespan_ps: 0,
      kernels: [],
      bandwidth_stack: zero as Result['bandwidth_stack'],
      read_latency: { ...result.read_latency, count: 0, mean_ps: 0 },
      timeline: { slice_ps: 0, read_bytes: [], write_bytes: [] },
      banks: { ...result.banks, atoms: result.banks.atoms.map(() => 0) },
    };
    const page = htmlReport(nothing, CLIENT);
    expect(page).toContain('There were no reads.');
    expect(page).not.toMatch(/NaN|Infinity|undefined/);
  });
});

test('no line breaks between a number and its unit; other blanks stay', () => {
  expect(together('4 reads took 1.21 us, 40 % of 3 TB/s in 2 stacks, 64 B')).toBe(
    '4 reads took 1.21\u00a0us, 40\u00a0% of 3\u00a0TB/s in 2 stacks, 64\u00a0B',
  );
});

test('the losses of each kernel stand in the page, with the judgement of its estimate', () => {
  const result = sample();
  const text = lossTable(result).text.replaceAll(/<[^>]+>/g, '|');
  const [gather] = standings(result, 0.1);
  expect(gather.verdict).toBe('too hopeful'); // 800 ns against an estimate of 500 ns
  expect(text).toContain('|gather||800.0 ns|');
  expect(text).toContain('|1.60||too hopeful|');
  for (const { name, ps } of gather.losses.slice(0, 1))
    expect(text.replaceAll('\u00a0', ' ')).toContain(`${LABELS[name]} ${formatTime(ps)}`);
});

describe('what the charts draw', () => {
  test('shares of every kernel and of every slice add up to one', () => {
    const { kernelStacks, time, classes } = pageData(sample());
    expect(classes.map(({ key }) => key)).toContain('read_data');
    const whole = (shares: readonly number[]): number => shares.reduce((sum, share) => sum + share, 0);
    for (const shares of kernelStacks.shares) expect(whole(shares)).toBeCloseTo(1, 3);
    for (let i = 0; i < time.shares[0].length; i++)
      expect(whole(time.shares.map((column) => column[i]))).toBeCloseTo(1, 3);
  });

  test('kernels that overlap stand in different lanes', () => {
    const { kernels, lanes } = pageData(sample()).time;
    expect(kernels.map(({ name }) => name)).toEqual(['gather', 'product']); // 0 to 800 ns, and 200 ns to 1 us
    expect(lanes).toEqual([0, 1]);
  });

  test('the share of reads beyond a delay begins at all and never rises', () => {
    for (const { beyond, label } of pageData(sample()).delays.series) {
      expect(
        [...beyond].sort((a, b) => b - a),
        label,
      ).toEqual([...beyond]);
      expect(beyond[0], label).toBeLessThanOrEqual(1);
    }
  });

  test('banks hold every byte moved', () => {
    const result = sample();
    const [bytes] = pageData(result).banks.metrics;
    expect(bytes.values.reduce((sum, value) => sum + value, 0)).toBe(result.bandwidth.moved_bytes);
  });
});
