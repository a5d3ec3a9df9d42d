/** The part of fft.js 4 that is used here; the package ships no types of its own. */
declare module 'fft.js' {
  class FFT {
    /** `size` is a power of two, at least 2. */
    constructor(size: number);
    readonly size: number;
    /** `out` and `data` hold real and imaginary parts in turn, 2 * size numbers each, and must differ. */
    transform(out: Float64Array | number[], data: Float64Array | number[]): void;
    /** As `transform`, from `size` real numbers; fills lines 0 to size / 2 only. */
    realTransform(out: Float64Array | number[], data: Float64Array | number[]): void;
    /** Fills the upper half of `spectrum` from the lower one by symmetry. */
    completeSpectrum(spectrum: Float64Array | number[]): void;
    /** Includes the division by `size`. */
    inverseTransform(out: Float64Array | number[], data: Float64Array | number[]): void;
    createComplexArray(): number[];
  }
  export = FFT;
}
