import { mostMedianOverlapPercent } from '../signal/median-average.ts';
import type { AnalysisLayers } from './build-settings.ts';
import { type Build, innermost, valueOr } from './layers.ts';
import { poolSizeOf, segmentOf } from './meaning.ts';
import { printDuration } from './print-value.ts';
import type { AnalysisSettings, RecordingSettings } from './site.ts';

/** Averages over longer segments would be kept in the ledger by the megabyte; recordings as long need no pooling. */
const longestPooledSamples = 2 ** 17;
const mostPooled = 1000;

type Averaging = Pick<AnalysisSettings, 'detrend' | 'averaging' | 'averageOver'>;

/** What is left at its default stays away, so that settings which say nothing new are the same as before. */
export function buildAveraging(layers: AnalysisLayers): Averaging {
  const averaging = valueOr(innermost(layers, 'averaging'), 'power');
  const detrend = valueOr(innermost(layers, 'detrend'), 'mean');
  const averageOver = valueOr(innermost(layers, 'average_over'), null);
  return {
    ...(averaging === 'power' ? {} : { averaging }),
    ...(detrend === 'mean' ? {} : { detrend }),
    ...(averageOver === null ? {} : { averageOver }),
  };
}

/** Tells what cannot be: a median of overlapping segments, a pool of nothing, averages that exclude each other. */
export function tellOfAveraging(
  { reading }: Build,
  layers: AnalysisLayers,
  analysis: AnalysisSettings,
  recordings: Pick<RecordingSettings, 'sampleRateHz' | 'expectedEveryMs'>,
  shown: string,
): void {
  const averaging = innermost(layers, 'averaging');
  const pool = innermost(layers, 'average_over');
  if (analysis.averaging === 'median' && analysis.overlapPercent > mostMedianOverlapPercent) {
    const overlap = innermost(layers, 'overlap');
    const what = `averaging: median is right for segments that overlap by at most ${mostMedianOverlapPercent} %, those of ${shown} overlap by ${analysis.overlapPercent} %`;
    const at = overlap?.at ?? averaging?.at;
    if (at !== undefined)
      reading.problem(at, what, reading.write(at, `${mostMedianOverlapPercent} %`), 'median');
  }
  if (pool === null || analysis.averageOver === undefined) return;
  if (averaging !== null && analysis.averaging !== undefined) {
    const what = `averaging: ${analysis.averaging} looks at the segments of one recording, average_over pools recordings`;
    reading.problem(averaging.at, what, 'keep one of the two', 'median and pool');
  }
  const { sampleRateHz, expectedEveryMs } = recordings;
  const size = poolSizeOf(analysis, expectedEveryMs);
  if ('ms' in analysis.averageOver && (size < 2 || size > mostPooled)) {
    const every = `a recording of ${shown} comes every ${printDuration(expectedEveryMs)}`;
    const what =
      size < 2
        ? `average_over holds fewer than 2 recordings: ${every}`
        : `average_over holds more than ${mostPooled} recordings: ${every}`;
    const right = reading.write(pool.at, printDuration((size < 2 ? 2 : mostPooled) * expectedEveryMs));
    reading.problem(pool.at, what, `${right}, or give a number of recordings`, 'pool size');
  }
  if (sampleRateHz === null) {
    const what = `average_over needs sample_rate, so that the recordings of ${shown} lie on the same lines`;
    reading.problem(pool.at, what, 'add under recordings: sample_rate: 25.6 kHz', 'pool without rate');
    return;
  }
  if (segmentOf(analysis, sampleRateHz) <= longestPooledSamples) return;
  const what = `average_over pools segments of at most ${longestPooledSamples} samples, ${shown} has segments of ${segmentOf(analysis, sampleRateHz)}`;
  const right = 'leave average_over out: pooling adds averages, never resolution; or widen line_spacing';
  reading.problem(pool.at, what, right, 'pool of long segments');
}
