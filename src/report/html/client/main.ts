/** The page's program: draws the charts, fills the legends, sorts, zooms, and follows the theme. Runs in the browser. */
import type { PageData } from '../page-data.js';
import { banksPlot } from './banks.js';
import type { Plot } from './base.js';
import { delaysPlot } from './delays.js';
import { type Chart, init } from './echarts.js';
import { colourOf, type Hidden, makeLegend } from './legend.js';
import { reachedPlot, rooflinePlot } from './roofline.js';
import { sortTables } from './sort.js';
import { stacksPlot } from './stacks.js';
import { inkNow, onTheme } from './theme.js';
import { timePlot } from './time.js';
import { zoomButtons } from './zoom.js';

const data: PageData = JSON.parse(document.getElementById('data')?.textContent ?? '');
const PAPER_PX = 690; // width of a printed page, less its margins

interface Drawn {
  readonly box: HTMLElement;
  readonly plot: Plot;
  readonly chart: Chart;
}
const drawn = new Map<string, Drawn>();

function draw({ box, plot, chart }: Drawn, width = box.clientWidth): void {
  const height = plot.height?.(width);
  if (height !== undefined) box.style.height = `${height}px`;
  chart.resize({ width, height: height ?? box.clientHeight });
  // what the reader zoomed to stays
  const zoom = (chart.getOption() as { dataZoom?: { start: number; end: number }[] } | undefined)?.dataZoom?.[0];
  chart.setOption(plot.option(inkNow(), width), { notMerge: true });
  if (zoom !== undefined) chart.dispatchAction({ type: 'dataZoom', start: zoom.start, end: zoom.end });
}

function add(key: string, plot: Plot): void {
  const box = document.querySelector<HTMLElement>(`[data-chart="${key}"]`);
  if (box === null) return;
  const height = plot.height?.(box.clientWidth);
  if (height !== undefined) box.style.height = `${height}px`;
  const chart = init(box, null, { renderer: 'canvas', devicePixelRatio: Math.max(2, devicePixelRatio) });
  const made = { box, plot, chart };
  drawn.set(key, made);
  draw(made);
}

function redraw(...keys: string[]): void {
  for (const key of keys) {
    const made = drawn.get(key);
    if (made !== undefined) draw(made);
  }
}

const hiddenClasses: Hidden = new Set();
const hiddenDelays: Hidden = new Set();
const metric = document.querySelector<HTMLSelectElement>('[data-metric]');
metric?.addEventListener('change', () => redraw('banks'));

const paintLegends = [
  makeLegend(
    'stacks',
    data.classes.map(({ key, label }) => ({ key, label, colour: colourOf(key) })),
    hiddenClasses,
    () => redraw('stacks', 'time'),
  ),
  makeLegend(
    'delays',
    data.delays.series.map(({ label }, s) => ({
      key: label,
      label,
      colour: s === 0 ? () => inkNow().ink : colourOf(label.replaceAll(' ', '_')),
    })),
    hiddenDelays,
    () => redraw('delays'),
  ),
];
const paint = (): void => {
  for (const legend of paintLegends) legend();
};
paint();

add('stacks', stacksPlot(data, hiddenClasses));
add('time', timePlot(data, hiddenClasses));
add('delays', delaysPlot(data, hiddenDelays));
add('roofline', rooflinePlot(data));
add('reached', reachedPlot(data));
add(
  'banks',
  banksPlot(data, () => metric?.value ?? 'bytes'),
);
const time = drawn.get('time');
if (time !== undefined) zoomButtons(time.chart, data.time.endPs);
sortTables();

onTheme((printing) => {
  paint();
  for (const made of drawn.values()) draw(made, printing ? PAPER_PX : undefined);
});

let pending = 0;
addEventListener('resize', () => {
  cancelAnimationFrame(pending);
  pending = requestAnimationFrame(() => {
    for (const made of drawn.values()) draw(made);
  });
});
document.documentElement.dataset.drawn = String(drawn.size);
