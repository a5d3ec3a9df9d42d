import { describe, expect, it } from 'vitest';
import { crossingOf } from '../../src/prognosis/crossing.ts';
import { fitLine } from '../../src/signal/line-fit.ts';

/** Weekly values of a made-up example, computed with SciPy: the line reaches 4.5 in week 21.140. */
const weekly = [2.0, 2.1, 2.3, 2.2, 2.5, 2.6, 2.6, 2.9];

function lineOf(values: readonly number[]) {
  const fit = fitLine(
    values.map((_, week) => week),
    values,
  );
  if (fit === null) throw new Error('no line');
  return {
    x: fit.xMean,
    y: fit.yMean,
    slope: fit.slope,
    yVariance: fit.residualDeviation ** 2 / fit.points,
    slopeVariance: fit.slopeError ** 2,
  };
}

/** Student's t, 6 degrees, 0.975. */
const t = 2.4469118511;

describe('where a line reaches a limit', () => {
  it('gives the interval of the line that solving for its 95 % bounds gives', () => {
    const crossing = crossingOf(lineOf(weekly), 4.5, t);
    expect(crossing?.at).toBeCloseTo(21.14, 3);
    expect(crossing?.earliest).toBeCloseTo(17.306, 3);
    expect(crossing?.latest).toBeCloseTo(27.836, 3);
  });

  it('has no latest time where the slope may be none: g = (t s_b / b)² is 1 or more', () => {
    const doubtful = { ...lineOf(weekly), slopeVariance: (0.119048 / t) ** 2 * 1.2 };
    const crossing = crossingOf(doubtful, 4.5, t);
    expect(crossing?.latest).toBeNull();
    expect(crossing?.earliest).toBeGreaterThan(3.5);
    expect(crossing?.earliest).toBeLessThan(21.14);
  });

  it('meets the limit at both ends of its interval', () => {
    const line = lineOf(weekly);
    const crossing = crossingOf(line, 4.5, t);
    for (const [x, side] of [
      [crossing?.earliest ?? 0, 1],
      [crossing?.latest ?? 0, -1],
    ]) {
      const half = t * Math.sqrt(line.yVariance + (x - line.x) ** 2 * line.slopeVariance);
      expect(line.y + line.slope * (x - line.x) + side * half).toBeCloseTo(4.5, 9);
    }
  });

  it('is none where the line is level', () => {
    expect(crossingOf({ ...lineOf(weekly), slope: 0 }, 4.5, t)).toBeNull();
  });
});
