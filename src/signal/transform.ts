import FFT from 'fft.js';
import { Kept } from './kept.ts';

/** What a transform of one length needs beside its input: the library's tables, and room for its result. */
interface Plan {
  readonly fft: FFT;
  readonly spectrum: Float64Array;
}

/** Plans are used one at a time and leave nothing behind, so all transforms of a length share one. */
const plans = new Kept<number, Plan>(18);
/** The plan of a longer transform takes more than 12 MB; it is made anew, which its own length dwarfs. */
const longestKept = 2 ** 18;

function planOf(length: number): Plan {
  const make = () => ({ fft: new FFT(length), spectrum: new Float64Array(2 * length) });
  return length > longestKept ? make() : plans.get(length, make);
}

/**
 * Power spectra of two real sequences from one complex transform: the first travels in the real parts, the second
 * in the imaginary parts, and the symmetry of real spectra takes them apart again.
 *
 * One object owns its input and its results; nothing is allocated by `run`.
 */
export class PairTransform {
  readonly length: number;
  /** Input: `packed[2n]` is sample n of the first sequence, `packed[2n + 1]` of the second. Kept by `run`. */
  readonly packed: Float64Array;
  /** |X[k]|² of the first sequence, k = 0 .. length / 2, after `run`. */
  readonly firstPower: Float64Array;
  /** |X[k]|² of the second sequence, k = 0 .. length / 2, after `run`. */
  readonly secondPower: Float64Array;
  private readonly plan: Plan;

  /** Throws a RangeError unless `length` is a power of two and at least 2. */
  constructor(length: number) {
    if (!isPowerOfTwo(length) || length < 2) {
      throw new RangeError(`length = ${length}: a transform needs a power of two, at least 2`);
    }
    this.length = length;
    this.plan = planOf(length);
    this.packed = new Float64Array(2 * length);
    this.firstPower = new Float64Array(length / 2 + 1);
    this.secondPower = new Float64Array(length / 2 + 1);
  }

  /** Transforms `packed` and leaves the two power spectra in `firstPower` and `secondPower`. */
  run(): void {
    const { length, firstPower, secondPower } = this;
    const { fft, spectrum: z } = this.plan;
    fft.transform(z, this.packed);
    firstPower[0] = z[0] * z[0];
    secondPower[0] = z[1] * z[1];
    for (let k = 1; k <= length / 2; k++) {
      const real = z[2 * k];
      const imaginary = z[2 * k + 1];
      const mirrorReal = z[2 * (length - k)];
      const mirrorImaginary = z[2 * (length - k) + 1];
      const firstReal = 0.5 * (real + mirrorReal);
      const firstImaginary = 0.5 * (imaginary - mirrorImaginary);
      const secondReal = 0.5 * (imaginary + mirrorImaginary);
      const secondImaginary = 0.5 * (mirrorReal - real);
      firstPower[k] = firstReal * firstReal + firstImaginary * firstImaginary;
      secondPower[k] = secondReal * secondReal + secondImaginary * secondImaginary;
    }
  }
}

/** Complex transform of one length; it owns its input and its result, nothing is allocated by `run`. */
export class ComplexTransform {
  readonly length: number;
  /** Input: real and imaginary parts in turn. Kept by `run`. */
  readonly input: Float64Array;
  /** X[k] = sum x[n] exp(-2 pi i k n / length), parts in turn, after `run`. */
  readonly result: Float64Array;
  private readonly fft: FFT;

  /** Throws a RangeError unless `length` is a power of two and at least 2. */
  constructor(length: number) {
    if (!isPowerOfTwo(length) || length < 2) {
      throw new RangeError(`length = ${length}: a transform needs a power of two, at least 2`);
    }
    this.length = length;
    this.fft = planOf(length).fft;
    this.input = new Float64Array(2 * length);
    this.result = new Float64Array(2 * length);
  }

  run(): Float64Array {
    this.fft.transform(this.result, this.input);
    return this.result;
  }
}

/** Whether `value` is 1, 2, 4, 8, ... up to 2^30. */
export function isPowerOfTwo(value: number): boolean {
  return Number.isInteger(value) && value > 0 && value <= 2 ** 30 && (value & (value - 1)) === 0;
}
