/**
 * How far the kurtosis of a band of stationary Gaussian noise strays. With E the squared magnitudes of n independent
 * complex Gaussian values, K = n sum E² / (sum E)² - 2. K does not depend on sum E (Basu 1955), so that its moments are
 * exact: E[(K + 2)^r] = n^r E[(sum E²)^r] / E[(sum E)^2r], sum E being gamma distributed. From the first four, its upper
 * quantiles follow by Cornish & Fisher (1938). It is skew: 10 / sqrt n in the limit.
 *
 * Values that follow each other in a filtered band are correlated by rho. K is in first order the mean of the second
 * Laguerre polynomial of E, whose correlation is |rho|^4, so that N values are worth N / sum |rho|^4 independent ones.
 */
import { gaussianQuantile } from './statistics.ts';
import { ComplexTransform } from './transform.ts';

/** Independent values that one of a band's values is worth; `amplitudes`: of its lines, within `lines` of its transform. */
export function worthOfValue(amplitudes: Float64Array, lines: number): number {
  const transform = new ComplexTransform(lines);
  let power = 0;
  for (const [i, amplitude] of amplitudes.entries()) {
    transform.input[2 * i] = amplitude * amplitude;
    power += amplitude * amplitude;
  }
  const correlation = transform.run();
  let sum = 0;
  for (let m = 0; m < lines; m++) {
    sum += ((correlation[2 * m] ** 2 + correlation[2 * m + 1] ** 2) / (power * power)) ** 2;
  }
  return 1 / sum;
}

/** Fewest independent values for which the quantiles are good. */
export const leastKurtosisValues = 400;

/**
 * Kurtosis (0 for noise) that noise of so many independent values exceeds with this probability; infinite below
 * `leastKurtosisValues`. Checked by simulation.
 */
export function kurtosisOfNoise(values: number, probability: number): number {
  if (!(values >= leastKurtosisValues)) return Number.POSITIVE_INFINITY;
  const [first, second, third, fourth] = moments(values);
  const variance = second - first ** 2;
  const deviation = Math.sqrt(variance);
  const skewness = (third - 3 * first * second + 2 * first ** 3) / deviation ** 3;
  const excess = (fourth - 4 * first * third + 6 * first ** 2 * second - 3 * first ** 4) / variance ** 2 - 3;
  const z = gaussianQuantile(1 - probability);
  const stretched =
    z +
    (skewness / 6) * (z * z - 1) +
    (excess / 24) * (z ** 3 - 3 * z) -
    (skewness ** 2 / 36) * (2 * z ** 3 - 5 * z);
  return first + deviation * stretched;
}

/** Moments 1 to 4 of K: those of sum E² by the moments k! of an exponential, over those of (sum E)². */
function moments(n: number): [number, number, number, number] {
  const [a, b, c, d] = [2, 24, 720, 40_320];
  const two = n - 1;
  const three = two * (n - 2);
  const four = three * (n - 3);
  const squares = [
    n * a,
    n * (b + two * a * a),
    n * (c + 3 * two * b * a + three * a ** 3),
    n * (d + two * (4 * c * a + 3 * b * b) + 6 * three * b * a * a + four * a ** 4),
  ];
  let power = 1;
  let scale = 1;
  const raw = squares.map((square, r) => {
    power *= (n + 2 * r) * (n + 2 * r + 1);
    scale *= n;
    return (scale * square) / power;
  });
  return shifted(raw);
}

/** Moments about 2 in place of 0. */
function shifted([m1, m2, m3, m4]: readonly number[]): [number, number, number, number] {
  return [m1 - 2, m2 - 4 * m1 + 4, m3 - 6 * m2 + 12 * m1 - 8, m4 - 8 * m3 + 24 * m2 - 32 * m1 + 16];
}
