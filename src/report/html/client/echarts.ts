/** The parts of ECharts that the page uses; what is not named here is not in the bundle. */
import { BarChart, CustomChart, LineChart, ScatterChart } from 'echarts/charts';
import {
  DataZoomInsideComponent,
  GridComponent,
  TooltipComponent,
  VisualMapContinuousComponent,
} from 'echarts/components';
import { init, use } from 'echarts/core';
import { LabelLayout } from 'echarts/features';
import { CanvasRenderer } from 'echarts/renderers';

use([
  BarChart,
  CustomChart,
  LineChart,
  ScatterChart,
  DataZoomInsideComponent,
  GridComponent,
  TooltipComponent,
  VisualMapContinuousComponent,
  LabelLayout,
  CanvasRenderer,
]);

export { init };
export type Chart = ReturnType<typeof init>;
export type Option = Parameters<Chart['setOption']>[0];
