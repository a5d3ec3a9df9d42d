import { describe, expect, it } from 'vitest';
import { hopSamples } from '../../src/signal/averaging.ts';
import { symmetricEigenvalues, toeplitzEigenvalues } from '../../src/signal/eigenvalues.ts';
import { windowCorrelations } from '../../src/signal/overlap.ts';
import { logUpperTail, type QuadraticForm, upperPoint } from '../../src/signal/quadratic-form.ts';
import { averagedNoise, linesPerIndependentLine, noiseStatistics } from '../../src/signal/threshold.ts';
import { windowNames } from '../../src/signal/window.ts';
import { seededRandom } from './random.ts';

const form = (weights: number[], shapes: number[]): QuadraticForm => ({
  weights: Float64Array.from(weights),
  shapes: Float64Array.from(shapes),
});

describe('eigenvalues', () => {
  it.each([1, 2, 3, 10, 51])('of the second difference, %i rows, are 2 - 2 cos(k pi / (n + 1))', (n) => {
    const found = toeplitzEigenvalues([2, -1], n);
    for (let k = 1; k <= n; k++)
      expect(found[k - 1]).toBeCloseTo(2 - 2 * Math.cos((k * Math.PI) / (n + 1)), 12);
  });

  it('of a matrix with known ones, turned at random, are found again', () => {
    const random = seededRandom(20261201);
    const n = 9;
    const known = Float64Array.from({ length: n }, (_, i) => (i < 3 ? 1 : i * i - 20));
    const matrix = new Float64Array(n * n);
    for (let i = 0; i < n; i++) matrix[i * n + i] = known[i];
    // Reflections I - 2 v v' from both sides keep the eigenvalues.
    for (let turn = 0; turn < 4; turn++) {
      const v = Float64Array.from({ length: n }, () => random.gaussian());
      const norm = Math.hypot(...v);
      const reflect = (at: (k: number) => number): void => {
        let sum = 0;
        for (let k = 0; k < n; k++) sum += (v[k] / norm) * matrix[at(k)];
        for (let k = 0; k < n; k++) matrix[at(k)] -= (2 * sum * v[k]) / norm;
      };
      for (let i = 0; i < n; i++) reflect((k) => i * n + k);
      for (let j = 0; j < n; j++) reflect((k) => k * n + j);
    }
    const found = symmetricEigenvalues(matrix, n);
    known.sort().forEach((value, i) => {
      expect(found[i]).toBeCloseTo(value, 11);
    });
  });
});

describe('tail of a sum of weighted exponentials', () => {
  it('of one is exp(-x), far down as well', () => {
    for (const x of [1e-6, 0.01, 0.7, 1, 3, 20, 500])
      expect(logUpperTail(form([1], [1]), x) / -x).toBeCloseTo(1, 11);
  });

  it.each([2, 5, 31, 300])(
    'of %i equal ones is the Erlang tail, written as many or as one of that shape',
    (n) => {
      for (const x of [0.6, 0.9, 1, 1.1, 1.6, 3]) {
        let term = 1;
        let sum = 1;
        for (let k = 1; k < n; k++) {
          term *= (n * x) / k;
          sum += term;
        }
        const expected = Math.log(sum) - n * x;
        const many = logUpperTail(form(new Array(n).fill(1 / n), new Array(n).fill(1)), x);
        const one = logUpperTail(form([1 / n], [n]), x);
        for (const found of [many, one]) {
          expect(Math.abs(found - expected)).toBeLessThan(1e-11 * Math.max(1, Math.abs(expected)));
        }
      }
    },
  );

  it('of unequal ones is the sum by partial fractions', () => {
    const weights = [0.5, 0.3, 0.2];
    for (const x of [0.2, 1, 4, 15]) {
      const expected = weights.reduce((sum, w) => {
        const factor = weights.reduce((product, v) => (v === w ? product : product * (w / (w - v))), 1);
        return sum + factor * Math.exp(-x / w);
      }, 0);
      expect(Math.exp(logUpperTail(form(weights, [1, 1, 1]), x)) / expected).toBeCloseTo(1, 9);
    }
  });

  it('is that of chi-square for half a shape: 5 % over 3.841459', () => {
    expect(Math.exp(logUpperTail(form([2], [0.5]), 3.841458820694124))).toBeCloseTo(0.05, 12);
    expect(upperPoint(form([2], [0.5]), Math.log(0.001))).toBeCloseTo(10.827566, 5);
  });
});

describe('noise of an averaged line', () => {
  const shape = (window: (typeof windowNames)[number], overlapPercent: number, averages: number) => ({
    window,
    segmentSamples: 1024,
    hopSamples: hopSamples(1024, overlapPercent),
    averages,
  });

  it('three Hann averages at 50 % have the eigenvalues 1 and 1 +- sqrt(2) / 6', () => {
    const { weights } = averagedNoise(shape('hann', 50, 3));
    [1 - Math.SQRT2 / 6, 1, 1 + Math.SQRT2 / 6].forEach((value, i) => {
      expect(3 * weights[i]).toBeCloseTo(value, 10);
    });
  });

  it.each(windowNames)(
    '%s: the extrapolation past 128 averages agrees with all 300 eigenvalues',
    (window) => {
      for (const overlapPercent of [0, 50, 95]) {
        const long = averagedNoise(shape(window, overlapPercent, 300));
        const direct = toeplitzEigenvalues(correlationsOf(window, overlapPercent), 300).filter(
          (value) => value > 1e-9,
        );
        const exact = form(
          [...direct].map((value) => value / 300),
          new Array(direct.length).fill(1),
        );
        const x = upperPoint(exact, Math.log(1e-6));
        expect(Math.abs(logUpperTail(long, x) - logUpperTail(exact, x))).toBeLessThan(1e-6);
      }
    },
  );

  it('median over mean is ln 2 at one average and nears 1 with many', () => {
    expect(noiseStatistics(shape('hann', 50, 1)).medianOverMean).toBeCloseTo(Math.LN2, 8);
    expect(noiseStatistics(shape('hann', 50, 4000)).medianOverMean).toBeGreaterThan(0.9997);
  });

  it('the threshold over a floor known well is ln(1 / p) at one average, and higher over one known badly', () => {
    const threshold = noiseStatistics(shape('hann', 50, 1)).thresholds(1e-5);
    expect(threshold(1e9)).toBeCloseTo(Math.log(1e5), 3);
    expect(threshold(301)).toBeGreaterThan(1.03 * threshold(1e9));
    expect(threshold(31)).toBeGreaterThan(1.3 * threshold(301));
  });

  it('the median of correlated lines spreads as stated', () => {
    expect(linesPerIndependentLine('hann', 1024)).toBeCloseTo(35 / 18, 12);
    expect(linesPerIndependentLine('rectangular', 1024)).toBeCloseTo(1, 12);
    // One average, independent lines: 1 / (ln 2 sqrt n).
    const { medianDeviation } = noiseStatistics(shape('rectangular', 0, 1));
    expect(medianDeviation(301)).toBeCloseTo(1 / (Math.LN2 * Math.sqrt(301)), 3);
  });
});

function correlationsOf(window: (typeof windowNames)[number], overlapPercent: number): Float64Array {
  return windowCorrelations(window, 1024, hopSamples(1024, overlapPercent));
}
