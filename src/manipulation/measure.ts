import type { QualityFinding, SamplesEnd, Sidecar } from '../acquisition/recording.ts';
import { longestSegmentSamples, segmentOf } from '../config/meaning.ts';
import type { Point, SignalSettings } from '../config/site.ts';
import { siUnit } from '../config/units.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import { CleanStretch, type StretchResult } from './clean-stretch.ts';
import { isWrongRate, settingsFingerprint } from './fingerprint.ts';
import { levelsOf, type MeasuredLevels } from './measure-levels.ts';
import type { Measurement, RunningSpeed, WaveformValues } from './measurement.ts';
import { type LaidBand, layBands, type UnlaidBand } from './point-bands.ts';

/** Looks at the samples as the file holds them, and at what was made of them. */
export interface SampleCheck {
  /** Raw samples of the channel, from the end of the skipped start on. */
  add(samples: Float64Array): void;
  /** Its findings. `density`: one-sided, (SI unit of the point)²/Hz; null where not one segment fitted. */
  finish(
    spectrum: Pick<AveragedDensity, 'density' | 'lineSpacingHz' | 'averages'> | null,
  ): readonly QualityFinding[];
}

export interface MeasureSettings {
  readonly point: Point;
  /** Nominal running speed of its machine, Hz. */
  readonly nominalHz: number | null;
  /** Channel as the file names it. */
  readonly channel: string;
  /** The recording's own; null where neither the file nor the site file says it. */
  readonly sampleRateHz: number | null;
  /** What a sample is multiplied by to be in the SI unit of the point's quantity. */
  readonly siPerSample: number;
  /** The way from sample to SI as it was applied, for the fingerprint. */
  readonly signal: SignalSettings;
  readonly sidecar: Pick<Sidecar, 'speedRpm' | 'loadPercent' | 'running'> | null;
  readonly check: SampleCheck | null;
}

/** Uncertainty of a speed that a logger wrote down: its tachometer, and drift over the recording. */
const sidecarSpeedUncertainty = 0.005;
/** Uncertainty of a nominal speed: induction motors slip by up to about 3 % between no and full load. */
const nominalSpeedUncertainty = 0.03;

/**
 * A time step that differs from the mean one by more makes a spectrum wrong: a tone at a quarter of the rate then lies
 * a twelfth of a radian off. What comes from the rounding of written times is not counted by the reader.
 */
export const unevenStepRatio = 0.05;

/**
 * No sensor gives more than this in the SI unit of its quantity, nor less and yet something: a sample beyond is a spoilt
 * number and counts as not finite, one below as 0. In between, fourth powers and densities stay numbers that can be kept.
 */
export const largestSample = 1e12;
const leastSample = 1e-60;

/**
 * Makes a `Measurement` from the samples of one channel, fed in blocks of any size; the result does not depend on
 * the sizes. Holds a segment, never the recording. Samples that are not finite, or larger than any sensor gives, end a
 * stretch: the longest is measured and the sample check says so.
 *
 * Throws where the point asks for what its check must have refused (velocity from displacement).
 */
export class Measurer {
  readonly #settings: MeasureSettings;
  readonly #averaging: AveragingSettings | null;
  readonly #laid: readonly LaidBand[];
  readonly #unlaid: readonly UnlaidBand[];
  readonly #speed: RunningSpeed | null;
  #toSkip: number;
  #stretch: CleanStretch;
  #longest: StretchResult | null = null;
  #scaled = new Float64Array(0);

  constructor(settings: MeasureSettings) {
    this.#settings = settings;
    const { point, sampleRateHz } = settings;
    this.#speed = speedOf(settings);
    this.#averaging = averagingOf(settings);
    const grid = this.#averaging && {
      lineSpacingHz: this.#averaging.sampleRateHz / this.#averaging.segmentSamples,
      lines: this.#averaging.segmentSamples / 2 + 1,
    };
    const speedHz = this.#speed && this.#speed.rpm / 60;
    const bands = grid === null ? { laid: [], unlaid: [] } : layBands(point, grid, speedHz);
    this.#laid = bands.laid;
    this.#unlaid = bands.unlaid;
    this.#toSkip = Math.round(point.analysis.skipStartS * (sampleRateHz ?? 0));
    this.#stretch = new CleanStretch(this.#averaging, this.#laid);
  }

  /** Takes the next samples as the file holds them; the array may be used again by the caller. */
  add(samples: Float64Array): void {
    const skipped = Math.min(this.#toSkip, samples.length);
    this.#toSkip -= skipped;
    const raw = samples.subarray(skipped);
    if (raw.length === 0) return;
    this.#settings.check?.add(raw);
    if (this.#scaled.length < raw.length) this.#scaled = new Float64Array(raw.length);
    const scaled = this.#scaled.subarray(0, raw.length);
    const { siPerSample } = this.#settings;
    let from = 0;
    for (let n = 0; n < raw.length; n++) {
      const value = raw[n] * siPerSample;
      const size = Math.abs(value);
      scaled[n] = size < leastSample ? 0 : value;
      if (size <= largestSample) continue;
      this.#stretch.add(scaled.subarray(from, n));
      this.#endStretch();
      from = n + 1;
    }
    this.#stretch.add(scaled.subarray(from));
  }

  /**
   * The measurement. `end`: how the samples ended; nothing can be added afterwards. `onDensity` is shown the density,
   * (SI unit)²/Hz, as the levels were made from it; a measurement keeps it in single precision.
   */
  finish(
    end: Pick<SamplesEnd, 'timeStepDeviation'>,
    onDensity: (density: Float64Array) => void = () => {},
  ): Measurement {
    this.#endStretch();
    const { point, sampleRateHz, channel, sidecar, check } = this.#settings;
    const result = this.#longest;
    const uneven = end.timeStepDeviation !== null && end.timeStepDeviation > unevenStepRatio;
    const spectrum = uneven || this.#averaging === null ? null : (result?.density ?? null);
    const found = check?.finish(spectrum) ?? [];
    const levels = this.#levels(spectrum === null ? null : result, found);
    if (spectrum !== null) onDensity(spectrum.density);
    return {
      machineId: point.machineId,
      pointId: point.id,
      channel,
      quantity: point.quantity,
      unit: point.quantity === 'other' ? point.signal.samplesIn.text : siUnit(point.quantity).text,
      sampleRateHz: sampleRateHz ?? 0,
      durationS: result === null || sampleRateHz === null ? 0 : result.samples / sampleRateHz,
      speed: this.#speed,
      loadPercent: sidecar?.loadPercent ?? null,
      runningSaid: sidecar?.running ?? null,
      waveform: result === null || result.samples === 0 ? null : plainWaveform(result.waveform),
      averaging: levels?.averaging ?? null,
      levels: levels?.levels ?? [],
      peaks: levels?.peaks ?? [],
      spectrum: spectrum && {
        lineSpacingHz: spectrum.lineSpacingHz,
        density: Float32Array.from(spectrum.density),
      },
      quality: [...found, ...this.#ownFindings(uneven, end.timeStepDeviation, spectrum !== null, levels)],
      settingsFingerprint: settingsFingerprint(this.#fingerprintSettings(), point.bands),
    };
  }

  #levels(result: StretchResult | null, found: readonly QualityFinding[]): MeasuredLevels | null {
    if (result?.density == null || this.#averaging === null) return null;
    const { point } = this.#settings;
    return levelsOf({
      point,
      averaging: this.#averaging,
      density: result.density,
      segmentPowers: result.segmentPowers,
      segments: result.segments,
      bands: this.#laid,
      speedHz: this.#speed && this.#speed.rpm / 60,
      atLeast: found.some(({ flag }) => flag === 'clipped' || flag === 'saturated'),
      fingerprint: this.#fingerprintSettings(),
    });
  }

  #fingerprintSettings() {
    const { point, signal, sampleRateHz } = this.#settings;
    const segmentSamples = this.#averaging?.segmentSamples ?? 0;
    return { point, signal, sampleRateHz: sampleRateHz ?? 0, segmentSamples };
  }

  /** Keeps the longest stretch; the first of two equal ones. */
  #endStretch(): void {
    if (this.#stretch.samples === 0) return;
    if (this.#stretch.samples > (this.#longest?.samples ?? 0)) this.#longest = this.#stretch.finish();
    this.#stretch = new CleanStretch(this.#averaging, this.#laid);
  }

  #ownFindings(
    uneven: boolean,
    deviation: number | null,
    measured: boolean,
    levels: MeasuredLevels | null,
  ): QualityFinding[] {
    const { point, sampleRateHz } = this.#settings;
    const found: QualityFinding[] = [];
    const configured = point.recordings.sampleRateHz;
    if (sampleRateHz === null) {
      const detail = 'neither the file nor the site file says the sample rate; set sample_rate';
      return [{ flag: 'wrong-rate', detail }];
    }
    if (isWrongRate(sampleRateHz, configured)) {
      const detail = `recorded at ${sampleRateHz} Hz, the site file says ${configured} Hz; analysed at the recording's own`;
      found.push({ flag: 'wrong-rate', detail });
    }
    if (uneven) {
      const percent = Math.round(100 * (deviation ?? 0));
      const detail = `time steps differ from their mean by up to ${percent} %; waveform values only`;
      return [...found, { flag: 'uneven-time', detail }];
    }
    if (!measured) return [...found, this.#tooShort(sampleRateHz)];
    for (const { flag, reason } of this.#unlaid) found.push({ flag, detail: reason });
    if (levels?.unsteady != null) found.push({ flag: 'unsteady', detail: levels.unsteady });
    return found;
  }

  #tooShort(sampleRateHz: number): QualityFinding {
    const needed = segmentOf(this.#settings.point.analysis, sampleRateHz);
    const has = ((this.#longest?.samples ?? 0) / sampleRateHz).toPrecision(3);
    const wants = (needed / sampleRateHz).toPrecision(3);
    return {
      flag: 'too-short',
      detail: `${has} s without a gap, one segment needs ${wants} s; waveform values only. Record longer or widen line_spacing`,
    };
  }
}

function averagingOf({ point, sampleRateHz }: MeasureSettings): AveragingSettings | null {
  if (sampleRateHz === null) return null;
  const segmentSamples = segmentOf(point.analysis, sampleRateHz);
  if (segmentSamples < 8 || segmentSamples > longestSegmentSamples) return null;
  const { window, overlapPercent } = point.analysis;
  return { window, overlapPercent, segmentSamples, sampleRateHz };
}

function speedOf({ sidecar, nominalHz }: MeasureSettings): RunningSpeed | null {
  if (sidecar?.speedRpm != null) {
    const rpm = sidecar.speedRpm;
    return { rpm, origin: 'sidecar', uncertaintyRpm: sidecarSpeedUncertainty * Math.abs(rpm) };
  }
  if (nominalHz === null) return null;
  // The site file says r/min; what the way through hertz adds in the last digits is taken off again.
  const rpm = Number((60 * nominalHz).toPrecision(12));
  return { rpm, origin: 'nominal', uncertaintyRpm: nominalSpeedUncertainty * rpm };
}

/** A flat signal has no shape: crest factor, kurtosis and skewness are given as 0, so that no NaN is stored. */
function plainWaveform(values: WaveformValues): WaveformValues {
  const plain = (value: number) => (Number.isFinite(value) ? value : 0);
  return {
    ...values,
    crestFactor: plain(values.crestFactor),
    kurtosis: plain(values.kurtosis),
    skewness: plain(values.skewness),
  };
}
