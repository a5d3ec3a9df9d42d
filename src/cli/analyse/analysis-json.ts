import type { Band, DisplayUnit } from '../../config/site.ts';
import { usualDisplayUnit } from '../../config/units.ts';
import { type Evidence, isFaultEvidence } from '../../manipulation/evidence.ts';
import type { BandLevel, Measurement, SpectralPeak } from '../../manipulation/measurement.ts';
import type { FileAnalysis } from '../../service/analyse-file.ts';
import { levelJson } from '../level-json.ts';
import { envelopeJson } from './envelope-output.ts';
import { noMachine } from './points-of-channels.ts';
import { ordersJson, speedJson } from './speed-output.ts';

/** An analysed file with what its points were to give: what is written as JSON and as text. */
export interface AnalysedFile {
  /** As it was named. */
  readonly file: string;
  readonly analysis: FileAnalysis;
  /** Bands of each measurement. */
  readonly bands: readonly (readonly Band[])[];
}

/** One object a file; names are spelled as the README lists them. Levels in the unit that stands beside them. */
export function analysisJson(
  { file, analysis, bands }: AnalysedFile,
  spectrum: boolean,
): Record<string, unknown> {
  const { start, sampleRateHz, frames, measurements, densities } = analysis;
  return {
    file,
    sha256: analysis.sha256,
    start: new Date(start.startMs).toISOString(),
    start_origin: start.origin,
    sample_rate_hz: sampleRateHz,
    duration_s: sampleRateHz === null ? null : frames / sampleRateHz,
    channels: measurements.map((measurement, n) => ({
      ...channelJson(measurement, bands[n] ?? [], analysis, spectrum),
      ...(spectrum ? { spectrum: spectrumJson(measurement, densities[n] ?? null) } : {}),
    })),
  };
}

function channelJson(
  measurement: Measurement,
  bands: readonly Band[],
  { quality }: FileAnalysis,
  spectrum: boolean,
) {
  const { speed, waveform, averaging, envelope, orders } = measurement;
  const inSite = measurement.machineId !== noMachine;
  return {
    channel: measurement.channel,
    machine: inSite ? measurement.machineId : null,
    point: inSite ? measurement.pointId : null,
    quantity: measurement.quantity,
    unit: measurement.unit,
    speed: speed && speedJson(speed),
    waveform: waveform && {
      mean: waveform.mean,
      rms: waveform.rms,
      peak: waveform.peak,
      crest_factor: waveform.crestFactor,
      kurtosis: waveform.kurtosis,
      skewness: waveform.skewness,
    },
    averaging: averaging && {
      window: averaging.window,
      overlap_percent: averaging.overlapPercent,
      segment_samples: averaging.segmentSamples,
      line_spacing_hz: averaging.lineSpacingHz,
      averages: averaging.averages,
      effective_averages: averaging.effectiveAverages,
      used_percent: averaging.usedPercent,
      segment_spread: averaging.segmentSpread,
      ...(averaging.detrend === undefined ? {} : { detrend: averaging.detrend }),
    },
    bands: measurement.levels.map((level) => bandJson(level, displayOf(level, bands))),
    peaks: measurement.peaks.map((peak) => peakJson(peak, measurement.unit)),
    orders: orders == null ? null : ordersJson(orders, measurement.unit, peakJson, spectrum),
    envelope: envelope == null ? null : envelopeJson(envelope, measurement.unit, peakJson, spectrum),
    evidence: measurement.evidence.map(evidenceJson),
    quality: [...quality, ...measurement.quality].map(({ flag, detail }) => ({ flag, detail })),
  };
}

function bandJson(level: BandLevel, display: DisplayUnit) {
  return {
    band: level.bandId,
    from_hz: level.fromHz,
    to_hz: level.toHz,
    quantity: level.quantity,
    ...levelJson(level, display),
    confidence_percent: level.confidencePercent,
  };
}

/** How a level is shown: as its band says. */
export function displayOf({ bandId, quantity }: BandLevel, bands: readonly Band[]): DisplayUnit {
  return bands.find(({ id }) => id === bandId)?.display ?? usualDisplayUnit(quantity);
}

function peakJson(peak: SpectralPeak, unit: string) {
  return {
    frequency_hz: peak.frequencyHz,
    level: peak.level,
    unit,
    order: peak.order,
    above_floor_db: peak.aboveFloorDb,
    names: peak.names,
  };
}

function evidenceJson(evidence: Evidence) {
  const { partId, fault, frequency, spectrum, grade, expectedHz, words } = evidence;
  const found = isFaultEvidence(evidence) ? evidence : null;
  return {
    part: partId,
    fault,
    frequency,
    spectrum,
    also_in: found?.alsoIn ?? null,
    grade,
    observation: found?.isObservation === true,
    expected_hz: expectedHz,
    observed_hz: found?.observedHz ?? null,
    harmonics: found?.harmonics ?? null,
    sidebands: found?.sidebands ?? null,
    above_floor_db: found?.aboveFloorDb ?? null,
    chance: found?.chance ?? null,
    line_spacing_needed_hz: isFaultEvidence(evidence) ? null : evidence.neededLineSpacingHz,
    words,
  };
}

function spectrumJson(measurement: Measurement, density: Float64Array | null) {
  if (density === null || measurement.averaging === null) return null;
  return {
    line_spacing_hz: measurement.averaging.lineSpacingHz,
    unit: `(${measurement.unit})²/Hz`,
    ...(measurement.spectrum?.averaging === 'peak-hold' ? { averaging: 'peak-hold' } : {}),
    density: Array.from(density),
  };
}
