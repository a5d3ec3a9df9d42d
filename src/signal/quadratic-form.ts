/**
 * A sum of weighted gamma numbers, sum_i weights[i] G(shapes[i]): shape 1 is the power of a complex Gaussian number
 * (a unit exponential), shape 1/2 half the square of a real one. Averaged noise of every kind has this form.
 */
export interface QuadraticForm {
  /** Positive. */
  readonly weights: Float64Array;
  /** As long as `weights`. Negative shapes are allowed where the form is an extrapolation in the number of terms. */
  readonly shapes: Float64Array;
}

/**
 * ln P(form > x), good to about 1e-12 of the smaller of P and 1 - P, weights equal or not, P down to e^-600 and below.
 *
 * The inversion integral of the moment generating function along a parabola through its saddle point (Rice 1980;
 * Helstrom 1983), by the trapezoidal rule, which converges exponentially there. The far tail keeps its relative
 * accuracy because the value at the saddle is factored out; Imhof's integral (1961) would lose it, and partial
 * fractions fail on near-equal weights. Checked: one weight 1, shape 1, x = 20: -20.
 */
export function logUpperTail(form: QuadraticForm, x: number): number {
  if (x <= 0) return 0;
  return x > mean(form) ? logTail(form, x, 1) : Math.log1p(-Math.exp(logTail(form, x, -1)));
}

/** ln P(form > x) with the contour right of the pole at 0 (side 1), ln P(form < x) left of it (side -1). */
function logTail(form: QuadraticForm, x: number, side: 1 | -1): number {
  const saddle = findSaddle(form, x, side);
  const { second, third } = derivatives(form, saddle);
  // Steepest descent leaves the saddle with this bend of Re s = saddle + bend y² / 2. The parabola must open to the
  // right, where exp(-s x) decays, and keep as far from the first pole of M as the path of a single term does.
  const toPole = 1 / largest(form.weights) - saddle;
  const bend = Math.min(0.7, Math.max(0.1, (toPole * third) / (3 * second))) / toPole;
  const step = 0.2 / Math.sqrt(second);
  const top = phase(form, x, saddle, 0, side);
  let sum = 0.5;
  for (let k = 1; k <= 4000; k++) {
    const y = k * step;
    const at = phase(form, x, saddle + 0.5 * bend * y * y, y, side);
    const size = Math.exp(at.real - top.real);
    // Real part of exp(i angle) (1 - i bend y).
    sum += size * (Math.cos(at.angle) + bend * y * Math.sin(at.angle));
    if (size * (1 + bend * y) < 1e-15) break;
  }
  return Math.min(0, top.real + Math.log((sum * step) / Math.PI));
}

/** The x that the form passes with probability exp(`logProbability`). */
export function upperPoint(form: QuadraticForm, logProbability: number): number {
  let low = 0;
  let high = 2 * mean(form);
  while (logUpperTail(form, high) > logProbability) {
    low = high;
    high *= 2;
  }
  let lowValue = low === 0 ? 0 : logUpperTail(form, low);
  let highValue = logUpperTail(form, high);
  // Regula falsi (Illinois form): ln P falls smoothly and nearly straight.
  for (let k = 0; k < 80 && high - low > 1e-10 * high; k++) {
    const share = (lowValue - logProbability) / (lowValue - highValue);
    const x = low + (high - low) * Math.min(0.98, Math.max(0.02, share));
    const value = logUpperTail(form, x);
    if (value > logProbability) {
      low = x;
      lowValue = value;
      highValue = 0.5 * (highValue + logProbability);
    } else {
      high = x;
      highValue = value;
      lowValue = 0.5 * (lowValue + logProbability);
    }
  }
  return 0.5 * (low + high);
}

function mean({ weights, shapes }: QuadraticForm): number {
  let sum = 0;
  for (let i = 0; i < weights.length; i++) sum += weights[i] * shapes[i];
  return sum;
}

function largest(weights: Float64Array): number {
  let found = 0;
  for (const weight of weights) found = Math.max(found, weight);
  return found;
}

/**
 * Where the exponent ln M(s) - s x - ln |s| is stationary: between 0 and the pole at one over the largest weight
 * (side 1), or below 0 (side -1). Its slope rises all the way on either side.
 */
function findSaddle({ weights, shapes }: QuadraticForm, x: number, side: 1 | -1): number {
  const pole = 1 / largest(weights);
  let low = side === 1 ? 0 : Number.NEGATIVE_INFINITY;
  let high = side === 1 ? pole : 0;
  let s = side === 1 ? Math.min(0.5 * pole, 1 / x) : -pole;
  for (let k = 0; k < 200; k++) {
    let first = -x - 1 / s;
    let second = 1 / (s * s);
    for (let i = 0; i < weights.length; i++) {
      const ratio = weights[i] / (1 - weights[i] * s);
      first += shapes[i] * ratio;
      second += shapes[i] * ratio * ratio;
    }
    if (first > 0) high = s;
    else low = s;
    let next = s - first / second;
    if (!(next > low && next < high)) next = low === Number.NEGATIVE_INFINITY ? 2 * s : 0.5 * (low + high);
    if (Math.abs(next - s) < 1e-9 * Math.abs(s)) return next;
    s = next;
  }
  return s;
}

function derivatives({ weights, shapes }: QuadraticForm, s: number): { second: number; third: number } {
  let second = 1 / (s * s);
  let third = -2 / s ** 3;
  for (let i = 0; i < weights.length; i++) {
    const ratio = weights[i] / (1 - weights[i] * s);
    second += shapes[i] * ratio ** 2;
    third += 2 * shapes[i] * ratio ** 3;
  }
  return { second, third };
}

/** ln M(s) - s x - ln (side s) at s = real + i imaginary, imaginary >= 0. */
function phase(
  { weights, shapes }: QuadraticForm,
  x: number,
  real: number,
  imaginary: number,
  side: 1 | -1,
): { real: number; angle: number } {
  let size = -real * x - 0.5 * Math.log(real * real + imaginary * imaginary);
  let angle = -imaginary * x - Math.atan2(side * imaginary, side * real);
  for (let i = 0; i < weights.length; i++) {
    const a = 1 - weights[i] * real;
    const b = weights[i] * imaginary;
    size -= 0.5 * shapes[i] * Math.log(a * a + b * b);
    angle += shapes[i] * Math.atan2(b, a);
  }
  return { real: size, angle };
}
