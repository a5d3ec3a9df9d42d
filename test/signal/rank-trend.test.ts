import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { dependenceFactor, mannKendall, theilSen } from '../../src/signal/rank-trend.ts';

/** J. Little, College of the Holy Cross, 'A Mann-Kendall Example "By Hand"': 14 values, one tie. */
const little = [12.9, 14.8, 13.2, 15.7, 13.8, 15.6, 12.9, 11.0, 17.3, 15.9, 19.0, 18.3, 20.1, 21.7];

describe("Mann and Kendall's test", () => {
  it('gives the worked example of J. Little: S = 54, variance 332.67, Z = 2.9058, p = 0.0037', () => {
    const test = mannKendall(little);
    expect(test.s).toBe(54);
    expect(test.variance).toBeCloseTo(332.6667, 4);
    expect(test.z).toBeCloseTo(2.905837, 5);
    expect(test.p).toBeCloseTo(0.003663, 5);
  });

  // Upper tails for n values without ties: Gilbert (1987), Table A18; recomputed by counting orders.
  it.each([
    [4, 6, 0.04167],
    [5, 8, 0.04167],
    [6, 11, 0.02778],
    [7, 13, 0.03452],
    [8, 16, 0.03051],
    [9, 20, 0.02231],
    [10, 23, 0.02331],
  ])('is exact for %d values: P(S >= %d) = %f', (count, s, tail) => {
    expect(mannKendall(orderWith(count, s)).s).toBe(s);
    expect(mannKendall(orderWith(count, s)).p / 2).toBeCloseTo(tail, 5);
  });

  it('cannot be significant at 5 % with three values', () => {
    expect(mannKendall([1, 2, 3]).p).toBeCloseTo(1 / 3, 12);
  });

  it('turns its sign with the order of the values and sees no trend in equal ones', () => {
    expect(mannKendall([...little].reverse()).s).toBe(-54);
    expect(mannKendall([5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5, 5])).toMatchObject({ s: 0, z: 0, p: 1 });
  });
});

/** An order of 1..count with S = s: swap neighbours at the beginning until enough pairs fall. */
function orderWith(count: number, s: number): number[] {
  const values = Array.from({ length: count }, (_, n) => n);
  let falls = ((count * (count - 1)) / 2 - s) / 2;
  for (let pass = 0; falls > 0; pass++) {
    for (let n = 0; n < count - 1 - pass && falls > 0; n++, falls--) {
      [values[n], values[n + 1]] = [values[n + 1], values[n]];
    }
  }
  return values;
}

describe("Theil and Sen's line", () => {
  it('gives the slope and interval that SciPy gives for the values of J. Little', () => {
    const x = little.map((_, n) => n);
    const line = theilSen(x, little, 1.959963984540054);
    expect(line?.slope).toBeCloseTo(0.566667, 6);
    expect(line?.slopeLow).toBeCloseTo(0.325, 6);
    expect(line?.slopeHigh).toBeCloseTo(0.866667, 6);
  });

  it('does not move when a quarter of the values are wild', () => {
    const x = Array.from({ length: 40 }, (_, n) => n);
    const y = x.map((n) => 3 + 0.5 * n);
    const wild = y.map((value, n) => (n % 4 === 1 ? value + 1000 * (n % 3) : value));
    expect(theilSen(x, y, 2)?.slope).toBe(0.5);
    expect(theilSen(x, wild, 2)?.slope).toBeCloseTo(0.5, 1);
  });

  it('agrees with the plain definition, and its interval holds the slope', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -1e3, max: 1e3, noNaN: true }), { minLength: 3, maxLength: 25 }),
        (y) => {
          const x = y.map((_, n) => n);
          const slopes = x.flatMap((a) => x.filter((b) => b > a).map((b) => (y[b] - y[a]) / (b - a)));
          slopes.sort((a, b) => a - b);
          const middle = (slopes[(slopes.length - 1) >> 1] + slopes[slopes.length >> 1]) / 2;
          const line = theilSen(x, y, 1.96);
          expect(line?.slope).toBeCloseTo(middle, 9);
          expect(line?.slopeLow).toBeLessThanOrEqual(middle);
          expect(line?.slopeHigh).toBeGreaterThanOrEqual(middle);
        },
      ),
      { seed: 20261201 },
    );
  });

  it('is none where all readings are of one time', () => {
    expect(theilSen([2, 2, 2], [1, 2, 3], 2)).toBeNull();
  });
});

describe('dependence between neighbours', () => {
  it('widens the variance by 1 + 2 sum (1 - k/n) r^k, and never narrows it', () => {
    // Alternating values are less than independent.
    expect(dependenceFactor(Array.from({ length: 30 }, (_, n) => (n % 2 === 0 ? 1 : -1)))).toBe(1);
    // A slow wave is held at r = 0.7: 1 + 2 sum (1 - k/30) 0.7^k.
    const slow = Array.from({ length: 30 }, (_, n) => Math.sin((2 * Math.PI * n) / 30));
    const held = Array.from({ length: 29 }, (_, n) => (1 - (n + 1) / 30) * 0.7 ** (n + 1));
    expect(dependenceFactor(slow)).toBeCloseTo(1 + 2 * held.reduce((sum, part) => sum + part, 0), 12);
  });
});
