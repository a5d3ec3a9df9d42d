import { type AlarmCharts, mostWithSpectrum, mostWithTrend } from '../advisory/alarm-pictures.ts';
import type { AlarmFacts } from '../advisory/facts.ts';
import type { Reader } from '../store/lent-connection.ts';
import { alarmChart } from './alarm-chart.ts';
import { alarmSpectrum } from './alarm-spectrum.ts';
import type { SiteView } from './site-view.ts';

/** What the pictures of an alarm are drawn from; `place`: how many alarms of its mail have theirs already. */
export async function alarmCharts(
  reader: Reader,
  view: SiteView,
  alarm: AlarmFacts,
  place: number,
): Promise<AlarmCharts> {
  return {
    trend: place < mostWithTrend ? await alarmChart(reader, view, alarm) : null,
    spectrum: place < mostWithSpectrum ? await alarmSpectrum(reader, view, alarm) : null,
  };
}
