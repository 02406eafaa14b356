import { formatBytes, formatCount } from '../../../units.js';
import type { PageData } from '../page-data.js';
import { axis, base, type Plot, tip, tooltip } from './base.js';

/** Every bank as a cell: pseudo-channels from top to bottom, banks from left to right. */
export function banksPlot({ banks: { rows, columns, metrics } }: PageData, metric: () => string): Plot {
  return {
    height: () => Math.max(220, Math.min(900, 84 + 3 * rows.length)),
    option: (ink) => {
      const { key, label, values } = metrics.find(({ key }) => key === metric()) ?? metrics[0];
      const show = key === 'bytes' ? formatBytes : formatCount;
      // a few banks far above the rest must not leave the rest one colour: from three times the mean on all have the last one
      const used = values.filter((value) => value > 0);
      const most = used.reduce((high, value) => Math.max(high, value), 0);
      const mean = used.reduce((sum, value) => sum + value, 0) / Math.max(1, used.length);
      const top = Math.min(most, Number((3 * mean).toPrecision(2)));
      const stackOf = (row: string): string => row.split('.')[0];
      return {
        ...base(ink),
        grid: { left: 74, right: 116, top: 6, bottom: 40 },
        xAxis: axis(ink, {
          type: 'category',
          data: [...columns],
          name: 'bank',
          nameLocation: 'middle',
          nameGap: 26,
          splitLine: { show: false },
          axisTick: { show: false },
        }),
        yAxis: axis(ink, {
          type: 'category',
          inverse: true,
          data: [...rows],
          splitLine: { show: false },
          axisTick: { show: false },
          axisLabel: {
            color: ink.soft,
            interval: (i: number) => i === 0 || stackOf(rows[i]) !== stackOf(rows[i - 1]),
            formatter: (row: string) => `stack ${stackOf(row)}`,
          },
        }),
        visualMap: {
          dimension: 2,
          type: 'continuous',
          min: 0,
          max: Math.max(1, top),
          calculable: false,
          right: 4,
          top: 'middle',
          itemHeight: 140,
          itemWidth: 12,
          formatter: (value: number) => show(value),
          text: [top < most ? `over ${show(top)}` : show(top), '0'],
          textStyle: { color: ink.soft },
          outOfRange: { color: [ink.heat[3]] },
          inRange: { color: [...ink.heat] },
        },
        tooltip: {
          ...tooltip(ink, (params: { value: number[] }) => {
            const [bank, row, value] = params.value;
            const [stack, channel, pseudo] = rows[row].split('.');
            return tip(`stack ${stack}, channel ${channel}, pseudo-channel ${pseudo}, bank ${columns[bank]}`, [
              [label, show(value)],
            ]);
          }),
        },
        // cells of a custom series are painted in one go, so that a page sent to the printer has them all
        series: [
          {
            type: 'custom',
            name: label,
            progressive: 0,
            encode: { x: 0, y: 1 },
            data: values.map((value, i) => [i % columns.length, Math.floor(i / columns.length), value]),
            renderItem: (_: unknown, api: Api) => cell(api, ink.ink),
          },
        ],
      };
    },
  };
}

interface Api {
  value(dimension: number): number;
  coord(point: readonly number[]): number[];
  size(of: readonly number[]): number[];
  visual(what: 'color'): string;
}

/** A bank's cell; its edges are those of its neighbours, in whole pixels. */
function cell(api: Api, outline: string) {
  const [x, y] = api.coord([api.value(0), api.value(1)]);
  const [width, height] = api.size([1, 1]);
  // a hair over the half, so that both cells at an edge round it alike
  const edge = (at: number): number => Math.round(at + 1e-6);
  const [left, top] = [edge(x - width / 2), edge(y - height / 2)];
  return {
    type: 'rect',
    shape: { x: left, y: top, width: edge(x + width / 2) - left, height: edge(y + height / 2) - top },
    style: { fill: api.visual('color') },
    emphasis: { style: { stroke: outline, lineWidth: 1 } },
  };
}
