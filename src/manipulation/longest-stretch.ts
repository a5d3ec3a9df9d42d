import { CleanStretch, type StretchResult, type StretchSettings } from './clean-stretch.ts';

/**
 * No sensor gives more than this in the SI unit of its quantity, nor less and yet something: a sample beyond is a spoilt
 * number and counts as not finite, one below as 0. In between, fourth powers and densities stay numbers that can be kept.
 */
export const largestSample = 1e12;
const leastSample = 1e-60;

/** The longest stretch of a channel without a sample that is not finite, or larger than any sensor gives. */
export class LongestStretch {
  readonly #siPerSample: number;
  readonly #settings: StretchSettings;
  #seen: number;
  #stretch: CleanStretch;
  #scaled = new Float64Array(0);
  #longest: StretchResult | null = null;
  /** Where it begins, in samples of the file. */
  from = 0;

  /** `skipped`: samples of the file before the first that is fed. */
  constructor(siPerSample: number, skipped: number, settings: StretchSettings) {
    this.#siPerSample = siPerSample;
    this.#seen = skipped;
    this.#settings = settings;
    this.#stretch = new CleanStretch(settings);
  }

  /** Takes the next samples as the file holds them; the array may be used again by the caller. */
  add(raw: Float64Array): void {
    if (this.#scaled.length < raw.length) this.#scaled = new Float64Array(raw.length);
    const scaled = this.#scaled.subarray(0, raw.length);
    const siPerSample = this.#siPerSample;
    let from = 0;
    for (let n = 0; n < raw.length; n++) {
      const value = raw[n] * siPerSample;
      const size = Math.abs(value);
      scaled[n] = size < leastSample ? 0 : value;
      if (size <= largestSample) continue;
      this.#stretch.add(scaled.subarray(from, n));
      this.#endStretch(this.#seen + n);
      from = n + 1;
    }
    this.#stretch.add(scaled.subarray(from));
    this.#seen += raw.length;
  }

  /** What it gave; of two equally long ones the first. Null where there is not one sample. Nothing can be added afterwards. */
  finish(): StretchResult | null {
    this.#endStretch(this.#seen);
    return this.#longest;
  }

  #endStretch(end: number): void {
    const { samples } = this.#stretch;
    if (samples === 0) return;
    if (samples > (this.#longest?.samples ?? 0)) {
      this.#longest = this.#stretch.finish();
      this.from = end - samples;
    }
    this.#stretch = new CleanStretch(this.#settings);
  }
}
