export interface WaveformValues {
  readonly mean: number;
  /** r.m.s. about the mean. */
  readonly rms: number;
  /** Largest distance from the mean. */
  readonly peak: number;
  /** peak / rms. */
  readonly crestFactor: number;
  /** m4 / m2²: 3 for Gaussian noise, 1.5 for a sine. */
  readonly kurtosis: number;
  /** m3 / m2^1.5: 0 for anything symmetrical. */
  readonly skewness: number;
}

/** Samples that are reduced together: large enough to be quick, small enough to stay in the cache. */
const blockSamples = 4096;

/** Count, mean and sums of the 2nd, 3rd and 4th powers of the distances from the mean. */
interface Moments {
  count: number;
  mean: number;
  m2: number;
  m3: number;
  m4: number;
}

/**
 * Waveform values of a recording that is fed in blocks of any size, bit for bit the same whatever their size.
 *
 * Blocks of 4096 samples are reduced about their own mean, then merged (Chan, Golub & LeVeque 1979 for the variance;
 * Pébay 2008, eq. 3.1, for the third and fourth power). All is counted from about the first block's mean, so
 * that a large steady offset costs no digits. The variance is the population's: divided by the count.
 *
 * The samples are finite numbers. A flat signal has no shape: crest factor, kurtosis and skewness are NaN; without any sample
 * all values are.
 */
export class Waveform {
  private readonly block = new Float64Array(blockSamples);
  private filled = 0;
  private shift = 0;
  private lowest = Number.POSITIVE_INFINITY;
  private highest = Number.NEGATIVE_INFINITY;
  private total: Moments = { count: 0, mean: 0, m2: 0, m3: 0, m4: 0 };

  /** Takes the next samples; the array may be reused by the caller afterwards. */
  add(samples: Float64Array): void {
    let taken = 0;
    while (taken < samples.length) {
      const part = Math.min(samples.length - taken, blockSamples - this.filled);
      this.block.set(samples.subarray(taken, taken + part), this.filled);
      this.filled += part;
      taken += part;
      if (this.filled === blockSamples) this.reduceBlock();
    }
  }

  /** The values of everything that was added. */
  finish(): WaveformValues {
    if (this.filled > 0) this.reduceBlock();
    const { count, mean, m2, m3, m4 } = this.total;
    if (count === 0) {
      const none = Number.NaN;
      return { mean: none, rms: none, peak: none, crestFactor: none, kurtosis: none, skewness: none };
    }
    const variance = m2 / count;
    const rms = Math.sqrt(variance);
    const peak = Math.max(this.highest - mean, mean - this.lowest);
    return {
      mean: this.shift + mean,
      rms,
      peak,
      crestFactor: peak / rms,
      kurtosis: m4 / count / (variance * variance),
      skewness: m3 / count / (variance * rms),
    };
  }

  /** Two passes over the block: its mean, then the powers about it; merged into the total. */
  private reduceBlock(): void {
    const { block, filled } = this;
    let sum = 0;
    if (this.total.count === 0) {
      for (let n = 0; n < filled; n++) sum += block[n];
      // A flat signal's mean may round to its neighbour and leave a deviation where there is none.
      this.shift = block.subarray(0, filled).every((value) => value === block[0]) ? block[0] : sum / filled;
      sum = 0;
    }
    const { shift } = this;
    for (let n = 0; n < filled; n++) {
      const value = block[n] - shift;
      block[n] = value;
      sum += value;
      if (value < this.lowest) this.lowest = value;
      if (value > this.highest) this.highest = value;
    }
    const mean = sum / filled;
    let m2 = 0;
    let m3 = 0;
    let m4 = 0;
    for (let n = 0; n < filled; n++) {
      const distance = block[n] - mean;
      const square = distance * distance;
      m2 += square;
      m3 += square * distance;
      m4 += square * square;
    }
    this.total = merge(this.total, { count: filled, mean, m2, m3, m4 });
    this.filled = 0;
  }
}

/** Waveform values of samples that are at hand as a whole. */
export function waveformValues(samples: Float64Array): WaveformValues {
  const waveform = new Waveform();
  waveform.add(samples);
  return waveform.finish();
}

function merge(a: Moments, b: Moments): Moments {
  if (a.count === 0) return b;
  const count = a.count + b.count;
  const step = (b.mean - a.mean) / count;
  const { count: na } = a;
  const { count: nb } = b;
  return {
    count,
    mean: a.mean + nb * step,
    m2: a.m2 + b.m2 + step * step * count * na * nb,
    m3: a.m3 + b.m3 + step ** 3 * count * na * nb * (na - nb) + 3 * step * (na * b.m2 - nb * a.m2),
    m4:
      a.m4 +
      b.m4 +
      step ** 4 * count * na * nb * (na * na - na * nb + nb * nb) +
      6 * step * step * (na * na * b.m2 + nb * nb * a.m2) +
      4 * step * (na * b.m3 - nb * a.m3),
  };
}
