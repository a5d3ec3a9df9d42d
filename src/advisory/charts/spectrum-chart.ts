import { inDisplayUnit, printFrequency, printNumber } from '../../config/print-value.ts';
import type { DisplayUnit } from '../../config/site.ts';
import { unitText } from '../level-words.ts';
import { axisStyle, type ChartSize, fontFamily, ink, textPx, textStyle } from './chart-style.ts';
import type { ChartOption } from './chart-svg.ts';
import { niceTop } from './trend-chart.ts';

/** A spectrum with what stands out of it. Densities in (SI unit)²/Hz, frequencies in Hz. */
export interface SpectrumChartFacts {
  readonly title: string;
  readonly display: DisplayUnit;
  readonly now: ChartedSpectrum;
  /** An earlier spectrum, drawn in grey behind; null: none. */
  readonly before: ChartedSpectrum | null;
  /** Shown up to here. */
  readonly toHz: number;
  /** Set where people count in orders: Hz of 1x. */
  readonly ordersOfHz: number | null;
  readonly scale: 'linear' | 'log';
  readonly peaks: readonly ChartedPeak[];
  /** Where a damaged part would show: a thin line at each multiple. */
  readonly families: readonly ChartedFamily[];
}

export interface ChartedSpectrum {
  readonly lineSpacingHz: number;
  readonly density: ArrayLike<number>;
}

export interface ChartedPeak {
  readonly frequencyHz: number;
  /** SI r.m.s. */
  readonly level: number;
  readonly name: string | null;
}

export interface ChartedFamily {
  readonly text: string;
  readonly hz: number;
  readonly multiples: number;
}

/** Room that a peak's word takes: of peaks within it the strongest is named. */
const wordPx = 70;

export function spectrumChart(facts: SpectrumChartFacts, size: ChartSize): ChartOption {
  const perUnit = facts.ordersOfHz ?? 1;
  const at = (hz: number) => hz / perUnit;
  const lines = linesOf(facts.now, facts, size);
  const earlier = facts.before === null ? [] : linesOf(facts.before, facts, size);
  const highest = Math.max(0, ...[...lines, ...earlier].map(([, level]) => level));
  const lowest = Math.min(...[...lines, ...earlier].map(([, level]) => level).filter((level) => level > 0));
  const isLog = facts.scale === 'log' && highest > 0;
  const width = { width: size.widthPx - 16, overflow: 'break' };
  return {
    textStyle: { fontFamily },
    backgroundColor: ink.paper,
    title: {
      text: facts.title,
      left: 8,
      top: 6,
      textStyle: { ...textStyle(size), fontSize: textPx(size) + 2, fontWeight: 'bold', ...width },
    },
    grid: { left: 60, right: 24, top: 54, bottom: 40 },
    xAxis: {
      type: 'value',
      min: 0,
      max: at(facts.toHz),
      name: facts.ordersOfHz === null ? 'Hz' : `orders of ${printFrequency(perUnit)}`,
      nameLocation: 'middle',
      nameGap: 24,
      ...axisStyle(size),
      splitLine: { show: false },
      axisLabel: {
        ...textStyle(size),
        hideOverlap: true,
        formatter: (value: number) => printNumber(value, 5),
      },
    },
    yAxis: {
      type: isLog ? 'log' : 'value',
      ...(isLog
        ? {
            min: 10 ** Math.floor(Math.log10(Math.max(lowest, highest / 1e6))),
            max: 10 ** Math.ceil(Math.log10(highest * 1.2)),
          }
        : { min: 0, max: niceTop(highest * 1.08) }),
      name: `${unitText(facts.display)} a line of ${printFrequency(facts.now.lineSpacingHz)}`,
      nameLocation: 'end',
      ...axisStyle(size),
      nameTextStyle: { ...textStyle(size, ink.soft), align: 'left', padding: [0, 0, 2, -48] },
      axisLabel: { ...textStyle(size), formatter: (value: number) => printNumber(value) },
    },
    series: [
      ...(earlier.length === 0 ? [] : [curve(earlier, ink.before, 1)]),
      {
        ...curve(lines, ink.measured, 1.2),
        markPoint: namesOf(facts, at, size),
        markLine: familyLines(facts, at, size),
      },
    ],
  };
}

function curve(data: readonly (readonly [number, number])[], color: string, width: number): ChartOption {
  return {
    type: 'line',
    data,
    symbol: 'none',
    silent: true,
    lineStyle: { color, width },
    z: color === ink.before ? 1 : 2,
  };
}

/** r.m.s. of each line in the display unit; where several share a dot of the picture, the greatest of them. */
function linesOf(
  { density, lineSpacingHz }: ChartedSpectrum,
  { display, toHz, ordersOfHz }: SpectrumChartFacts,
  { widthPx }: ChartSize,
): [number, number][] {
  const last = Math.min(density.length - 1, Math.floor(toHz / lineSpacingHz));
  const each = Math.max(1, Math.ceil(last / (1.5 * widthPx)));
  const points: [number, number][] = [];
  for (let from = 1; from <= last; from += each) {
    let best = from;
    for (let line = from; line < Math.min(from + each, last + 1); line++) {
      if (density[line] > density[best]) best = line;
    }
    const level = inDisplayUnit(Math.sqrt(density[best] * lineSpacingHz), display);
    points.push([(best * lineSpacingHz) / (ordersOfHz ?? 1), level]);
  }
  return points;
}

function namesOf(facts: SpectrumChartFacts, at: (hz: number) => number, size: ChartSize) {
  const shown = facts.peaks.filter(({ frequencyHz }) => frequencyHz <= facts.toHz);
  const apartHz = (wordPx / size.widthPx) * facts.toHz;
  const strongest: ChartedPeak[] = [];
  for (const peak of [...shown].sort((a, b) => b.level - a.level)) {
    if (strongest.every((one) => Math.abs(one.frequencyHz - peak.frequencyHz) >= apartHz))
      strongest.push(peak);
  }
  return {
    symbol: 'circle',
    symbolSize: 4,
    itemStyle: { color: ink.text },
    data: strongest.map(({ frequencyHz, level, name }) => ({
      coord: [at(frequencyHz), lineLevel(facts, frequencyHz, level)],
      label: {
        show: true,
        position: 'top',
        formatter:
          name ??
          (facts.ordersOfHz === null ? printFrequency(frequencyHz) : `${printNumber(at(frequencyHz))}x`),
        ...textStyle(size),
      },
    })),
  };
}

/** A tone stands as high as its highest line, not as high as its level: the window spreads it over several. */
function lineLevel({ now, display }: SpectrumChartFacts, frequencyHz: number, level: number): number {
  const middle = Math.round(frequencyHz / now.lineSpacingHz);
  let highest = 0;
  for (let line = Math.max(0, middle - 1); line <= Math.min(now.density.length - 1, middle + 1); line++)
    highest = Math.max(highest, now.density[line]);
  const rms = highest > 0 ? Math.sqrt(highest * now.lineSpacingHz) : level;
  return inDisplayUnit(rms, display);
}

function familyLines(facts: SpectrumChartFacts, at: (hz: number) => number, size: ChartSize) {
  const kinds = [
    [2, 3],
    [6, 3],
    [1, 4],
  ];
  return {
    silent: true,
    symbol: 'none',
    data: facts.families.flatMap(({ text, hz, multiples }, n) =>
      Array.from({ length: multiples }, (_, k) => (k + 1) * hz)
        .filter((frequency) => frequency <= facts.toHz)
        .map((frequency, k, all) => ({
          xAxis: at(frequency),
          lineStyle: { color: ink.alert, type: kinds[n % kinds.length], width: 1 },
          label: {
            // The last multiple has fewer peaks around it to be written over.
            show: k === all.length - 1,
            formatter: text,
            position: 'insideEndTop',
            rotate: 90,
            ...textStyle(size, ink.alert),
          },
        })),
    ),
  };
}
