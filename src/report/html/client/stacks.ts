import { formatPercent } from '../../../units.js';
import type { PageData } from '../page-data.js';
import { axis, base, brief, type Plot, tip, tooltip } from './base.js';
import type { Hidden } from './legend.js';

/** The bandwidth stack of every kernel, a bar each. */
export function stacksPlot({ kernelStacks: { names, shares }, classes }: PageData, hidden: Hidden): Plot {
  return {
    height: () => 50 + 28 * names.length,
    option: (ink, width) => ({
      ...base(ink),
      grid: { left: width < 640 ? 120 : 180, right: 24, top: 6, bottom: 30 },
      xAxis: axis(ink, {
        type: 'value',
        max: 1,
        axisLabel: { color: ink.soft, formatter: (v: number) => `${Math.round(100 * v)} %` },
      }),
      yAxis: axis(ink, {
        type: 'category',
        inverse: true,
        data: names.map((_, k) => k),
        axisTick: { show: false },
        axisLabel: {
          color: ink.ink,
          interval: 0,
          formatter: (k: string) => brief(names[Number(k)], width < 640 ? 16 : 25),
        },
      }),
      tooltip: {
        trigger: 'axis',
        axisPointer: { type: 'shadow' },
        ...tooltip(ink, (params: { dataIndex: number }[]) => {
          const k = params[0].dataIndex;
          const rows = classes.map(({ label }, c) => [label, shares[k][c]] as const).filter(([, share]) => share > 0);
          return tip(
            names[k],
            rows.map(([label, share]) => [label, formatPercent(share)]),
          );
        }),
      },
      series: classes
        .map(({ key, label }, c) => ({
          type: 'bar',
          name: label,
          stack: 'clocks',
          barCategoryGap: '26%',
          itemStyle: { color: ink.of(key), borderColor: ink.sheet, borderWidth: 0.5 },
          emphasis: { disabled: true },
          data: shares.map((row) => row[c]),
          key,
        }))
        .filter(({ key }) => !hidden.has(key)),
    }),
  };
}
