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

  /** Finite samples, from `from` up to, not including, `to`. */
  add(samples: Float64Array, from: number, to: number): void {
    const blockSamples = this.#blockSamples;
    if (blockSamples === null || from === to) return;
    // Counted from the first sample, so that a large offset costs no digits.
    if (Number.isNaN(this.#shift)) this.#shift = samples[from];
    for (let n = from; n < to && this.#means.length < mostMeans; ) {
      const end = Math.min(to, n + blockSamples - this.#filled);
      this.#addPart(samples, n, end);
      n = end;
      if (this.#filled < blockSamples) return;
      this.#means.push(this.#sum / blockSamples);
      this.#sum = 0;
      this.#filled = 0;
    }
  }

  #addPart(samples: Float64Array, from: number, to: number): void {
    const shift = this.#shift;
    let sum = this.#sum;
    let total = this.#total;
    let squares = this.#squares;
    for (let n = from; n < to; n++) {
      const off = samples[n] - shift;
      sum += off;
      total += off;
      squares += off * off;
    }
    this.#sum = sum;
    this.#total = total;
    this.#squares = squares;
    this.#samples += to - from;
    this.#filled += to - from;
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
