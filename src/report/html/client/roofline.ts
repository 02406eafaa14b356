import { formatBandwidth, formatFlops, formatPercent } from '../../../units.js';
import type { PageData, RooflinePoint } from '../page-data.js';
import { axis, base, brief, type Plot, tip, tooltip } from './base.js';
import type { Ink } from './theme.js';

const HEIGHT = 544; // px
const LINE = 15; // px of a line of text

/** Kernels under the ceilings of the package, both axes logarithmic. */
export function rooflinePlot({ roofline: { points, slopes, roofs } }: PageData): Plot {
  const top = Math.max(...roofs.map(({ flopsPerS }) => flopsPerS), ...points.map(({ bound }) => bound), 1e9);
  const steepest = Math.max(...slopes.map(({ bytesPerS }) => bytesPerS));
  const ridge = top / Math.min(...slopes.map(({ bytesPerS }) => bytesPerS));
  const intensities = points.map(({ intensity }) => intensity);
  const minX = decade(Math.min(...intensities, ridge / 100), -1);
  const maxX = decade(Math.max(...intensities.map((intensity) => intensity * 8), ridge * 3), 1);
  const lowest = points.flatMap(({ attained, estimate }) => (estimate === null ? [attained] : [attained, estimate]));
  const minY = decade(Math.min(...lowest, minX * steepest), -1);
  const maxY = decade(top * 1.2, 1);
  // names that would lie over each other are moved down, from the highest mark on
  const shifts = (width: number): number[] => {
    const across = (width - 124) / Math.log10(maxX / minX); // px a decade
    const along = (HEIGHT - 64) / Math.log10(maxY / minY);
    const boxes = points.map(({ name, intensity, attained }, at) => ({
      at,
      left: across * Math.log10(intensity / minX),
      width: 10 + 6.8 * Math.min(24, name.length),
      y: along * Math.log10(maxY / attained),
    }));
    boxes.sort((a, b) => a.y - b.y);
    const out = boxes.map(() => 0);
    const lines = roofs.map(({ flopsPerS }) => along * Math.log10(maxY / flopsPerS));
    boxes.forEach((box, i) => {
      // a name does not lie on a roof either
      const on = lines.find((line) => Math.abs(box.y - line) < LINE / 2);
      let y = on === undefined ? box.y : on + LINE * 0.8;
      for (const other of boxes.slice(0, i)) {
        const apart = box.left > other.left + other.width || other.left > box.left + box.width;
        const taken = other.y + out[other.at];
        if (!apart && Math.abs(y - taken) < LINE) y = taken + LINE;
      }
      out[box.at] = y - box.y;
    });
    return out;
  };
  // the highest first: names stand above the lines, the lowest line's below
  const ranked = [...slopes].sort((a, b) => b.bytesPerS - a.bytesPerS);
  return {
    height: () => HEIGHT,
    option: (ink, width) => ({
      ...base(ink),
      grid: { left: 96, right: 28, top: 16, bottom: 48 },
      xAxis: axis(ink, {
        type: 'log',
        min: minX,
        max: maxX,
        name: 'FLOP per moved byte',
        nameLocation: 'middle',
        nameGap: 28,
        axisLabel: { color: ink.soft, hideOverlap: true, formatter: (v: number) => String(Number(v.toPrecision(2))) },
      }),
      yAxis: axis(ink, {
        type: 'log',
        min: minY,
        max: maxY,
        axisLabel: { color: ink.soft, formatter: (v: number) => formatFlops(v) },
      }),
      tooltip: {
        trigger: 'item',
        ...tooltip(ink, (params: { seriesName: string; data: { at?: number } }) => {
          const { at } = params.data;
          return at === undefined ? tip(params.seriesName, []) : described(points[at]);
        }),
      },
      series: [
        ...ranked.map(({ label, bytesPerS }, i) =>
          ceiling(`${label} ${formatBandwidth(bytesPerS)}`, slopeLine(bytesPerS, minX, minY, top), ink, i, 'start'),
        ),
        ...roofs.map(({ label, flopsPerS }) => {
          const from = flopsPerS / steepest;
          const line: Line = [
            [from, flopsPerS],
            [maxX, flopsPerS],
          ];
          return ceiling(`${label} ${formatFlops(flopsPerS)}`, line, ink, 0, 'end');
        }),
        {
          type: 'custom',
          name: 'names of the ceilings',
          silent: true,
          data: ranked.map(({ bytesPerS }) => bytesPerS),
          encode: {},
          renderItem: ({ dataIndex }: { dataIndex: number }, api: Api) => {
            const { label, bytesPerS } = ranked[dataIndex];
            const below = dataIndex > 0 && dataIndex === ranked.length - 1;
            return alongSlope(api, `${label} ${formatBandwidth(bytesPerS)}`, bytesPerS, top, below, ink.soft);
          },
        },
        // from the bound down to what was attained
        ...points.map(({ intensity, attained, bound }) => ({
          type: 'line',
          name: 'loss',
          silent: true,
          symbol: 'none',
          lineStyle: { color: ink.attained, width: 1, type: 'dotted' },
          data: [
            [intensity, attained],
            [intensity, bound],
          ],
        })),
        scatter(
          'bound',
          points.map(({ intensity, bound }, at) => ({ value: [intensity, bound], at })),
          {
            symbol: 'circle',
            symbolSize: 11,
            itemStyle: { color: 'transparent', borderColor: ink.attained, borderWidth: 1.5, opacity: 1 },
          },
        ),
        scatter(
          'estimate',
          points.flatMap(({ intensity, estimate }, at) =>
            estimate === null ? [] : [{ value: [intensity, estimate], at }],
          ),
          { symbol: 'triangle', symbolSize: 9, itemStyle: { color: ink.estimate, opacity: 1 } },
        ),
        scatter(
          'attained',
          points.map(({ intensity, attained }, at) => ({
            value: [intensity, attained],
            at,
            label: { offset: [0, shifts(width)[at]] },
          })),
          {
            symbol: 'circle',
            symbolSize: 9,
            itemStyle: { color: ink.attained, opacity: 1 },
            label: {
              show: true,
              position: 'right',
              distance: 7,
              color: ink.ink,
              fontSize: 12,
              textBorderColor: ink.sheet,
              textBorderWidth: 2,
              formatter: ({ data }: { data: { at: number } }) => brief(points[data.at].name, 24),
            },
          },
        ),
      ],
    }),
  };
}

interface Api {
  coord(point: readonly number[]): number[];
}

/** The name of a ceiling along its line, ending a third of a decade before the highest roof. */
function alongSlope(api: Api, text: string, bytesPerS: number, top: number, below: boolean, fill: string) {
  const x = top / bytesPerS / (below ? 20 : 2);
  const [from, to] = [api.coord([x / 10, (x / 10) * bytesPerS]), api.coord([x, x * bytesPerS])];
  const angle = Math.atan2(from[1] - to[1], to[0] - from[0]);
  return {
    type: 'text',
    x: to[0],
    y: to[1],
    rotation: angle,
    style: { text, fill, fontSize: 11, align: 'right', verticalAlign: below ? 'top' : 'bottom', padding: [3, 0] },
  };
}

type Line = [number, number][];

function decade(value: number, direction: -1 | 1): number {
  const power = Math.log10(value);
  return 10 ** (direction < 0 ? Math.floor(power) : Math.ceil(power));
}

/** A ceiling of bandwidth as a line of slope one, from the edge of the plot up to the highest roof. */
function slopeLine(bytesPerS: number, minX: number, minY: number, top: number): Line {
  const x = Math.max(minX, minY / bytesPerS);
  return [
    [x, x * bytesPerS],
    [top / bytesPerS, top],
  ];
}

function ceiling(label: string, data: Line, ink: Ink, style: number, end: 'start' | 'end') {
  const type = (['solid', 'dashed', 'dotted'] as const)[style % 3];
  return {
    type: 'line',
    name: label,
    symbol: 'none',
    data: data.map((value) => ({ value })),
    lineStyle: { color: ink.soft, width: 1.5, type },
    ...(end === 'end'
      ? { endLabel: { show: true, formatter: label, color: ink.soft, fontSize: 12, align: 'right', offset: [-6, -9] } }
      : {}),
    emphasis: { disabled: true },
  };
}

function scatter(name: string, data: readonly object[], more: Record<string, unknown>) {
  return { type: 'scatter', name, data, z: 4, ...more };
}

function described({ name, intensity, attained, bound, by, estimate }: RooflinePoint): HTMLElement {
  return tip(name, [
    ['FLOP per moved byte', String(Number(intensity.toPrecision(3)))],
    ['attained', formatFlops(attained)],
    [`bound (${by})`, formatFlops(bound)],
    ['reached', formatPercent(attained / bound)],
    ...(estimate === null ? [] : [['estimated', formatFlops(estimate)] as const]),
  ]);
}

const MOST = 40;

/** How much of its bound each kernel reached, and where its estimate stood. */
export function reachedPlot({ roofline: { reached } }: PageData): Plot {
  const shown = reached.slice(0, MOST);
  const most = Math.max(1, ...shown.map(({ ratio, estimate }) => Math.max(ratio, Math.min(estimate ?? 0, 1.5))));
  return {
    height: () => 50 + 26 * shown.length,
    option: (ink, width) => ({
      ...base(ink),
      grid: { left: width < 640 ? 120 : 180, right: 24, top: 6, bottom: 30 },
      xAxis: axis(ink, {
        type: 'value',
        min: 0,
        max: Math.ceil(most * 10) / 10,
        axisLabel: { color: ink.soft, formatter: (v: number) => `${Math.round(100 * v)} %` },
      }),
      yAxis: axis(ink, {
        type: 'category',
        inverse: true,
        data: shown.map((_, k) => k),
        axisTick: { show: false },
        axisLabel: {
          color: ink.ink,
          interval: 0,
          formatter: (k: string) => brief(shown[Number(k)].name, width < 640 ? 16 : 25),
        },
      }),
      tooltip: {
        trigger: 'axis',
        axisPointer: { type: 'shadow' },
        ...tooltip(ink, (params: { dataIndex: number }[]) => {
          const { name, ratio, estimate } = shown[params[0].dataIndex];
          return tip(name, [
            ['reached of the bound', formatPercent(ratio)],
            ...(estimate === null ? [] : [['as estimated', formatPercent(estimate)] as const]),
          ]);
        }),
      },
      series: [
        {
          type: 'bar',
          name: 'reached',
          barCategoryGap: '34%',
          itemStyle: { color: ink.attained },
          emphasis: { disabled: true },
          data: shown.map(({ ratio }) => ratio),
          showBackground: true,
          backgroundStyle: { color: ink.room },
        },
        {
          type: 'scatter',
          name: 'estimate',
          symbol: 'triangle',
          symbolSize: 10,
          itemStyle: { color: ink.estimate },
          data: shown.flatMap(({ estimate }, k) => (estimate === null ? [] : [[estimate, k]])),
        },
      ],
    }),
  };
}
