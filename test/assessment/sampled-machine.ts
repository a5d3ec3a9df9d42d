import type { SeededRandom } from '../signal/random.ts';

/** Samples under work: tones are added by turning a phasor, which is faster than a cosine each. */
export class SampledMachine {
  readonly samples: Float64Array;
  readonly rateHz: number;
  readonly #random: SeededRandom;

  constructor(random: SeededRandom, rateHz: number, frames: number, noise: number) {
    this.#random = random;
    this.rateHz = rateHz;
    this.samples = new Float64Array(frames);
    let low = 0;
    for (let n = 0; n < frames; n++) {
      low = 0.9 * low + 0.436 * random.gaussian();
      this.samples[n] = noise * Math.SQRT1_2 * (low + random.gaussian());
    }
  }

  tone(hz: number, amplitude: number): void {
    if (hz <= 0 || hz >= this.rateHz / 2.1) return;
    const step = (2 * Math.PI * hz) / this.rateHz;
    const [turnRe, turnIm] = [Math.cos(step), Math.sin(step)];
    const phase = 2 * Math.PI * this.#random.uniform();
    let [re, im] = [amplitude * Math.cos(phase), amplitude * Math.sin(phase)];
    for (let n = 0; n < this.samples.length; n++) {
      this.samples[n] += re;
      [re, im] = [re * turnRe - im * turnIm, re * turnIm + im * turnRe];
    }
  }

  /** Each pair of sidebands is a little uneven: strength and phase of the mesh vary together. */
  sidebands(carrierHz: number, stepHz: number, amplitudes: readonly number[]): void {
    amplitudes.forEach((amplitude, n) => {
      const uneven = 0.7 + 0.3 * this.#random.uniform();
      const [below, above] = this.#random.uniform() < 0.5 ? [1, uneven] : [uneven, 1];
      this.tone(carrierHz - (n + 1) * stepHz, amplitude * below);
      this.tone(carrierHz + (n + 1) * stepHz, amplitude * above);
    });
  }

  shaft(shaftHz: number): void {
    const harmonics = 6 + Math.floor(4 * this.#random.uniform());
    for (let k = 1; k <= harmonics; k++) this.tone(k * shaftHz, (0.2 + 0.8 * this.#random.uniform()) / k);
  }
}
