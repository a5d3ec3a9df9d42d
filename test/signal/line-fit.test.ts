import { describe, expect, it } from 'vitest';
import { fitLine, lineAt, slopeHalfWidth } from '../../src/signal/line-fit.ts';

/** NIST Statistical Reference Datasets, linear regression, 'Norris' (calibration of ozone monitors), 36 observations. */
const norrisX = [
  0.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777.0, 558.2, 0.4, 0.6, 775.5, 666.9, 338.0,
  447.5, 11.6, 556.0, 228.1, 995.8, 887.6, 120.2, 0.3, 0.3, 556.8, 339.1, 887.2, 999.0, 779.0, 11.1, 118.3,
  229.2, 669.1, 448.9, 0.5,
];
const norrisY = [
  0.1, 338.8, 118.1, 888.0, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, 0.3, 0.1, 778.1, 668.8, 339.3,
  448.9, 10.8, 557.7, 228.3, 998.0, 888.8, 119.6, 0.3, 0.6, 557.6, 339.3, 888.0, 998.5, 778.9, 10.2, 117.6,
  228.9, 668.4, 449.2, 0.2,
];

/** Berthouex & Brown, Statistics for Environmental Engineers (2002), Table 34.1, after Bailey, Cox & Springer (1978). */
const leadX = [
  0.18, 0.35, 0.055, 0.022, 0.29, 0.15, 0.044, 0.028, 0.044, 0.073, 0.13, 0.088, 0.26, 0.16, 0.1,
];
const leadY = [
  26.666, 50.651, 9.628, 4.634, 40.206, 21.369, 5.948, 4.245, 4.786, 11.321, 18.456, 12.865, 35.186, 24.245,
  14.175,
];

const fitted = (x: readonly number[], y: readonly number[]) => {
  const fit = fitLine(x, y);
  if (fit === null) throw new Error('no line');
  return fit;
};
const relative = (value: number, certified: number) => Math.abs(value / certified - 1);

describe('a straight line through readings', () => {
  it('gives the certified values of NIST, Norris, to ten digits', () => {
    const fit = fitted(norrisX, norrisY);
    expect(relative(fit.intercept, -0.262323073774029)).toBeLessThan(1e-10);
    expect(relative(fit.slope, 1.00211681802045)).toBeLessThan(1e-10);
    expect(relative(fit.interceptError, 0.232818234301152)).toBeLessThan(1e-10);
    expect(relative(fit.slopeError, 0.429796848199937e-3)).toBeLessThan(1e-10);
    expect(relative(fit.residualDeviation, 0.884796396144373)).toBeLessThan(1e-10);
  });

  // Computed with SciPy from the certified line; t(34 degrees) = 2.032245.
  it.each([
    [500, 500.796086, 0.307889, 1.824292],
    [1000, 1001.854495, 0.589225, 1.892203],
  ])('gives the intervals of the line and of one reading at x = %d (Norris)', (x, value, line, reading) => {
    const at = lineAt(fitted(norrisX, norrisY), x, 95);
    expect(at.value).toBeCloseTo(value, 5);
    expect(at.lineHalfWidth).toBeCloseTo(line, 5);
    expect(at.readingHalfWidth).toBeCloseTo(reading, 5);
  });

  it('gives the book values of Berthouex & Brown 2002, chapter 34', () => {
    const fit = fitted(leadX, leadY);
    expect(fit.intercept).toBeCloseTo(0.5665, 3);
    expect(fit.interceptError).toBeCloseTo(0.473, 3);
    expect(fit.slope).toBeCloseTo(139.759, 3);
    expect(fit.slopeError).toBeCloseTo(2.889, 3);
    expect(slopeHalfWidth(fit, 95)).toBeCloseTo(6.2414, 3);
    const at = lineAt(fit, 0.2, 95);
    expect(at.value).toBeCloseTo(28.5182, 3);
    expect(at.lineHalfWidth).toBeCloseTo(0.7442, 3);
    expect(at.readingHalfWidth).toBeCloseTo(2.4752, 3);
  });

  it('is none through two readings, or through readings at one x', () => {
    expect(fitLine([1, 2], [1, 2])).toBeNull();
    expect(fitLine([3, 3, 3], [1, 2, 4])).toBeNull();
  });
});
