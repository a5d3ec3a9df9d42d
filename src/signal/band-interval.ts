/**
 * How well a band level is known: the spread of a sum of averaged, overlapped, windowed spectral lines.
 *
 * Noise. With Ghat_j the weighted power on line j of the band, S = sum Ghat_j and K segments,
 *     var S = (1/K) sum_jk G_j G_k c(|j-k|),   c(d) = C_0(d) + 2 sum_{m>=1} (1 - m/K) C_m(d),
 *     C_m(d) = |DFT at d of w[n] w[n - m hop]|² / (sum w²)²,
 * because window and overlap make neighbouring lines and segments repeat each other (Welch 1967; Percival & Walden
 * 1993, section 6.17, for the lines). Only Ghat is known, and E[Ghat_j Ghat_k] = G_j G_k (1 + c/K); dividing each
 * term by 1 + c/K takes that bias out. S then goes like chi-square with 2 (S² - V) / V degrees of freedom, at least 1.
 *
 * Tone. A steady tone does not fluctuate; only its product with the noise beside it does. The lines of a segment
 * spectrum add up (Parseval) to sum w² (s + v)² / sum w² over the samples, s the tone, v noise whose power per
 * line is F, so its variance per sample F N / 2. The product 2 sum w² s v / sum w², averaged over K segments, has
 *     V_tone = 2 T F N / (sum w²)² / K * [ sum w⁴ + 2 sum_{m>=1} (1 - m/K) sum w²[n] w²[n - m hop] ],
 * T the tone's mean square. T, F and V are weighted as the band's lines are.
 *
 * Where recordings are pooled, K is their segments in all and the share of pairs m hops apart (`pooled-segments.ts`)
 * takes the place of 1 - m/K: segments repeat each other within a recording only.
 */
import type { BandWeights } from './band-level.ts';
import { mostSegments, pairShare, type Segments, totalSegments } from './pooled-segments.ts';
import { chiSquareQuantile } from './statistics.ts';
import { PairTransform } from './transform.ts';
import { makeWindow, type WindowName } from './window.ts';

/** What the averaging alone says about the spread; the same for every band and recording of one setting. */
export interface IntervalKernel {
  /** Segments in all. */
  readonly averages: number;
  /** c(d) / (1 + c(d) / K) / K, K the segments in all, for d = 0, 1, ... up to where the rest no longer counts. */
  readonly lineCoupling: Float64Array;
  /** V_tone / (T F). */
  readonly toneCoupling: number;
}

/** Lines of a detected tone: in them, what exceeds the floor is the tone's. */
export interface TonePart {
  readonly firstLine: number;
  readonly lastLine: number;
  /** Density of the noise floor beneath the tone, per Hz, in the density's own unit (not integrated). */
  readonly floorDensity: number;
}

export interface BandInterval {
  /** r.m.s. of the band. */
  readonly level: number;
  readonly low: number;
  readonly high: number;
  readonly confidencePercent: number;
  readonly degreesOfFreedom: number;
}

/** Longer segments are stood for by this many samples and a hop in proportion; c(d) moves by less than 1e-3. */
const kernelSamples = 8192;
/** Farthest line distance that is followed; beyond, what is left of c(d) is far below 1 %. */
const farthestCoupling = 64;

/**
 * The kernel for `averages` segments of `segmentSamples` (a power of two), `hop` samples apart. Costs one transform
 * per two overlapped neighbours: build it once per setting and number of averages.
 *
 * Throws a RangeError for a length that is no power of two, or without a single average.
 * Checked: Hann, no overlap, K = 1: c(0) = 1, c(1) = 4/9, c(2) = 1/36, nothing beyond.
 */
export function makeIntervalKernel(
  window: WindowName,
  segmentSamples: number,
  hop: number,
  averages: Segments,
): IntervalKernel {
  const total = totalSegments(averages);
  if (!(total >= 1)) throw new RangeError(`averages = ${averages}: an interval needs at least 1`);
  const length = Math.min(segmentSamples, kernelSamples);
  const shortHop = Math.max(1, Math.round((hop * length) / segmentSamples));
  const w = makeWindow(window, length);
  const power = w.reduce((sum, value) => sum + value * value, 0);
  const lags = Math.min(Math.ceil(length / shortHop), mostSegments(averages));
  const coupling = new Float64Array(length / 2 + 1);
  let fourth = 0;
  const transform = new PairTransform(length);
  for (let m = 0; m < lags; m += 2) {
    const second = m + 1 < lags;
    fourth += lagWeight(m, averages) * packProduct(transform.packed, 0, w, m * shortHop);
    const secondFourth = packProduct(transform.packed, 1, w, second ? (m + 1) * shortHop : length);
    if (second) fourth += lagWeight(m + 1, averages) * secondFourth;
    transform.run();
    for (let d = 0; d < coupling.length; d++) {
      coupling[d] += lagWeight(m, averages) * transform.firstPower[d];
      if (second) coupling[d] += lagWeight(m + 1, averages) * transform.secondPower[d];
    }
  }
  const corrected = coupling.map((sum) => {
    const c = sum / power ** 2;
    return c / (1 + c / total) / total;
  });
  return {
    averages: total,
    lineCoupling: corrected.slice(0, couplingReach(corrected)),
    toneCoupling: (2 * length * fourth) / power ** 2 / total,
  };
}

/** In the double sum over segments, m hops apart occur on both sides, K - m times. */
function lagWeight(m: number, averages: Segments): number {
  return m === 0 ? 1 : 2 * pairShare(averages, m);
}

/** Writes w[n] w[n - shift] into one side of the packed input; returns the sum of its squares. */
function packProduct(packed: Float64Array, side: 0 | 1, w: Float64Array, shift: number): number {
  let squares = 0;
  for (let n = 0; n < w.length; n++) {
    const product = n < shift ? 0 : w[n] * w[n - shift];
    packed[2 * n + side] = product;
    squares += product * product;
  }
  return squares;
}

/** Number of distances to keep: what is left beyond is below a thousandth of the whole. */
function couplingReach(coupling: Float64Array): number {
  let left = coupling.reduce((sum, c) => sum + c, 0);
  const negligible = 1e-3 * left;
  const most = Math.min(coupling.length, farthestCoupling + 1);
  for (let d = 0; d < most; d++) {
    left -= coupling[d];
    if (left < negligible) return d + 1;
  }
  return most;
}

/**
 * Level of a band with its confidence interval.
 *
 * `density` is the averaged one-sided density that `band`'s weights belong to; `tones` are the peaks found in it, in
 * any order. The interval of 95 % holds the true level of noise, and of a steady tone in noise, in 92.5 to 97.5 % of
 * recordings (simulated: 93.6 to 96.6 % for 1 to 31 averages, bands of 3 to 180 lines, overlaps 0 to 75 %). Of one
 * or two segments it holds a velocity or displacement whose lowest lines weigh most in 91 to 95 %, and with the
 * rectangular window it is too wide about a tone between two lines, whose side lobes count as noise.
 * A band without any power gives the interval 0 to 0.
 */
export function bandInterval(
  density: Float64Array,
  band: BandWeights,
  kernel: IntervalKernel,
  tones: readonly TonePart[] = [],
  confidencePercent = 95,
): BandInterval {
  const noise = band.weights.map((weight, i) => weight * density[band.firstLine + i]);
  const power = noise.reduce((sum, g) => sum + g, 0);
  if (power === 0) return { level: 0, low: 0, high: 0, confidencePercent, degreesOfFreedom: Number.NaN };
  let variance = 0;
  for (const tone of tones) variance += kernel.toneCoupling * takeToneOut(noise, band, tone);
  variance += noiseVariance(noise, kernel.lineCoupling);
  const degreesOfFreedom = Math.max(1, (2 * (power ** 2 - variance)) / variance);
  const tail = 0.5 * (1 - confidencePercent / 100);
  return {
    level: Math.sqrt(power),
    low: Math.sqrt((degreesOfFreedom * power) / chiSquareQuantile(1 - tail, degreesOfFreedom)),
    high: Math.sqrt((degreesOfFreedom * power) / chiSquareQuantile(tail, degreesOfFreedom)),
    confidencePercent,
    degreesOfFreedom,
  };
}

/** Leaves only the floor under a tone in `noise`; returns T F, tone power times floor power per line. */
function takeToneOut(noise: Float64Array, band: BandWeights, tone: TonePart): number {
  const { firstLine, weights } = band;
  const from = Math.max(tone.firstLine, firstLine);
  const to = Math.min(tone.lastLine, firstLine + weights.length - 1);
  let product = 0;
  for (let line = from; line <= to; line++) {
    const i = line - firstLine;
    const floor = weights[i] * tone.floorDensity;
    // Lines shared with a neighbouring tone are down to the floor already and count once.
    if (noise[i] <= floor) continue;
    product += (noise[i] - floor) * floor;
    noise[i] = floor;
  }
  return product;
}

/** Sum over all pairs of lines of their powers times the coupling at their distance. */
function noiseVariance(noise: Float64Array, coupling: Float64Array): number {
  let variance = 0;
  for (let d = 0; d < coupling.length && d < noise.length; d++) {
    let sum = 0;
    for (let j = d; j < noise.length; j++) sum += noise[j] * noise[j - d];
    variance += (d === 0 ? 1 : 2) * coupling[d] * sum;
  }
  return variance;
}
