import { formatBandwidth, formatPercent, formatTime } from '../../../units.js';
import type { PageData } from '../page-data.js';
import { axis, base, brief, type Plot, tip, tooltip } from './base.js';
import type { Hidden } from './legend.js';

const LANE = 24; // px
const LEFT = 78;

interface Api {
  value(dimension: number): number;
  coord(point: readonly number[]): number[];
}
interface Params {
  readonly coordSys: { readonly x: number; readonly width: number };
  readonly dataIndex: number;
}

/** Kernels as spans, bandwidth, and the bandwidth stack: three charts on one time axis. */
export function timePlot({ time, classes }: PageData, hidden: Hidden): Plot {
  const lanes = time.lanes.reduce((most, lane) => Math.max(most, lane + 1), 1);
  const laneHeight = lanes * Math.min(LANE, Math.max(4, 160 / lanes));
  const bandwidthTop = laneHeight + 34;
  const stackTop = bandwidthTop + 230;
  const points = (values: readonly number[], slice: number): number[][] => {
    const out = values.map((value, i) => [i * slice, value]);
    if (values.length > 0) out.push([Math.min(time.endPs, values.length * slice), values[values.length - 1]]);
    return out;
  };
  const at = (ps: number, slice: number): number => Math.floor(ps / slice);
  return {
    height: () => stackTop + 230,
    option: (ink, width) => {
      const right = width < 640 ? 14 : 24;
      const time0 = (gridIndex: number, label: boolean): Record<string, unknown> =>
        axis(ink, {
          type: 'value',
          gridIndex,
          min: 0,
          max: time.endPs,
          splitNumber: width < 640 ? 4 : 8,
          axisLabel: { show: label, color: ink.soft, hideOverlap: true, formatter: (ps: number) => formatTime(ps) },
          axisTick: { show: label },
          splitLine: { show: false },
          axisPointer: { label: { show: false } },
        });
      const area = (name: string, color: string, gridAxis: number, data: number[][], stack: string) => ({
        type: 'line',
        name,
        stack,
        xAxisIndex: gridAxis,
        yAxisIndex: gridAxis,
        step: 'end',
        symbol: 'none',
        lineStyle: { width: 0 },
        areaStyle: { color, opacity: 1 },
        emphasis: { disabled: true },
        data,
      });
      return {
        ...base(ink),
        axisPointer: { link: [{ xAxisIndex: 'all' }], lineStyle: { color: ink.soft } },
        dataZoom: [
          {
            type: 'inside',
            xAxisIndex: [0, 1, 2],
            filterMode: 'none',
            zoomOnMouseWheel: 'ctrl',
            moveOnMouseWheel: false,
          },
        ],
        grid: [
          { left: LEFT, right, top: 8, height: laneHeight },
          { left: LEFT, right, top: bandwidthTop, height: 180 },
          { left: LEFT, right, top: stackTop, height: 180 },
        ],
        xAxis: [time0(0, false), time0(1, false), time0(2, true)],
        yAxis: [
          axis(ink, { type: 'value', gridIndex: 0, min: 0, max: lanes, inverse: true, show: false }),
          axis(ink, {
            type: 'value',
            gridIndex: 1,
            name: 'bandwidth',
            nameLocation: 'end',
            nameTextStyle: { color: ink.soft, align: 'left', padding: [0, 0, 0, -LEFT + 10] },
            splitNumber: 4,
            axisLabel: { color: ink.soft, formatter: (v: number) => formatBandwidth(v) },
          }),
          axis(ink, {
            type: 'value',
            gridIndex: 2,
            name: 'bandwidth stack',
            nameTextStyle: { color: ink.soft, align: 'left', padding: [0, 0, 0, -LEFT + 10] },
            min: 0,
            max: 1,
            interval: 0.25,
            axisLabel: { color: ink.soft, formatter: (v: number) => `${Math.round(100 * v)} %` },
          }),
        ],
        tooltip: {
          trigger: 'axis',
          ...tooltip(ink, (params: { axisValue: number }[]) => {
            const ps = Number(params[0].axisValue);
            const [i, j] = [at(ps, time.slicePs), at(ps, time.stackSlicePs)];
            const running = time.kernels.filter(({ startPs, endPs }) => startPs <= ps && ps < endPs);
            return tip(formatTime(ps), [
              ...running.slice(0, 4).map(({ name }) => ['kernel', brief(name, 28)] as const),
              ['read', formatBandwidth(time.read[i] ?? 0)],
              ['write', formatBandwidth(time.write[i] ?? 0)],
              ...classes
                .map(({ label }, c) => [label, time.shares[c][j] ?? 0] as const)
                .filter(([, share]) => share >= 0.005)
                .map(([label, share]) => [label, formatPercent(share)] as const),
            ]);
          }),
        },
        series: [
          {
            type: 'custom',
            name: 'kernels',
            xAxisIndex: 0,
            yAxisIndex: 0,
            clip: true,
            encode: { x: [0, 1], y: 2 },
            data: time.kernels.map(({ startPs, endPs }, k) => [startPs, endPs, time.lanes[k]]),
            renderItem: (params: Params, api: Api) =>
              span(params, api, time.kernels[params.dataIndex].name, laneHeight / lanes, ink),
          },
          area('read', ink.of('read_data'), 1, points(time.read, time.slicePs), 'rate'),
          area('write', ink.of('write_data'), 1, points(time.write, time.slicePs), 'rate'),
          {
            type: 'line',
            name: 'bound',
            xAxisIndex: 1,
            yAxisIndex: 1,
            symbol: 'none',
            lineStyle: { color: ink.ink, width: 1.5, type: 'dashed' },
            data: [
              [0, time.bound],
              [time.endPs, time.bound],
            ],
            endLabel: {
              show: true,
              formatter: 'bound',
              color: ink.ink,
              align: 'right',
              offset: [-4, 0],
              backgroundColor: ink.sheet,
              padding: [1, 4],
            },
          },
          ...classes
            .map(({ key, label }, c) => ({
              key,
              ...area(label, ink.of(key), 2, points(time.shares[c], time.stackSlicePs), 'clocks'),
            }))
            .filter(({ key }) => !hidden.has(key)),
        ],
      };
    },
  };
}

/** A kernel's span with its name, cut to what is in view. */
function span(params: Params, api: Api, name: string, height: number, ink: { accent: string; sheet: string }) {
  const [start, top] = api.coord([api.value(0), api.value(2)]);
  const [end] = api.coord([api.value(1), api.value(2)]);
  const left = Math.max(start, params.coordSys.x);
  const right = Math.min(end, params.coordSys.x + params.coordSys.width);
  if (right <= left) return null;
  const width = Math.max(1, right - left);
  const letters = Math.floor((width - 8) / 6.6);
  return {
    type: 'rect',
    shape: { x: left, y: top + 1, width, height: Math.max(2, height - 3), r: 2 },
    style: { fill: ink.accent, stroke: ink.sheet, lineWidth: 1 },
    textContent:
      letters >= 3 && height >= 14
        ? { style: { text: brief(name, letters), fill: ink.sheet, fontSize: 11 } }
        : undefined,
    textConfig: { position: 'insideLeft', distance: 5 },
  };
}
