import type { Band, Point } from '../config/site.ts';
import { Averager, type AveragingSettings } from '../signal/averaging.ts';
import { bandPower } from '../signal/band-level.ts';
import { EqualAngle, passband } from '../signal/equal-angle.ts';
import { type Integrations, integrationsBetween } from '../signal/integration.ts';
import type { TurnSpeed } from '../signal/pulse-speed.ts';
import { levelsOf, searchPeaks } from './measure-levels.ts';
import type { BandLevel, OrderSpectrum } from './measurement.ts';
import { gridOf } from './point-averaging.ts';
import { type LaidBand, layOrderBands } from './point-bands.ts';

/**
 * A speed that moves by more than this from slowest to fastest smears the lines of the shaft: the tenth harmonic of
 * 25 Hz over 2.5 Hz. Below, equal angles would change nothing that is named in whole orders.
 */
export const movedPart = 0.01;

export function hasMoved({ meanHz, lowestHz, highestHz }: TurnSpeed): boolean {
  return highestHz - lowestHz > movedPart * meanHz;
}

export interface OrderSettings {
  readonly point: Point;
  /** Of the plain spectrum. */
  readonly averaging: AveragingSettings;
  /** Turns from the first sample of the file on. */
  readonly turnTimes: Float64Array;
  /** The stretch of the file that is measured, in samples from its first. */
  readonly from: number;
  readonly samples: number;
  readonly siPerSample: number;
  readonly seriesOf: (band: Band) => string;
}

export interface OrderAnalysis {
  /** Levels of those bands in orders that lie within reach. */
  readonly levels: readonly BandLevel[];
  readonly spectrum: OrderSpectrum;
}

/** One average over equal angles, for the bands that need so many integrations. */
interface AngleAverage {
  readonly integrations: Integrations;
  readonly averager: Averager;
  readonly bands: readonly { readonly laid: LaidBand; readonly segmentPowers: number[] }[];
}

/**
 * Levels of bands in orders, and the spectrum over orders, of a shaft whose speed moved within the recording: from samples
 * at equal angles, averaged as the plain spectrum is, with segments of as many samples. Fed with the samples of the
 * channel once more, for what the speed was is known only when the recording was read.
 *
 * Frequencies are those at the mean speed. Integration goes by the frequency that each moment had: a line at an order is
 * divided by 2 pi f of the mean speed, its samples by the speed there over the mean speed.
 */
export class OrderMeasurer {
  readonly #settings: OrderSettings;
  readonly #angle: EqualAngle;
  readonly #averages: readonly AngleAverage[];
  readonly #meanHz: number;
  readonly #averaging: AveragingSettings;
  readonly #highestHz: number;
  #seen = 0;
  #scaled = new Float64Array(0);

  /** Null where the stretch has too few turns for a segment. */
  static of(settings: OrderSettings): OrderMeasurer | null {
    const { turnTimes, from, samples, averaging } = settings;
    const within = turnTimes.filter((time) => time >= from && time <= from + samples - 1);
    if (within.length < 3) return null;
    const turned = within[within.length - 1] - within[0];
    return turned < 1.1 * averaging.segmentSamples ? null : new OrderMeasurer(settings, within);
  }

  private constructor(settings: OrderSettings, turnTimes: Float64Array) {
    const { averaging, point, from } = settings;
    this.#settings = settings;
    const turns = turnTimes.length - 1;
    const meanTurn = (turnTimes[turns] - turnTimes[0]) / turns;
    const fastestTurn = turnTimes.reduce(
      (least, time, n) => (n === 0 ? least : Math.min(least, time - turnTimes[n - 1])),
      meanTurn,
    );
    this.#meanHz = averaging.sampleRateHz / meanTurn;
    const samplesPerTurn = Math.ceil(meanTurn);
    this.#averaging = { ...averaging, sampleRateHz: samplesPerTurn * this.#meanHz };
    this.#highestHz = (passband * 0.5 * averaging.sampleRateHz * fastestTurn) / meanTurn;
    this.#averages = anglesOf(point, this.#averaging, this.#meanHz, this.#highestHz);
    const relative = turnTimes.map((time) => time - from);
    this.#angle = new EqualAngle({ turnTimes: relative, samplesPerTurn }, (samples, turnsPerSample) => {
      for (const one of this.#averages) addWeighted(one, samples, turnsPerSample, meanTurn);
    });
  }

  /** Takes the next samples of the channel as the file holds them, from its first on. */
  add(raw: Float64Array): void {
    const { from, samples, siPerSample } = this.#settings;
    const first = Math.max(0, from - this.#seen);
    const last = Math.min(raw.length, from + samples - this.#seen);
    this.#seen += raw.length;
    if (last <= first) return;
    if (this.#scaled.length < last - first) this.#scaled = new Float64Array(last - first);
    const scaled = this.#scaled.subarray(0, last - first);
    for (let n = 0; n < scaled.length; n++) scaled[n] = raw[first + n] * siPerSample;
    this.#angle.add(scaled);
  }

  /** Null where the angles did not fill a segment after all. */
  finish(atLeast: boolean): OrderAnalysis | null {
    this.#angle.finish();
    const { point, seriesOf } = this.#settings;
    const { falsePeaksPerSpectrum } = point.analysis;
    const levels: BandLevel[] = [];
    let spectrum: OrderSpectrum | null = null;
    for (const { averager, bands, integrations } of this.#averages) {
      const density = averager.finish();
      if (density.averages === 0) return null;
      const searched = searchPeaks(density, this.#averaging, { falsePeaksPerSpectrum });
      const measured = levelsOf({
        point,
        averaging: this.#averaging,
        searched,
        segments: null,
        bands,
        speedHz: this.#meanHz,
        atLeast,
        seriesOf,
      });
      levels.push(...measured.levels);
      if (integrations > 0) continue;
      spectrum = {
        meanRpm: 60 * this.#meanHz,
        lineSpacingOrders: density.lineSpacingHz / this.#meanHz,
        averages: density.averages,
        density: Float32Array.from(density.density, (perHz) => perHz * this.#meanHz),
        peaks: measured.peaks.filter(({ frequencyHz }) => frequencyHz <= this.#highestHz),
      };
    }
    return spectrum && { levels, spectrum };
  }
}

/** One average for the spectrum, and one for each further number of integrations that a band asks for. */
function anglesOf(
  point: Point,
  averaging: AveragingSettings,
  meanHz: number,
  highestHz: number,
): readonly AngleAverage[] {
  const { laid } = layOrderBands(point, gridOf(averaging), meanHz);
  const within = laid.filter(({ toHz }) => toHz <= highestHz);
  const needed = within.map(({ band }) => integrationsBetween(point.quantity, band.quantity));
  return ([0, 1, 2] as const)
    .filter((integrations) => integrations === 0 || needed.includes(integrations))
    .map((integrations) => {
      const bands = within
        .filter((_, n) => needed[n] === integrations)
        .map((one) => ({ laid: one, segmentPowers: [] as number[] }));
      const averager = new Averager(averaging, (density) => {
        for (const {
          laid: { weights },
          segmentPowers,
        } of bands)
          segmentPowers.push(bandPower(density, weights));
      });
      return { integrations, averager, bands };
    });
}

function addWeighted(
  { averager, integrations }: AngleAverage,
  samples: Float64Array,
  turnsPerSample: Float64Array,
  meanTurn: number,
): void {
  if (integrations === 0) {
    averager.add(samples);
    return;
  }
  averager.add(samples.map((sample, n) => sample / (turnsPerSample[n] * meanTurn) ** integrations));
}
