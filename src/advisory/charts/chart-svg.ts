import { BarChart, CustomChart, HeatmapChart, LineChart, ScatterChart } from 'echarts/charts';
import {
  GraphicComponent,
  GridComponent,
  LegendComponent,
  MarkAreaComponent,
  MarkLineComponent,
  MarkPointComponent,
  TitleComponent,
  VisualMapComponent,
} from 'echarts/components';
import type { EChartsCoreOption } from 'echarts/core';
import * as echarts from 'echarts/core';
import { SVGRenderer } from 'echarts/renderers';
import type { ChartSize } from './chart-style.ts';

echarts.use([
  BarChart,
  CustomChart,
  HeatmapChart,
  LineChart,
  ScatterChart,
  GraphicComponent,
  GridComponent,
  LegendComponent,
  MarkAreaComponent,
  MarkLineComponent,
  MarkPointComponent,
  TitleComponent,
  VisualMapComponent,
  SVGRenderer,
]);

export type ChartOption = EChartsCoreOption;

/** A chart as SVG text, drawn without a browser. The same option and size give the same text. */
export function chartSvg(option: ChartOption, { widthPx, heightPx }: ChartSize): string {
  const chart = echarts.init(null, null, { renderer: 'svg', ssr: true, width: widthPx, height: heightPx });
  try {
    chart.setOption({ animation: false, ...option });
    return chart.renderToSVGString();
  } finally {
    chart.dispose();
  }
}
