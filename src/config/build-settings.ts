import { finerSpacing } from './bands.ts';
import { buildAveraging } from './build-averaging.ts';
import { type Build, innermost, type Layers, valueOr } from './layers.ts';
import { averagingMeaning, longestSegmentSamples, segmentSamplesFor, usualLineSpacingHz } from './meaning.ts';
import { printNumber, printSeconds } from './print-value.ts';
import type { analysisKeys, recordingKeys } from './schema-recordings.ts';
import type { AnalysisSettings, RecordingSettings } from './site.ts';
import type { Span } from './site-text.ts';

export type RecordingLayers = Layers<typeof recordingKeys>;
export type AnalysisLayers = Layers<typeof analysisKeys>;

const hour = 3_600_000;

/** Recording settings of a point. `at` is where a missing file pattern is told. */
export function buildRecordings(
  build: Build,
  layers: RecordingLayers,
  at: Span,
  shown: string,
): RecordingSettings {
  const { files, filesRegex } = filePatterns(build, layers, at, shown);
  const every = innermost(layers, 'expected_every');
  const expectedEveryMs = valueOr(every, hour);
  if (every === null) {
    const text = `nothing says expected_every of ${shown}; 1 h is assumed, so it is overdue after 2 h`;
    build.reading.warn({ from: 0, to: 0 }, text, 'expected_every');
  }
  const overdue = innermost(layers, 'overdue_after');
  if (overdue !== null && overdue.value <= expectedEveryMs) {
    const what = `overdue_after is not above expected_every, so ${shown} would be overdue before each recording`;
    build.reading.problem(overdue.at, what, 'leave it out: twice expected_every holds then', 'overdue');
  }
  const rate = innermost(layers, 'sample_rate');
  const duration = innermost(layers, 'duration');
  if (duration !== null && duration.value > expectedEveryMs) {
    const what = 'duration is above expected_every: a recording would not end before the next is due';
    build.reading.problem(duration.at, what, 'compare the two', 'duration');
  }
  return {
    files,
    filesRegex,
    startInName: valueOr(innermost(layers, 'start_in_name'), null),
    clock: valueOr(innermost(layers, 'clock'), { kind: 'utc' }),
    ignore: valueOr(innermost(layers, 'ignore'), ['<any>.tmp', '<any>.part']),
    sampleRateHz: valueOr(rate, null),
    durationS: duration === null ? null : duration.value / 1000,
    expectedEveryMs,
    overdueAfterMs: valueOr(overdue, 2 * expectedEveryMs),
    settleMs: valueOr(innermost(layers, 'settle'), 5000),
    sidecar: valueOr(innermost(layers, 'sidecar'), 'optional'),
    layout: {
      dataset: valueOr(innermost(layers, 'dataset'), null),
      sampleRateAttribute: valueOr(innermost(layers, 'sample_rate_attribute'), null),
      channelsIn: valueOr(innermost(layers, 'channels_in'), null),
    },
  };
}

/** `files` or `files_regex` of the innermost layer that has either. */
function filePatterns(
  { reading }: Build,
  layers: RecordingLayers,
  at: Span,
  shown: string,
): { readonly files: string | null; readonly filesRegex: string | null } {
  const layer = layers.findLast(
    (one) => one !== null && (one.has.has('files') || one.has.has('files_regex')),
  );
  if (layer === null || layer === undefined) {
    reading.problem(
      at,
      `no recording can reach ${shown}: it has no file pattern`,
      'write under recordings: files: <machine>_<any>.wav',
    );
    return { files: null, filesRegex: null };
  }
  const { files, files_regex: regex } = layer.keys;
  if (files !== null && regex !== null) {
    reading.problem(regex.at, 'files and files_regex stand side by side', 'keep one of the two');
  }
  return { files: valueOr(files, null), filesRegex: valueOr(regex, null) };
}

/** Analysis settings of a point; the line spacing is asked of the duration, where both are known. */
export function buildAnalysis(
  build: Build,
  layers: AnalysisLayers,
  { sampleRateHz, durationS }: Pick<RecordingSettings, 'sampleRateHz' | 'durationS'>,
  runningSpeedHz: number | null,
  { at, shown }: { readonly at: Span; readonly shown: string },
): AnalysisSettings {
  const asked = innermost(layers, 'line_spacing');
  const skip = innermost(layers, 'skip_start');
  const settings: AnalysisSettings = {
    window: valueOr(innermost(layers, 'window'), 'hann'),
    overlapPercent: valueOr(innermost(layers, 'overlap'), 50),
    lineSpacingHz: valueOr(asked, usualLineSpacingHz(runningSpeedHz)),
    segmentSamples: null,
    skipStartS: valueOr(skip, 0) / 1000,
    confidencePercent: valueOr(innermost(layers, 'confidence'), 95),
    falsePeaksPerSpectrum: valueOr(innermost(layers, 'false_peaks'), 0.1),
    ...buildAveraging(layers),
  };
  if (durationS !== null && settings.skipStartS >= durationS) {
    const what = `skip_start leaves nothing of the recordings of ${shown} (${printSeconds(durationS)})`;
    build.reading.problem(skip?.at ?? at, what, 'skip less', 'skip');
    return settings;
  }
  if (sampleRateHz === null) return settings;
  const segment = segmentSamplesFor(sampleRateHz, settings.lineSpacingHz);
  const samples =
    durationS === null
      ? longestSegmentSamples
      : Math.floor((durationS - settings.skipStartS) * sampleRateHz + 1e-6);
  const longest = Math.min(samples, longestSegmentSamples);
  if (segment <= longest) return settings;
  const widest = longest < 2 ? sampleRateHz / 2 : sampleRateHz / 2 ** Math.floor(Math.log2(longest));
  if (asked === null) {
    const text = `recordings of ${shown} are too short for the usual line spacing of ${settings.lineSpacingHz} Hz; ${printNumber(widest, 4)} Hz is used`;
    build.reading.warn(at, text);
    return { ...settings, lineSpacingHz: widest };
  }
  const pooled = settings.averageOver !== undefined;
  tellTooFine(build, { asked, segment, longest, widest, sampleRateHz, shown, pooled });
  return settings;
}

function tellTooFine(
  { reading }: Build,
  facts: {
    readonly asked: { readonly value: number; readonly at: Span };
    readonly segment: number;
    readonly longest: number;
    readonly widest: number;
    readonly sampleRateHz: number;
    readonly shown: string;
    readonly pooled: boolean;
  },
): void {
  const { asked, segment, longest, widest, sampleRateHz, shown, pooled } = facts;
  const needs = `needs segments of ${segment} samples (${printSeconds(segment / sampleRateHz)})`;
  const has =
    longest === longestSegmentSamples
      ? `at most ${longest} samples are possible`
      : `a recording of ${shown} has ${longest}`;
  const finest = `${Number((Math.ceil(widest * 1000) / 1000).toPrecision(6))} Hz`;
  const right = reading.write(asked.at, finest);
  const never = pooled ? '; average_over adds averages, never resolution' : '';
  reading.problem(
    asked.at,
    `line_spacing ${needs}, ${has}${never}`,
    `${right}, or record for longer`,
    'too fine',
  );
}

/** What is allowed but seldom meant: much overlap, no window, too few turns of the shaft in a segment. */
export function warnOfAnalysis(
  { reading }: Build,
  layers: AnalysisLayers,
  analysis: AnalysisSettings,
  facts: {
    readonly sampleRateHz: number | null;
    readonly runningSpeedHz: number | null;
    readonly durationS: number | null;
    readonly at: Span;
    readonly shown: string;
  },
): void {
  const { sampleRateHz, runningSpeedHz, durationS, at, shown } = facts;
  const overlap = innermost(layers, 'overlap');
  if (overlap !== null && overlap.value > 75) {
    const known = sampleRateHz !== null && durationS !== null;
    const meaning = known ? averagingMeaning(analysis, sampleRateHz, durationS) : null;
    const worth =
      meaning === null
        ? ''
        : `: ${meaning.averages} averages of ${shown} are worth ${printNumber(meaning.effectiveAverages)} independent ones`;
    reading.warn(overlap.at, `above 75 % the added segments mostly repeat data${worth}`, 'overlap');
  }
  const window = innermost(layers, 'window');
  if (window?.value === 'rectangular') {
    reading.warn(
      window.at,
      'the rectangular window smears tones over the whole spectrum, unless whole periods are recorded; hann suits most',
      'window',
    );
  }
  if (sampleRateHz === null || runningSpeedHz === null) return;
  const turns = (segmentSamplesFor(sampleRateHz, analysis.lineSpacingHz) / sampleRateHz) * runningSpeedHz;
  if (turns >= 10) return;
  const place = innermost(layers, 'line_spacing')?.at ?? at;
  const remedy = finerSpacing(runningSpeedHz / 10, analysis, sampleRateHz);
  reading.warn(
    place,
    `a segment of ${shown} holds ${printNumber(turns)} turns of the shaft, fewer than 10; ${remedy}`,
    'turns',
  );
}
