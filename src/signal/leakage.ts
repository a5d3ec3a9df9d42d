import { Kept } from './kept.ts';
import { mainLobe, type WindowName } from './window.ts';

/**
 * Signed amplitude that a tone reads on a line `offset` lines away from it, 1 at 0: the window's transform in the
 * limit of a long window, real because the window is symmetric. (`mainLobe` is its size.) Fast: one sine.
 */
export function lobe(coefficients: readonly number[], offset: number): number {
  const x = Math.abs(offset);
  const nearest = Math.round(x);
  const a0 = coefficients[0];
  if (Math.abs(x - nearest) < 1e-7) {
    if (nearest === 0) return 1;
    return nearest < coefficients.length ? coefficients[nearest] / (2 * a0) : 0;
  }
  let sum = a0 / x;
  let sign = -1;
  for (let k = 1; k < coefficients.length; k++) {
    sum += (sign * coefficients[k] * x) / (x * x - k * k);
    sign = -sign;
  }
  return (Math.sin(Math.PI * x) * sum) / (Math.PI * a0);
}

/** Where a tone lies and how strong it is, as a source of leakage into other lines. */
export interface LeakageSource {
  readonly firstLine: number;
  /** Same as `firstLine` for a tone. */
  readonly lastLine: number;
  /** Square root of the density that the tone has on a line right at its frequency. */
  readonly amplitude: number;
}

/** Leakage of one window and segment length: an upper bound on what a tone reads on far lines. */
export class Leakage {
  readonly segmentSamples: number;
  private readonly rectangular: boolean;
  /** Largest |W(x) / W(0)| at or past so many half lines. */
  private readonly envelope: Float64Array;

  constructor(window: WindowName, segmentSamples: number) {
    this.segmentSamples = segmentSamples;
    this.rectangular = window === 'rectangular';
    this.envelope = new Float64Array(segmentSamples + 1);
    let largest = 0;
    for (let half = segmentSamples; half >= 0; half--) {
      // Side lobes are highest near half lines; the quarters bound the ones next to the main lobe.
      for (const x of [half / 2 + 0.25, half / 2]) {
        if (x <= segmentSamples / 2) largest = Math.max(largest, mainLobe(window, x, segmentSamples));
      }
      this.envelope[half] = largest;
    }
  }

  /** Upper bound of the amplitude at a distance, in lines, from a tone of amplitude 1. The spectrum repeats after N lines. */
  bound(distance: number): number {
    const wrapped = distance % this.segmentSamples;
    const nearest = Math.min(wrapped, this.segmentSamples - wrapped);
    // A twentieth of a line allows for the error of the tone's own frequency.
    return this.envelope[Math.max(0, Math.floor(2 * nearest - 0.1))];
  }

  /**
   * Upper bound of the amplitude that a source and its mirror image at the negative frequency read on a line, with
   * the part of the source that removing each segment's mean puts around line 0.
   */
  amplitudeAt(line: number, source: LeakageSource): number {
    const nearest = Math.min(source.lastLine, Math.max(source.firstLine, line));
    const direct = this.rectangular
      ? this.bound(Math.abs(line - nearest)) * betweenNulls(source)
      : this.bound(Math.abs(line - nearest));
    const mirrored = this.bound(line + source.firstLine);
    const meanRemoved = (2 / Math.max(1, Math.PI * source.firstLine)) * this.bound(line);
    return source.amplitude * (direct + mirrored + meanRemoved);
  }
}

/**
 * Share of the rectangular window's envelope that a tone reaches on the lines, |sin(pi x)| of its place x between
 * them, a tenth of a line allowed for its error. With whole periods in a segment, the one use of this window, the
 * lines are the nulls, and the envelope would hide most of the spectrum.
 */
function betweenNulls({ firstLine, lastLine }: LeakageSource): number {
  if (firstLine !== lastLine) return 1;
  const fromNull = Math.abs(firstLine - Math.round(firstLine));
  return Math.sin(Math.PI * Math.min(0.5, fromNull + 0.1));
}

const kept = new Kept<string, Leakage>(32);

/** The leakage of one configuration; computed once (some 10 ms), then remembered. */
export function leakageOf(window: WindowName, segmentSamples: number): Leakage {
  return kept.get(`${window} ${segmentSamples}`, () => new Leakage(window, segmentSamples));
}
