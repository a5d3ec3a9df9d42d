import type { Quantity } from '../config/site.ts';
import { EqualRows } from './equal-rows.ts';
import { qualityRules as rules } from './quality-rules.ts';
import type { QualityFinding, RecordingHeader } from './recording.ts';
import { SettlingStart } from './settling-start.ts';
import { type MachineLook, spectrumFindings } from './spectrum-quality.ts';

export interface SampleQualitySettings {
  readonly samples: RecordingHeader['samples'];
  readonly sampleRateHz: number | null;
  readonly quantity: Quantity;
  /** Volts of a sample of 1; null where the samples are no voltage behind a sensor. */
  readonly voltsPerSample: number | null;
  /** A sample of more than this is a spoilt number; infinite where it is not given. */
  readonly largest?: number;
}

/**
 * Looks at the raw samples of one channel, fed in blocks of any size, and at the density made of them, by the rules
 * of `quality-rules.ts`. Holds a few numbers, one mean a 10 ms, and a bounded list of suspicious rows.
 */
export class SampleQuality {
  readonly #settings: SampleQualitySettings;
  readonly #largest: number;
  readonly #rows = new EqualRows();
  readonly #start: SettlingStart;
  #samples = 0;
  #notFinite = 0;
  #stretch = 0;
  #longestStretch = 0;
  #sum = 0;

  constructor(settings: SampleQualitySettings) {
    this.#settings = settings;
    this.#largest = Math.min(settings.largest ?? Number.MAX_VALUE, Number.MAX_VALUE);
    this.#start = new SettlingStart(settings.sampleRateHz);
  }

  add(samples: Float64Array): void {
    let from = 0;
    for (let n = 0; n < samples.length; n++) {
      if (Math.abs(samples[n]) <= this.#largest) continue;
      this.#addFinite(samples, from, n);
      this.#notFinite++;
      this.#stretch = 0;
      this.#rows.end();
      from = n + 1;
    }
    this.#addFinite(samples, from, samples.length);
    this.#samples += samples.length;
  }

  /** The samples from `from` up to, not including, `to`. */
  #addFinite(samples: Float64Array, from: number, to: number): void {
    if (from === to) return;
    this.#stretch += to - from;
    if (this.#stretch > this.#longestStretch) this.#longestStretch = this.#stretch;
    let sum = this.#sum;
    for (let n = from; n < to; n++) sum += samples[n];
    this.#sum = sum;
    this.#rows.add(samples, from, to);
    this.#start.add(samples, from, to);
  }

  /** Everything found. `spectrum`: one-sided density in the SI unit of the point; null where there is none. */
  finish(
    spectrum: {
      readonly density: Float64Array;
      readonly lineSpacingHz: number;
      readonly averages: number;
    } | null,
    machine: MachineLook,
  ): QualityFinding[] {
    this.#rows.end();
    const found: QualityFinding[] = [];
    const finite = this.#samples - this.#notFinite;
    if (this.#notFinite > 0) {
      found.push({
        flag: 'not-a-number',
        detail: `${this.#notFinite} of ${this.#samples} samples are no usable numbers; the longest stretch without one has ${this.#longestStretch}`,
      });
    }
    if (finite === 0) return found;
    const mean = this.#sum / finite;
    const flat = this.#flat(mean);
    if (flat !== null) return [...found, { flag: 'flat', detail: flat }];
    found.push(...this.#rowFindings(finite, mean));
    const settling = this.#start.finding();
    if (settling !== null) found.push({ flag: 'settling', detail: settling });
    const bias = this.#bias(mean);
    if (bias !== null) found.push({ flag: 'bias-out-of-range', detail: bias });
    if (spectrum !== null) {
      const { quantity } = this.#settings;
      found.push(...spectrumFindings(spectrum, { quantity, ...machine }));
    }
    return found;
  }

  #flat(mean: number): string | null {
    const { lowest, highest, step } = this.#rows;
    const range = highest - lowest;
    if (range === 0) return `all samples are ${lowest.toPrecision(6)}; check sensor, cable and supply`;
    const whole = this.#settings.samples === 'integer' ? 1 : Math.abs(mean);
    // A half more than two, for steps that are no exact binary fractions.
    if (range > (rules.flatSteps + 0.5) * step || range > rules.flatPart * whole) return null;
    return `the samples move by ${Math.round(range / step)} steps of the recorder's resolution at most; check sensor, cable and range`;
  }

  #rowFindings(finite: number, mean: number): QualityFinding[] {
    const integer = this.#settings.samples === 'integer';
    const found: QualityFinding[] = [];
    const { rows, samples } = this.#rows.clipped(integer);
    const part = samples / finite;
    if (rows > 0) {
      found.push({
        flag: 'clipped',
        detail: `${samples} samples in ${rows} rows of equal values at the extremes`,
      });
    }
    const offset = integer && Math.abs(mean) > rules.saturatedMean;
    if (part >= rules.saturatedPart || offset) {
      const detail = offset
        ? `the mean lies at ${percent(Math.abs(mean))} of full scale`
        : `${percent(part)} of the samples lie at the extremes`;
      found.push({ flag: 'saturated', detail: `${detail}; the sensor or its supply is overdriven` });
    }
    const dropouts = this.#rows.dropouts(integer);
    if (dropouts.rows > 0) {
      found.push({
        flag: 'dropouts',
        detail: `${dropouts.rows} rows of at least ${rules.dropoutRow} equal samples, ${dropouts.samples} in all; the recorder lost samples or the contact is loose`,
      });
    }
    return found;
  }

  #bias(mean: number): string | null {
    const { voltsPerSample, quantity } = this.#settings;
    if (voltsPerSample === null || quantity !== 'acceleration') return null;
    const volts = mean * voltsPerSample;
    if (Math.abs(volts) < rules.biasVisibleV || (volts >= rules.biasLowV && volts <= rules.biasHighV))
      return null;
    return `bias ${volts.toPrecision(3)} V, outside ${rules.biasLowV} to ${rules.biasHighV} V; check cable and supply`;
  }
}

function percent(part: number): string {
  return `${(100 * part).toPrecision(2)} %`;
}
