/** How a pulse channel is read. */
export interface PulseReading {
  /** Value that a pulse rises through, in the unit of the samples; null: halfway between the channel's two levels. */
  readonly threshold: number | null;
}

export interface PulseTimes {
  /** When each pulse rose through the threshold, in samples from the first, with its fraction. */
  readonly times: Float64Array;
  /** Samples that were fed. */
  readonly samples: number;
  /** Set where pulses are missing from `times` for a reason of the channel as a whole. */
  readonly refused: string | null;
}

/** Samples whose range is looked at together: a usual recording as a whole. */
const stretchSamples = 2 ** 20;
/** Part of the samples at either end of the range that may be spikes: a pulse lasts longer. */
const spikes = 0.0005;
/**
 * A pulse has risen, or fallen, when it is past the threshold by this part of the range: noise of a twentieth of the
 * range, and the overshoot of a cable, count for nothing.
 */
const hysteresis = 0.15;
/** A stretch that moves by less than this part of the widest one holds no pulses: the shaft stood still. */
const leastRange = 0.25;
/** Bounds the memory; at 60 pulses a turn and 50 Hz it is 20 minutes. */
const mostPulses = 2 ** 22;

interface Stretch {
  readonly range: number;
  readonly times: number[];
}

/**
 * Finds the rises of a pulse channel that is fed in blocks of any size. A rise counts once the signal has been below
 * the lower of two thresholds and passes the upper; its time is where it crossed the middle, on a straight line between
 * two samples, so that it is good to a fraction of a sample. Samples that are no numbers are passed over.
 *
 * The two levels are those that all but 0.05 % of the samples keep to, found over stretches of 2^20 samples.
 */
export class PulseFinder {
  readonly #reading: PulseReading;
  readonly #stretches: Stretch[] = [];
  #buffer = new Float64Array(2 ** 15);
  #filled = 0;
  #before = 0;
  #pulses = 0;
  #low = false;
  #crossing = Number.NaN;
  #last = Number.NaN;

  constructor(reading: PulseReading) {
    this.#reading = reading;
  }

  /** The array may be used again by the caller. */
  add(samples: Float64Array): void {
    for (let taken = 0; taken < samples.length; ) {
      const part = Math.min(samples.length - taken, stretchSamples - this.#filled);
      this.#makeRoom(this.#filled + part);
      this.#buffer.set(samples.subarray(taken, taken + part), this.#filled);
      this.#filled += part;
      taken += part;
      if (this.#filled === stretchSamples) this.#endStretch();
    }
  }

  finish(): PulseTimes {
    this.#endStretch();
    const widest = this.#stretches.reduce((most, { range }) => Math.max(most, range), 0);
    const moved = this.#stretches.filter(({ range }) => range >= leastRange * widest);
    const refused =
      widest === 0
        ? 'the channel does not move'
        : this.#pulses > mostPulses
          ? `it has more than ${mostPulses} pulses`
          : null;
    const times =
      refused === null ? Float64Array.from(moved.flatMap((one) => one.times)) : new Float64Array(0);
    return { times, samples: this.#before, refused };
  }

  #makeRoom(samples: number): void {
    if (samples <= this.#buffer.length) return;
    const larger = new Float64Array(Math.min(stretchSamples, Math.max(samples, 2 * this.#buffer.length)));
    larger.set(this.#buffer.subarray(0, this.#filled));
    this.#buffer = larger;
  }

  #endStretch(): void {
    const samples = this.#buffer.subarray(0, this.#filled);
    const levels = twoLevels(samples);
    if (levels !== null) {
      const range = levels.high - levels.low;
      const times = this.#pulses > mostPulses ? [] : this.#rises(samples, levels);
      this.#pulses += times.length;
      this.#stretches.push({ range, times });
    }
    this.#before += this.#filled;
    this.#filled = 0;
  }

  #rises(samples: Float64Array, { low, high }: Levels): number[] {
    const middle = this.#reading.threshold ?? 0.5 * (low + high);
    const reach = hysteresis * (high - low);
    // A threshold of somebody's own may lie near one of the levels.
    const upper = Math.min(middle + reach, 0.5 * (middle + high));
    const lower = Math.max(middle - reach, 0.5 * (middle + low));
    const times: number[] = [];
    if (!(lower < middle && middle < upper)) return times;
    let last = this.#last;
    let isLow = this.#low;
    let crossing = this.#crossing;
    for (let n = 0; n < samples.length; n++) {
      const value = samples[n];
      if (Number.isNaN(value)) continue;
      if (value >= middle && last < middle) crossing = this.#before + n - (value - middle) / (value - last);
      if (value <= lower) isLow = true;
      else if (value >= upper && isLow) {
        isLow = false;
        times.push(crossing);
      }
      last = value;
    }
    this.#last = last;
    this.#low = isLow;
    this.#crossing = crossing;
    return times;
  }
}

interface Levels {
  readonly low: number;
  readonly high: number;
}

const bins = 2048;

/** The levels between which all but a few samples lie; null where they do not move. Counted in ever narrower bins. */
function twoLevels(samples: Float64Array): Levels | null {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  let finite = 0;
  for (const value of samples) {
    if (!Number.isFinite(value)) continue;
    finite++;
    if (value < low) low = value;
    if (value > high) high = value;
  }
  const few = Math.floor(spikes * finite);
  for (let round = 0; round < 3 && high > low; round++) {
    const counts = new Uint32Array(bins);
    const perUnit = bins / (high - low);
    let below = 0;
    let above = 0;
    for (const value of samples) {
      if (value < low) below++;
      else if (value > high) above++;
      else if (value >= low) counts[Math.min(bins - 1, Math.floor((value - low) * perUnit))]++;
    }
    let first = 0;
    for (; below + counts[first] <= few && first < bins - 1; first++) below += counts[first];
    let last = bins - 1;
    for (; above + counts[last] <= few && last > first; last--) above += counts[last];
    const [from, to] = [low + first / perUnit, low + (last + 1) / perUnit];
    const isSettled = to - from > 0.5 * (high - low);
    [low, high] = [from, to];
    if (isSettled) break;
  }
  return high > low ? { low, high } : null;
}
