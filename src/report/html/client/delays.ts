import { formatPercent, formatTime } from '../../../units.js';
import type { PageData } from '../page-data.js';
import { axis, base, type Plot, tip, tooltip } from './base.js';
import type { Hidden } from './legend.js';

/** Share of reads beyond a delay, both axes logarithmic: whole latency and each stage. */
export function delaysPlot({ delays: { fromPs, series } }: PageData, hidden: Hidden): Plot {
  const least = series[0].beyond.reduce((low, share) => (share > 0 && share < low ? share : low), 1);
  return {
    option: (ink, width) => ({
      ...base(ink),
      grid: { left: 74, right: 24, top: 14, bottom: 46 },
      xAxis: axis(ink, {
        type: 'log',
        min: Math.max(1, fromPs[0] || 1),
        max: fromPs[fromPs.length - 1],
        name: 'delay',
        nameLocation: 'middle',
        nameGap: 28,
        splitNumber: width < 640 ? 4 : 8,
        axisLabel: { color: ink.soft, hideOverlap: true, formatter: (ps: number) => formatTime(ps) },
      }),
      yAxis: axis(ink, {
        type: 'log',
        min: 10 ** Math.floor(Math.log10(least)),
        max: 1,
        axisLabel: { color: ink.soft, formatter: (share: number) => `${Number((100 * share).toPrecision(3))} %` },
      }),
      tooltip: {
        trigger: 'axis',
        axisPointer: { lineStyle: { color: ink.soft } },
        ...tooltip(ink, (params: { axisValue: number }[]) => {
          const ps = Number(params[0].axisValue);
          const i = Math.max(
            0,
            fromPs.findLastIndex((from) => from <= ps * 1.0001),
          );
          return tip(
            `longer than ${formatTime(fromPs[i])}`,
            series
              .filter(({ label }) => !hidden.has(label))
              .map(({ label, beyond }) => [label, formatPercent(beyond[i])] as const),
          );
        }),
      },
      series: series
        .map(({ label, beyond }, s) => ({
          type: 'line',
          name: label,
          symbol: 'none',
          lineStyle: { color: s === 0 ? ink.ink : ink.of(label.replaceAll(' ', '_')), width: s === 0 ? 2.5 : 1.75 },
          itemStyle: { color: s === 0 ? ink.ink : ink.of(label.replaceAll(' ', '_')) },
          emphasis: { disabled: true },
          // the first delay that nobody waited draws the line down to the edge
          data: beyond.flatMap((share, i) =>
            share > 0 || (beyond[i - 1] ?? 0) > 0 ? [[Math.max(fromPs[i], 1), share > 0 ? share : least / 1e3]] : [],
          ),
        }))
        .filter(({ name }) => !hidden.has(name)),
    }),
  };
}
