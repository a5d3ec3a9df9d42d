import type { Picture } from './charts/picture.ts';
import { type SpectrumChartFacts, spectrumChart } from './charts/spectrum-chart.ts';
import { type TrendChartFacts, trendChart } from './charts/trend-chart.ts';
import type { AlarmFacts, TroubleFacts } from './facts.ts';
import type { Block } from './letter.ts';
import { idText, placeText } from './wording.ts';

/** What the pictures of an alarm are drawn from; null where there is too little for one. */
export interface AlarmCharts {
  readonly trend: TrendChartFacts | null;
  readonly spectrum: SpectrumChartFacts | null;
}

/** As wide as a letter is on paper; a phone shows it narrower. */
const size = { widthPx: 560, heightPx: 250 };
/** Alarms of one mail that get pictures, and those that get their lines too: it stays below 300 kB. */
export const mostWithTrend = 3;
export const mostWithSpectrum = 1;

/** The pictures of an alarm's band, named after its place in the mail, each with the block that shows it. */
export function alarmPictures(
  item: AlarmFacts | TroubleFacts,
  place: number,
): readonly { readonly block: Block; readonly picture: Picture }[] {
  if (item.kind !== 'alarm' || item.charts === undefined) return [];
  const { trend, spectrum } = item.charts;
  const of = `${idText(item.band.id)}, ${placeText(item.machine, item.point)}; its figures stand above.`;
  const pictures: { block: Block; picture: Picture }[] = [];
  const add = (name: string, alt: string, option: Picture['option']) =>
    pictures.push({ block: { kind: 'picture', name, alt, size }, picture: { name, option, size } });
  if (trend !== null && place < mostWithTrend)
    add(`trend-${place + 1}`, `Trend of ${of}`, trendChart(trend, size));
  if (spectrum !== null && place < mostWithSpectrum)
    add(`spectrum-${place + 1}`, `Spectrum of ${of}`, spectrumChart(spectrum, size));
  return pictures;
}
