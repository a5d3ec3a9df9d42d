import { createHash } from 'node:crypto';
import type { AnalysisSettings, Band, Point, SignalSettings } from '../config/site.ts';

/** Raised whenever the same recording under the same settings would give another number than before. */
export const algorithmVersion = 1;

/** Everything that moves a number made from a recording, but for the recording itself. */
export interface FingerprintSettings {
  readonly point: Pick<Point, 'quantity' | 'analysis' | 'recordings'>;
  /** As it was applied: the site file's, or the sidecar's where that overrides it. */
  readonly signal: SignalSettings;
  readonly sampleRateHz: number;
  readonly segmentSamples: number;
  /** Of the recording; null or left out: it has none. */
  readonly envelope?: EnvelopeFingerprint | null;
}

/** What moves the numbers of an envelope. */
export interface EnvelopeFingerprint {
  readonly band: { readonly fromHz: number; readonly toHz: number };
  readonly averaging: { readonly segmentSamples: number };
  readonly demodulation: { readonly decimation: number };
}

/**
 * Identity of a band's series: equal as long as its numbers may be compared. Moved by window, segment, overlap, the
 * band's edges as configured, integration, the way from sample to SI, skipped start, sample rate and algorithm; not by
 * the recording's length, other bands, limits, names, speed or the unit in which people see it. Recordings that are
 * pooled count as a longer one: they steady the level and do not move it, so the series goes on.
 *
 * A band of the envelope is moved by the band that is demodulated and by the envelope's segment and rate in place of
 * the plain spectrum's segment.
 */
export function seriesFingerprint(settings: FingerprintSettings, band: Band): string {
  const { envelope } = settings;
  if (band.of !== 'envelope' || envelope == null) return hash([...common(settings), ...edgesOf(band)]);
  const own = { ...settings, segmentSamples: envelope.averaging.segmentSamples };
  return hash([...common(own), ...demodulationParts(envelope), ...edgesOf(band)]);
}

/** As `seriesFingerprint` for everything that is measured on a point: all its bands and what its peaks depend on. */
export function settingsFingerprint(settings: FingerprintSettings, bands: readonly Band[]): string {
  const { analysis } = settings.point;
  return hash([
    ...common(settings),
    'point',
    analysis.confidencePercent,
    analysis.falsePeaksPerSpectrum,
    ...(analysis.averaging === undefined ? [] : [analysis.averaging]),
    ...(analysis.averageOver === undefined ? [] : ['pool', analysis.averageOver]),
    ...(settings.envelope == null
      ? []
      : [settings.envelope.averaging.segmentSamples, ...demodulationParts(settings.envelope)]),
    ...bands.flatMap((band) => [
      ...(band.of === 'envelope' ? ['of', band.of] : []),
      band.quantity,
      band.from,
      band.to,
      band.inOrders,
    ]),
  ]);
}

function edgesOf(band: Band): unknown[] {
  return ['band', band.quantity, band.from, band.to, band.inOrders];
}

function demodulationParts({ band, demodulation }: EnvelopeFingerprint): unknown[] {
  return ['envelope', band.fromHz, band.toHz, demodulation.decimation];
}

function common({ point, signal, sampleRateHz, segmentSamples }: FingerprintSettings): unknown[] {
  const analysis: AnalysisSettings = point.analysis;
  return [
    'algorithm',
    algorithmVersion,
    'detrending',
    analysis.detrend === 'linear' ? 'straight line of each segment' : 'mean of each segment',
    'averaging',
    'power',
    analysis.window,
    segmentSamples,
    analysis.overlapPercent,
    analysis.skipStartS,
    point.quantity,
    signal.samplesIn.quantity,
    signal.samplesIn.inSi,
    signal.fullScale,
    signal.sensitivity,
    seriesRate(sampleRateHz, point.recordings.sampleRateHz),
  ];
}

/** Largest part by which a recording's sample rate may differ from the configured one. */
export const rateTolerance = 0.001;

/** Whether the rate is not the configured one; a point without one takes any. */
export function isWrongRate(sampleRateHz: number, configuredHz: number | null): boolean {
  return configuredHz !== null && Math.abs(sampleRateHz / configuredHz - 1) > rateTolerance;
}

/** The configured rate where the recording has it, else the recording's in four figures (steps of at most 0.1 %). */
export function seriesRate(sampleRateHz: number, configuredHz: number | null): number {
  if (configuredHz !== null && !isWrongRate(sampleRateHz, configuredHz)) return configuredHz;
  return Number(sampleRateHz.toPrecision(4));
}

function hash(parts: readonly unknown[]): string {
  return createHash('sha256').update(JSON.stringify(parts)).digest('hex').slice(0, 32);
}
