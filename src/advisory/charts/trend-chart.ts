import { inDisplayUnit, printNumber } from '../../config/print-value.ts';
import type { DisplayUnit } from '../../config/site.ts';
import { unitText } from '../level-words.ts';
import { axisStyle, type ChartSize, fontFamily, ink, textPx, textStyle } from './chart-style.ts';
import type { ChartOption } from './chart-svg.ts';
import { timeTicks } from './time-ticks.ts';

/** A band's levels over time, with everything that says how to read them. Levels SI r.m.s., times used time. */
export interface TrendChartFacts {
  readonly title: string;
  readonly timeZone: string;
  readonly display: DisplayUnit;
  readonly fromMs: number;
  readonly toMs: number;
  readonly levels: readonly TrendChartLevel[];
  readonly alert: number | null;
  readonly danger: number | null;
  /** Usual level, drawn dotted; null: none. */
  readonly baseline: number | null;
  /** Repairs, changed sensors, alarm events: a line across the chart with its words. No level line reaches across a break. */
  readonly marks: readonly TrendChartMark[];
  readonly projection: TrendChartProjection | null;
}

export interface TrendChartLevel {
  readonly usedMs: number;
  readonly level: number;
  /** Interval; null beyond the daily values, where `low` and `high` are the day's least and greatest. */
  readonly low: number | null;
  readonly high: number | null;
  /** plain: as usual; flagged: with a quality flag; late: came late. */
  readonly kind: 'plain' | 'flagged' | 'late';
}

export interface TrendChartMark {
  readonly atMs: number;
  readonly text: string;
  readonly breaks: boolean;
}

/** The level as it would go on; drawn dashed, within its interval, and never said to be more. */
export interface TrendChartProjection {
  readonly points: readonly {
    readonly atMs: number;
    readonly level: number;
    readonly low: number;
    readonly high: number;
  }[];
}

export function trendChart(facts: TrendChartFacts, size: ChartSize): ChartOption {
  const shown = (level: number) => inDisplayUnit(level, facts.display);
  const most = Math.max(3, Math.floor(size.widthPx / 90));
  const ticks = timeTicks(facts.fromMs, facts.toMs, facts.timeZone, most);
  const line = joined(facts).map((one) => (one === null ? ['-', '-'] : [one.usedMs, shown(one.level)]));
  const values = [
    ...facts.levels.map(({ high, level }) => shown(high ?? level)),
    ...[facts.alert, facts.danger].flatMap((limit) => (limit === null ? [] : [shown(limit)])),
  ];
  const top = niceTop(Math.max(0, ...values));
  return {
    textStyle: { fontFamily },
    backgroundColor: ink.paper,
    title: {
      text: facts.title,
      left: 8,
      top: 6,
      textStyle: {
        ...textStyle(size),
        fontSize: textPx(size) + 2,
        fontWeight: 'bold',
        width: size.widthPx - 16,
        overflow: 'break',
      },
    },
    grid: { left: 56, right: 14, top: 54, bottom: 36 },
    xAxis: {
      type: 'value',
      min: facts.fromMs,
      max: facts.toMs,
      ...axisStyle(size),
      axisTick: { show: true, customValues: ticks.atMs, lineStyle: { color: ink.text } },
      axisLabel: { ...textStyle(size), customValues: ticks.atMs, formatter: ticks.text, hideOverlap: true },
      splitLine: { show: false },
    },
    yAxis: {
      type: 'value',
      min: 0,
      max: top,
      name: unitText(facts.display),
      nameLocation: 'end',
      ...axisStyle(size),
      nameTextStyle: { ...textStyle(size, ink.soft), align: 'left', padding: [0, 0, 2, -44] },
      axisLabel: { ...textStyle(size), formatter: (value: number) => printNumber(value) },
    },
    graphic: keyOf(facts, size),
    series: [
      ...intervalSeries(facts, shown),
      {
        type: 'line',
        data: line,
        connectNulls: false,
        showSymbol: facts.levels.length <= 60,
        symbol: 'circle',
        symbolSize: 4,
        lineStyle: { color: ink.measured, width: 1.6 },
        itemStyle: { color: ink.measured },
        markLine: marksOf(facts, shown, size),
      },
      oddOnes(facts, shown, 'flagged', 'emptyTriangle'),
      oddOnes(facts, shown, 'late', 'emptyDiamond'),
      ...projectionSeries(facts, shown),
    ],
  };
}

/** What the odd symbols mean, where there are any. */
function keyOf({ levels }: TrendChartFacts, size: ChartSize) {
  const parts = [
    levels.some(({ kind }) => kind === 'flagged') ? '\u25b3 flagged' : '',
    levels.some(({ kind }) => kind === 'late') ? '\u25c7 came late' : '',
  ].filter((part) => part !== '');
  if (parts.length === 0) return [];
  const style = { text: parts.join('   '), fill: ink.soft, font: `${textPx(size)}px ${fontFamily}` };
  return [{ type: 'text', right: 14, top: 32, style }];
}

/** Levels in order, a gap at each break. */
function joined({ levels, marks }: TrendChartFacts): (TrendChartLevel | null)[] {
  const breaks = marks.filter((mark) => mark.breaks).map((mark) => mark.atMs);
  const out: (TrendChartLevel | null)[] = [];
  let before: TrendChartLevel | null = null;
  for (const level of levels) {
    const earlier: TrendChartLevel | null = before;
    if (earlier !== null && breaks.some((at) => at > earlier.usedMs && at <= level.usedMs)) out.push(null);
    out.push(level);
    before = level;
  }
  return out;
}

/** The interval as a band under the line: its lower edge, and its width stacked upon that. */
function intervalSeries(facts: TrendChartFacts, shown: (level: number) => number): ChartOption[] {
  const known = facts.levels.filter((one) => one.low !== null && one.high !== null);
  if (known.length < 2) return [];
  const edge = { type: 'line', stack: 'interval', symbol: 'none', lineStyle: { opacity: 0 }, silent: true };
  return [
    { ...edge, data: known.map(({ usedMs, low }) => [usedMs, shown(low ?? 0)]) },
    {
      ...edge,
      data: known.map(({ usedMs, low, high }) => [usedMs, shown(high ?? 0) - shown(low ?? 0)]),
      areaStyle: { color: ink.interval, opacity: 1 },
    },
  ];
}

function oddOnes(
  facts: TrendChartFacts,
  shown: (level: number) => number,
  kind: TrendChartLevel['kind'],
  symbol: string,
): ChartOption {
  return {
    type: 'scatter',
    symbol,
    symbolSize: 9,
    itemStyle: { color: ink.text },
    data: facts.levels.filter((one) => one.kind === kind).map(({ usedMs, level }) => [usedMs, shown(level)]),
  };
}

function marksOf(facts: TrendChartFacts, shown: (level: number) => number, size: ChartSize) {
  // Limits are named on the left, where levels are mostly far below and no projection runs; the usual level on the right.
  const label = (text: string, color: string) => ({
    show: true,
    formatter: text,
    position: color === ink.soft ? 'insideEndTop' : 'insideStartTop',
    ...textStyle(size, color),
  });
  const limit = (level: number | null, word: string, color: string, type: 'solid' | number[]) =>
    level === null
      ? []
      : [
          {
            yAxis: shown(level),
            lineStyle: { color, type, width: type === 'solid' ? 2 : 1.5 },
            label: label(`${word} ${printNumber(shown(level))}`, color),
          },
        ];
  return {
    silent: true,
    symbol: 'none',
    data: [
      ...limit(facts.alert, 'alert', ink.alert, [8, 4]),
      ...limit(facts.danger, 'danger', ink.danger, 'solid'),
      ...limit(facts.baseline, 'usual', ink.soft, [2, 3]),
      ...facts.marks.map(({ atMs, text }) => ({
        xAxis: atMs,
        lineStyle: { color: ink.note, type: [4, 2], width: 1 },
        label: {
          show: true,
          formatter: text,
          position: 'insideStartTop',
          rotate: 90,
          ...textStyle(size, ink.note),
        },
      })),
    ],
  };
}

function projectionSeries(facts: TrendChartFacts, shown: (level: number) => number): ChartOption[] {
  const points = facts.projection?.points ?? [];
  if (points.length < 2) return [];
  const side = (pick: (point: (typeof points)[number]) => number, width: number, type: number[]) => ({
    type: 'line',
    symbol: 'none',
    silent: true,
    data: points.map((point) => [point.atMs, shown(pick(point))]),
    lineStyle: { color: ink.measured, width, type },
  });
  return [
    side(({ level }) => level, 1.6, [6, 4]),
    side(({ low }) => low, 1, [1, 3]),
    side(({ high }) => high, 1, [1, 3]),
  ];
}

/** The next of 1, 1.5, 2, 3, 4, 5, 6, 8, 10 times a power of ten above 105 % of the value. */
export function niceTop(value: number): number {
  if (!(value > 0)) return 1;
  const size = 10 ** Math.floor(Math.log10(value * 1.05));
  const steps = [1, 1.5, 2, 3, 4, 5, 6, 8, 10];
  const step = steps.find((one) => one * size >= value * 1.05) ?? 10;
  return Number((step * size).toPrecision(6));
}
