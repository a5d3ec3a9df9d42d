import type { SamplesEnd } from '../acquisition/recording.ts';
import type { Band } from '../config/site.ts';
import { siUnit } from '../config/units.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import type { StretchResult } from './clean-stretch.ts';
import { type EnvelopePlan, envelopePlan } from './envelope-plan.ts';
import { seriesFingerprint, settingsFingerprint } from './fingerprint.ts';
import { plainWaveform, shownSpectrum } from './kept-values.ts';
import { LongestStretch } from './longest-stretch.ts';
import { type MeasuredEnvelope, measureEnvelope, noEnvelope } from './measure-envelope.ts';
import { measureFindings, unevenStepRatio } from './measure-findings.ts';
import {
  groupPowers,
  levelsOf,
  type MeasuredLevels,
  type SearchedDensity,
  searchPeaks,
} from './measure-levels.ts';
import type { MeasureSettings } from './measure-settings.ts';
import type { BandLevel, Measurement } from './measurement.ts';
import { OrderMeasurer } from './order-levels.ts';
import { averagingOf, gridOf } from './point-averaging.ts';
import { type LaidBands, layFixedBands, layOrderBands, lowestVelocityHz } from './point-bands.ts';
import type { SpeedAnswer } from './running-speed.ts';
import { seriesBeside } from './series-beside.ts';

export type { MeasureSettings, SampleCheck } from './measure-settings.ts';

/**
 * Makes a `Measurement` from the samples of one channel, fed in blocks of any size; the result does not depend on
 * the sizes. Holds a segment, never the recording. Samples that are not finite, or larger than any sensor gives, end a
 * stretch: the longest is measured and the sample check says so.
 *
 * In three steps, because the running speed is known only when every channel of the file is read and every spectrum is
 * there: `add` the samples, `end` them, `finish` with the speed.
 *
 * Throws where the point asks for what its check must have refused (velocity from displacement).
 */
export class Measurer {
  readonly #settings: MeasureSettings;
  readonly #averaging: AveragingSettings | null;
  readonly #fixed: LaidBands;
  readonly #envelope: EnvelopePlan | null;
  readonly #stretch: LongestStretch;
  #toSkip: number;
  #longest: StretchResult | null = null;
  #ended: Ended | null = null;

  constructor(settings: MeasureSettings) {
    this.#settings = settings;
    const { point, sampleRateHz } = settings;
    this.#averaging = averagingOf(point, sampleRateHz);
    const grid = this.#averaging && gridOf(this.#averaging);
    this.#fixed = grid === null ? noBands : layFixedBands(point, grid);
    // A quantity that a band in orders cannot have is refused before a sample is read, like any other.
    if (grid !== null) layOrderBands(point, grid, null);
    this.#envelope = envelopePlan(point, sampleRateHz, settings.chosenBand ?? null);
    this.#toSkip = Math.round(point.analysis.skipStartS * (sampleRateHz ?? 0));
    this.#stretch = new LongestStretch(settings.siPerSample, this.#toSkip, {
      averaging: this.#averaging,
      bands: this.#fixed.laid,
      besides: point.analysis.averaging,
      envelope: this.#envelope,
    });
  }

  /** Takes the next samples as the file holds them; the array may be used again by the caller. */
  add(samples: Float64Array): void {
    const skipped = Math.min(this.#toSkip, samples.length);
    this.#toSkip -= skipped;
    const raw = samples.subarray(skipped);
    if (raw.length === 0) return;
    this.#settings.check?.add(raw);
    this.#stretch.add(raw);
  }

  /** `end`: how the samples ended. The spectrum with its peaks, where a running speed may be looked for; null: none. */
  end({ timeStepDeviation }: Pick<SamplesEnd, 'timeStepDeviation'>): SearchedDensity | null {
    this.#longest = this.#stretch.finish();
    const isUneven = timeStepDeviation !== null && timeStepDeviation > unevenStepRatio;
    const density = isUneven ? null : (this.#longest?.density ?? null);
    const { falsePeaksPerSpectrum } = this.#settings.point.analysis;
    const median = this.#longest?.median ?? null;
    const searched =
      density === null || this.#averaging === null
        ? null
        : searchPeaks(density, this.#averaging, {
            falsePeaksPerSpectrum,
            ...(median === null ? {} : { searchIn: median }),
          });
    this.#ended = { timeStepDeviation, searched };
    return searched;
  }

  /** After `end`: what measures over equal angles, fed with the same samples once more; null where nothing can. */
  overAngles(turnTimes: Float64Array): OrderMeasurer | null {
    const { point, siPerSample } = this.#settings;
    const samples = this.#longest?.samples ?? 0;
    if (this.#averaging === null || !this.#ended?.searched) return null;
    const seriesOf = (band: Band) => seriesFingerprint(this.#fingerprintSettings(), band);
    const averaging = this.#averaging;
    return OrderMeasurer.of({
      point,
      averaging,
      turnTimes,
      from: this.#stretch.from,
      samples,
      siPerSample,
      seriesOf,
    });
  }

  /**
   * The measurement, after `end`, with the running speed of its machine and what is to be said of it. `onDensity` is
   * shown the density, (SI unit)²/Hz, as the levels were made from it, or the highest of all segments where people are to
   * see that; a measurement keeps it in single precision.
   * `angles`: as `overAngles` gave it, fed; its levels take the place of those that a moving speed smears.
   */
  finish(
    { speed, findings }: SpeedAnswer,
    onDensity: (density: Float64Array) => void = () => {},
    angles: OrderMeasurer | null = null,
  ): Measurement {
    if (this.#ended === null) throw new Error('a measurement is finished before its samples are ended');
    const { timeStepDeviation, searched } = this.#ended;
    const { point, sampleRateHz, channel, sidecar, check } = this.#settings;
    const result = this.#longest;
    const speedHz = speed && speed.rpm / 60;
    const spectrum = searched?.density ?? null;
    const machine = { speedHz, lowestVelocityHz: lowestVelocityHz(point, speedHz) };
    const found = check?.finish(spectrum, machine) ?? [];
    const grid = this.#averaging && gridOf(this.#averaging);
    const orders = grid === null ? noBands : layOrderBands(point, grid, speedHz);
    const atLeast = found.some(({ flag }) => flag === 'clipped' || flag === 'saturated');
    const levels = searched && this.#levels(searched, orders, speedHz, atLeast);
    const envelope = searched && this.#measureEnvelope(speedHz, atLeast);
    const turned = angles?.finish(atLeast) ?? null;
    const all = [...(levels?.levels ?? []), ...(envelope?.levels ?? []), ...(turned?.levels ?? [])];
    if (spectrum !== null) onDensity(result?.highest ?? spectrum.density);
    const own = measureFindings({
      point,
      sampleRateHz,
      samples: result?.samples ?? 0,
      timeStepDeviation,
      hasSpectrum: searched !== null,
      unlaid: [
        ...this.#fixed.unlaid,
        ...orders.unlaid,
        ...(envelope?.unlaid ?? noEnvelope(point, this.#envelope)),
      ],
      unsteady: levels?.unsteady ?? null,
    });
    const settings = this.#fingerprintSettings();
    const ordered = inOrderOf(point.bands, all);
    return {
      machineId: point.machineId,
      pointId: point.id,
      channel,
      quantity: point.quantity,
      unit: point.quantity === 'other' ? point.signal.samplesIn.text : siUnit(point.quantity).text,
      sampleRateHz: sampleRateHz ?? 0,
      durationS: result === null || sampleRateHz === null ? 0 : result.samples / sampleRateHz,
      speed,
      loadPercent: sidecar?.loadPercent ?? null,
      runningSaid: sidecar?.running ?? null,
      waveform: result === null || result.samples === 0 ? null : plainWaveform(result.waveform),
      averaging: levels?.averaging ?? null,
      levels: ordered,
      peaks: levels?.peaks ?? [],
      spectrum: spectrum && shownSpectrum(spectrum, result?.highest ?? null),
      orders: turned?.spectrum ?? null,
      envelope: envelope?.envelope ?? null,
      quality: [...found, ...own, ...findings],
      evidence: [],
      settingsFingerprint: settingsFingerprint(settings, point.bands),
      seriesBeside: seriesBeside(settings, point.bands, ordered),
      ...this.#share(spectrum),
    };
  }

  #levels(
    searched: SearchedDensity,
    orders: LaidBands,
    speedHz: number | null,
    atLeast: boolean,
  ): MeasuredLevels | null {
    const result = this.#longest;
    if (result === null || this.#averaging === null) return null;
    const { point } = this.#settings;
    const fixed = this.#fixed.laid.map((laid, n) => ({ laid, segmentPowers: result.segmentPowers[n] }));
    const ordered = orders.laid.map((laid) => ({
      laid,
      segmentPowers: result.segments === null ? [] : groupPowers(result.segments, laid.weights),
    }));
    return levelsOf({
      point,
      averaging: this.#averaging,
      searched,
      segments: result.segments,
      bands: [...fixed, ...ordered],
      speedHz,
      atLeast,
      seriesOf: (band) => seriesFingerprint(this.#fingerprintSettings(), band),
    });
  }

  #measureEnvelope(speedHz: number | null, atLeast: boolean): MeasuredEnvelope | null {
    const result = this.#longest?.envelope ?? null;
    return (
      result &&
      measureEnvelope({
        ...result,
        point: this.#settings.point,
        averages: result.density.averages,
        speedHz,
        atLeast,
        seriesOf: (band) => seriesFingerprint(this.#fingerprintSettings(), band),
      })
    );
  }

  #share(density: AveragedDensity | null): Pick<Measurement, 'share'> {
    if (density === null || this.#averaging === null) return {};
    if (this.#settings.point.analysis.averageOver === undefined) return {};
    const envelope = this.#longest?.envelope ?? null;
    const part = envelope && { plan: envelope.plan, density: envelope.density };
    return { share: { averaging: this.#averaging, density, envelope: part } };
  }

  #fingerprintSettings() {
    const { point, signal, sampleRateHz } = this.#settings;
    const segmentSamples = this.#averaging?.segmentSamples ?? 0;
    return { point, signal, sampleRateHz: sampleRateHz ?? 0, segmentSamples, envelope: this.#envelope };
  }
}

/** How the samples ended, and the peaks of their spectrum. */
interface Ended {
  readonly timeStepDeviation: number | null;
  readonly searched: SearchedDensity | null;
}

const noBands: LaidBands = { laid: [], unlaid: [] };

/** In the order of the bands; of two levels of one band the later. */
function inOrderOf(bands: readonly Band[], levels: readonly BandLevel[]): BandLevel[] {
  return bands.flatMap(({ id }) => levels.findLast(({ bandId }) => bandId === id) ?? []);
}
