import { LineChart, ScatterChart } from 'echarts/charts';
import {
  GraphicComponent,
  GridComponent,
  MarkLineComponent,
  MarkPointComponent,
  TitleComponent,
} from 'echarts/components';
import type { EChartsCoreOption } from 'echarts/core';
import * as echarts from 'echarts/core';
import { SVGRenderer } from 'echarts/renderers';
import type { ChartSize } from './chart-style.ts';

echarts.use([
  LineChart,
  ScatterChart,
  GraphicComponent,
  GridComponent,
  MarkLineComponent,
  MarkPointComponent,
  TitleComponent,
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
