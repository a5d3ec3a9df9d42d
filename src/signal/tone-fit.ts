import { lobe } from './leakage.ts';
import { mainLobeHalfWidthLines, type WindowName, windowCoefficients } from './window.ts';

/** A sinusoid fitted to a few lines of a density. */
export interface ToneFit {
  /** Frequency in lines, with its fraction. */
  readonly line: number;
  /** Density that a line right at the frequency would show, floor taken off. */
  readonly density: number;
}

/** Lines on either side of the highest that are fitted: those of the main lobe that carry weight. */
const fittedSides: Readonly<Record<WindowName, number>> = {
  rectangular: 1,
  hann: 1,
  hamming: 1,
  blackman: 2,
  'blackman-harris': 2,
  'flat-top': 2,
};

/** What the fit needs to know of the window, gathered once a spectrum. */
export class ToneFitter {
  private readonly coefficients: readonly number[];
  private readonly sides: number;
  private readonly halfWidth: number;
  private readonly segmentSamples: number;
  private readonly magnitudes = new Float64Array(11);

  constructor(window: WindowName, segmentSamples: number) {
    this.coefficients = windowCoefficients(window);
    this.sides = fittedSides[window];
    this.halfWidth = mainLobeHalfWidthLines(window);
    this.segmentSamples = segmentSamples;
  }

  /**
   * Least squares of the square roots of the averaged lines around `peakLine`, floor taken off, against the window's
   * own main lobe (so noise weighs alike on every line). Near 0 and Nyquist, where the mirror image at the negative
   * frequency would show, it is part of the model. `isClean` tells whether a line is free of the leakage of other
   * tones; lines past the first that is not are left out, and with none left on either side the peak's line itself
   * is the answer.
   */
  fit(
    density: Float64Array,
    peakLine: number,
    floor: number,
    isClean: (line: number) => boolean = () => true,
  ): ToneFit {
    const cleanTo = (direction: 1 | -1, most: number): number => {
      let at = peakLine;
      while (Math.abs(at - peakLine) < most && isClean(at + direction)) at += direction;
      return Math.min(this.segmentSamples / 2 - 1, Math.max(1, at));
    };
    if (this.imageMatters(Math.min(peakLine, this.segmentSamples / 2 - peakLine))) {
      // The image adds an unknown, for which a further line is needed on either side.
      const from = cleanTo(-1, this.sides + 1);
      const to = cleanTo(1, this.sides + 1);
      if (to - from === 2 * (this.sides + 1)) return this.fitWithImage(density, peakLine, floor, from, to);
    }
    const from = cleanTo(-1, this.sides);
    const to = cleanTo(1, this.sides);
    // Of two lines the lower neighbour is mostly side lobe under the rectangular window.
    const onlyLower = to - from === 1 && density[from + to - peakLine] < density[3 * peakLine - from - to];
    if (from === to || (onlyLower && this.halfWidth === 1))
      return { line: peakLine, density: Math.max(0, density[peakLine] - floor) };
    return this.fitAlone(density, peakLine, floor, from, to);
  }

  private fitAlone(
    density: Float64Array,
    peakLine: number,
    floor: number,
    from: number,
    to: number,
  ): ToneFit {
    const { coefficients, magnitudes } = this;
    for (let k = from; k <= to; k++) magnitudes[k - from] = Math.sqrt(Math.max(0, density[k] - floor));
    const correlate = (offset: number): { gain: number; power: number } => {
      let product = 0;
      let power = 0;
      for (let k = from; k <= to; k++) {
        const reading = Math.abs(lobe(coefficients, k - peakLine - offset));
        product += reading * magnitudes[k - from];
        power += reading * reading;
      }
      return { gain: product * product, power };
    };
    const explained = (offset: number): number => {
      const { gain, power } = correlate(offset);
      return gain / power;
    };
    const offset = highest(explained, this.sides > 1 ? 1.5 : 0.6, 5);
    const { gain, power } = correlate(offset);
    return { line: peakLine + offset, density: gain / (power * power) };
  }

  private imageMatters(edge: number): boolean {
    // Side lobes fall at least as fast as those of a jump of the window's own size at its ends.
    const atEnds =
      this.coefficients.reduce((sum, a, k) => sum + (k % 2 === 0 ? a : -a), 0) / this.coefficients[0];
    return edge < 3 * this.halfWidth + 4 || Math.abs(atEnds) > 1e-3 * 2 * Math.PI * edge;
  }

  /**
   * A line reads A² (a² + b² + 2 c a b): a the lobe of the tone and b that of its image, each less what the removal of
   * the segments' mean takes away, c between -1 and 1 the mean cosine of the phase between them, the same on every
   * line. Linear in A² and A² c, so only the frequency is searched.
   */
  private fitWithImage(
    density: Float64Array,
    peakLine: number,
    floor: number,
    from: number,
    to: number,
  ): ToneFit {
    const solve = (offset: number) => this.solveImage(density, floor, from, to, peakLine + offset);
    const offset = highest((x) => -solve(x).misfit, this.sides > 1 ? 1.5 : 0.75, 24);
    return { line: peakLine + offset, density: solve(offset).density };
  }

  private solveImage(
    density: Float64Array,
    floor: number,
    from: number,
    to: number,
    line: number,
  ): { density: number; misfit: number } {
    const { coefficients, segmentSamples } = this;
    const meanPart =
      Math.sin(Math.PI * line) / (segmentSamples * Math.sin((Math.PI * line) / segmentSamples));
    const sums = { ss: 0, sx: 0, xx: 0, sy: 0, xy: 0, yy: 0 };
    for (let k = from; k <= to; k++) {
      const removed = meanPart * lobe(coefficients, k);
      const a = lobe(coefficients, k - line) - removed;
      const b = lobe(coefficients, k + line) + lobe(coefficients, k + line - segmentSamples) - removed;
      const y = Math.max(0, density[k] - floor);
      const s = a * a + b * b;
      const x = 2 * a * b;
      // The deviation of a line grows with the root of its own power.
      const weight = 1 / (y + floor + 1e-9 * density[Math.round(line)]);
      sums.ss += weight * s * s;
      sums.sx += weight * s * x;
      sums.xx += weight * x * x;
      sums.sy += weight * s * y;
      sums.xy += weight * x * y;
      sums.yy += weight * y * y;
    }
    const { ss, sx, xx, sy, xy, yy } = sums;
    const determinant = ss * xx - sx * sx;
    let power = sy / ss;
    let cosine = determinant > 1e-12 * ss * ss ? (ss * xy - sx * sy) / (xx * sy - sx * xy) : 0;
    if (!(Math.abs(cosine) <= 1)) cosine = Math.sign(cosine) || 0;
    power = (sy + cosine * xy) / (ss + 2 * cosine * sx + cosine * cosine * xx);
    const misfit =
      yy - 2 * power * (sy + cosine * xy) + power * power * (ss + 2 * cosine * sx + cosine * cosine * xx);
    return { density: Math.max(0, power), misfit };
  }
}

/**
 * Where a function of the offset is highest within +-`range`: a scan, then golden sections, to 1e-5, on both sides of
 * the best of the scan, because with a mirror image in the model two summits may lie close together about a line.
 */
function highest(value: (offset: number) => number, range: number, coarse: number): number {
  let best = 0;
  let bestValue = Number.NEGATIVE_INFINITY;
  for (let k = -coarse; k <= coarse; k++) {
    const at = value((k * range) / coarse);
    if (at > bestValue) {
      bestValue = at;
      best = (k * range) / coarse;
    }
  }
  const step = range / coarse;
  const below = summit(value, best - step, best);
  const above = summit(value, best, best + step);
  return value(below) > value(above) ? below : above;
}

function summit(value: (offset: number) => number, from: number, to: number): number {
  const golden = (Math.sqrt(5) - 1) / 2;
  let low = from;
  let high = to;
  let left = high - golden * (high - low);
  let right = low + golden * (high - low);
  let leftValue = value(left);
  let rightValue = value(right);
  while (high - low > 1e-5) {
    if (leftValue > rightValue) {
      high = right;
      right = left;
      rightValue = leftValue;
      left = high - golden * (high - low);
      leftValue = value(left);
    } else {
      low = left;
      left = right;
      leftValue = rightValue;
      right = low + golden * (high - low);
      rightValue = value(right);
    }
  }
  return 0.5 * (low + high);
}
