import { qualityRules as rules } from './quality-rules.ts';

/** Means that are kept: an hour of them. */
const mostMeans = 360_000;
/** Below these the spread of later means says nothing. */
const leastMeans = 20;

/**
 * Sees a sensor that was just switched on: its bias, or the filter behind it, runs from an offset to rest while the
 * recording has begun. Compares the mean of the first 10 ms with the means of the second half.
 */
export class SettlingStart {
  readonly #blockSamples: number | null;
  readonly #means: number[] = [];
  #sum = 0;
  #filled = 0;
  #total = 0;
  #squares = 0;
  #samples = 0;
  #shift = Number.NaN;

  constructor(sampleRateHz: number | null) {
    this.#blockSamples =
      sampleRateHz === null ? null : Math.max(1, Math.round(rules.settlingBlockS * sampleRateHz));
  }

  add(value: number): void {
    if (this.#blockSamples === null || this.#means.length >= mostMeans) return;
    // Counted from the first sample, so that a large offset costs no digits.
    if (Number.isNaN(this.#shift)) this.#shift = value;
    const from = value - this.#shift;
    this.#total += from;
    this.#squares += from * from;
    this.#samples++;
    this.#sum += from;
    if (++this.#filled < this.#blockSamples) return;
    this.#means.push(this.#sum / this.#blockSamples);
    this.#sum = 0;
    this.#filled = 0;
  }

  /** What was found, for people, or null. */
  finding(): string | null {
    const means = this.#means;
    if (means.length < leastMeans) return null;
    const middle = Math.floor(means.length / 2);
    const later = means.slice(middle);
    const rest = later.reduce((sum, mean) => sum + mean, 0) / later.length;
    const spread = Math.sqrt(later.reduce((sum, mean) => sum + (mean - rest) ** 2, 0) / (later.length - 1));
    const off = Math.abs(means[0] - rest);
    const mean = this.#total / this.#samples;
    const rms = Math.sqrt(Math.max(0, this.#squares / this.#samples - mean * mean));
    const left = Math.abs(means[middle] - rest);
    const settles =
      off > rules.settlingDeviations * spread &&
      off > rules.settlingPart * rms &&
      left < rules.settlingGone * off;
    if (!settles) return null;
    const ms = 1000 * rules.settlingBlockS;
    return `the first ${ms} ms lie ${(off / rms).toPrecision(2)} times the r.m.s. off the rest; set skip_start (1 s suits powered accelerometers)`;
  }
}
