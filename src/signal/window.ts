import { Kept } from './kept.ts';

/**
 * Windows of the averaging and their figures of merit.
 *
 * All are cosine sums in periodic form: w[n] = a0 - a1 cos z + a2 cos 2z - a3 cos 3z + a4 cos 4z with z = 2 pi n / N,
 * n = 0..N-1. The symmetric form (N - 1 in the denominator) belongs to filter design and would shift every figure
 * by about 1 / N.
 */
export type WindowName = 'rectangular' | 'hann' | 'hamming' | 'blackman' | 'blackman-harris' | 'flat-top';

interface WindowFacts {
  /** a0, a1, ... of the cosine sum. */
  readonly coefficients: readonly number[];
  /** From the middle of the main lobe to its first null, in lines. */
  readonly mainLobeHalfWidthLines: number;
  /** Highest side lobe against the main lobe, dB. */
  readonly highestSideLobeDb: number;
  /** Fewest lines from which a band level may be taken. */
  readonly leastBandLines: number;
}

const facts: Readonly<Record<WindowName, WindowFacts>> = {
  rectangular: {
    coefficients: [1],
    mainLobeHalfWidthLines: 1,
    highestSideLobeDb: -13.26,
    leastBandLines: 3,
  },
  hann: {
    coefficients: [0.5, 0.5],
    mainLobeHalfWidthLines: 2,
    highestSideLobeDb: -31.47,
    leastBandLines: 3,
  },
  hamming: {
    coefficients: [0.54, 0.46],
    mainLobeHalfWidthLines: 2,
    highestSideLobeDb: -42.67,
    leastBandLines: 3,
  },
  blackman: {
    coefficients: [0.42, 0.5, 0.08],
    mainLobeHalfWidthLines: 3,
    highestSideLobeDb: -58.11,
    leastBandLines: 4,
  },
  // Four-term minimum of Harris 1978; coefficients as in Heinzel, Rüdiger & Schilling 2002 ("BH92").
  'blackman-harris': {
    coefficients: [0.35875, 0.48829, 0.14128, 0.01168],
    mainLobeHalfWidthLines: 4,
    highestSideLobeDb: -92.01,
    leastBandLines: 5,
  },
  // D'Antona & Ferrero 2006, p. 70.
  'flat-top': {
    coefficients: [0.21557895, 0.41663158, 0.277263158, 0.083578947, 0.006947368],
    mainLobeHalfWidthLines: 5,
    highestSideLobeDb: -93.02,
    leastBandLines: 6,
  },
};

export const windowNames: readonly WindowName[] = [
  'rectangular',
  'hann',
  'hamming',
  'blackman',
  'blackman-harris',
  'flat-top',
];

/**
 * The window's `length` coefficients in periodic form, largest value 1.
 * Checked: Hann, length 8: 0, 0.146446609407, 0.5, 0.853553390593, 1, and mirrored.
 */
export function makeWindow(name: WindowName, length: number): Float64Array {
  const { coefficients } = facts[name];
  const window = new Float64Array(length);
  for (let n = 0; n < length; n++) {
    const z = (2 * Math.PI * n) / length;
    let value = coefficients[0];
    for (let k = 1; k < coefficients.length; k++) {
      value += (k % 2 === 1 ? -1 : 1) * coefficients[k] * Math.cos(k * z);
    }
    window[n] = value;
  }
  return window;
}

/** A window that everybody uses together: not to be written to. */
export interface SharedWindow {
  readonly values: Float64Array;
  /** sum w². */
  readonly power: number;
}

const sharedWindows = new Kept<string, SharedWindow>(16);
/** Longer windows (2 MiB) are made anew. */
const longestShared = 2 ** 18;

/** As `makeWindow`, with what is made of it, remembered for a few names and lengths. */
export function sharedWindow(name: WindowName, length: number): SharedWindow {
  const make = () => {
    const values = makeWindow(name, length);
    return { values, power: values.reduce((sum, w) => sum + w * w, 0) };
  };
  return length > longestShared ? make() : sharedWindows.get(`${name} ${length}`, make);
}

/** a0, a1, ... of the window's cosine sum. Hann 0.5, 0.5. */
export function windowCoefficients(name: WindowName): readonly number[] {
  return facts[name].coefficients;
}

/** Mean of the window, for a length above twice its number of terms: what a steady value is multiplied by. Hann 0.5. */
export function coherentGain(name: WindowName): number {
  return facts[name].coefficients[0];
}

/** Equivalent noise bandwidth in lines, N sum w² / (sum w)² (Harris 1978, eq. 11). Hann 1.5. */
export function noiseBandwidthLines(name: WindowName): number {
  const [a0, ...others] = facts[name].coefficients;
  return 1 + others.reduce((sum, a) => sum + (a / a0) ** 2, 0) / 2;
}

/** Half width of the main lobe in lines, from its middle to the first null. Hann 2, flat-top 5. */
export function mainLobeHalfWidthLines(name: WindowName): number {
  return facts[name].mainLobeHalfWidthLines;
}

/** Highest side lobe in dB against the main lobe, a negative number. Hann -31.47. */
export function highestSideLobeDb(name: WindowName): number {
  return facts[name].highestSideLobeDb;
}

/**
 * Fewest lines a band level may be taken from, and fewest lines between 0 Hz and the start of a velocity or
 * displacement band: with fewer, the level depends on where a tone falls between the lines. Hann 3, flat-top 6.
 */
export function leastBandLines(name: WindowName): number {
  return facts[name].leastBandLines;
}

/**
 * |W(x) / W(0)|: what a steady tone reads, as an amplitude, on a line `offsetLines` away from it.
 *
 * Without `length` the limit of a long window, a0 sinc x + sum a_k (sinc(x - k) + sinc(x + k)) / 2 over a0. With
 * `length` exact for a window of that many samples (the difference falls as 1 / length).
 * Checked: Hann at 0.5 line 8 / (3 pi) = 0.848826.
 */
export function mainLobe(name: WindowName, offsetLines: number, length = Number.POSITIVE_INFINITY): number {
  const { coefficients } = facts[name];
  let real = coefficients[0] * kernel(offsetLines, length);
  let imaginary = 0;
  for (let k = 1; k < coefficients.length; k++) {
    const below = kernel(offsetLines - k, length);
    const above = kernel(offsetLines + k, length);
    const angle = (Math.PI * k) / length;
    real += 0.5 * coefficients[k] * Math.cos(angle) * (below + above);
    imaginary += 0.5 * coefficients[k] * Math.sin(angle) * (below - above);
  }
  return Math.hypot(real, imaginary) / coefficients[0];
}

/** Largest departure of a tone's reading on its nearest line, in dB with its sign. Hann -1.4236. */
export function scallopingDb(name: WindowName): number {
  let extreme = 0;
  for (let step = 0; step <= 500; step++) {
    const db = 20 * Math.log10(mainLobe(name, step / 1000));
    if (Math.abs(db) > Math.abs(extreme)) extreme = db;
  }
  return extreme;
}

/** sin(pi x) / (length sin(pi x / length)), and for an endless length sin(pi x) / (pi x). */
function kernel(x: number, length: number): number {
  if (Math.abs(x) < 1e-9) return 1;
  if (length === Number.POSITIVE_INFINITY) return Math.sin(Math.PI * x) / (Math.PI * x);
  const below = length * Math.sin((Math.PI * x) / length);
  // A whole number of window lengths away the kernel is 1 again, with the sign of an even or odd length.
  if (Math.abs(below) < 1e-9) return Math.cos(Math.PI * x) / Math.cos((Math.PI * x) / length);
  return Math.sin(Math.PI * x) / below;
}
