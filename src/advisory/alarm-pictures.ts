import type { Picture } from './charts/picture.ts';
import { trendChart } from './charts/trend-chart.ts';
import type { AlarmFacts, TroubleFacts } from './facts.ts';
import type { Block } from './letter.ts';
import { idText, placeText } from './wording.ts';

/** As wide as a letter is on paper; a phone shows it narrower. */
const size = { widthPx: 560, heightPx: 250 };
/** Pictures of one mail: it stays below 300 kB. */
export const mostPictures = 3;

/** The picture of an alarm's band, named after its place in the mail; null where there is none. */
export function alarmPicture(
  alarm: AlarmFacts | TroubleFacts,
  place: number,
): { readonly block: Block; readonly picture: Picture } | null {
  if (alarm.kind !== 'alarm' || alarm.chart == null || place >= mostPictures) return null;
  const name = `trend-${place + 1}`;
  const alt = `Trend of ${idText(alarm.band.id)}, ${placeText(alarm.machine, alarm.point)}; its figures stand above.`;
  return {
    block: { kind: 'picture', name, alt, size },
    picture: { name, option: trendChart(alarm.chart, size), size },
  };
}
