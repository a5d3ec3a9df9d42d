import { Kept } from './kept.ts';

export interface EqualAngleSettings {
  /** When each turn began and the last one ended, in samples from the first: ascending, at least 3. */
  readonly turnTimes: Float64Array;
  /** Samples wanted of each turn, at equal angles. */
  readonly samplesPerTurn: number;
}

/**
 * Sees the samples at equal angles, in order. `turnsPerSample` is the speed at each of them, in turns a sample. Both
 * arrays are lent for the call.
 */
export type AngleVisitor = (samples: Float64Array, turnsPerSample: Float64Array) => void;

/** Zero crossings of the interpolating function on either side. */
const crossings = 32;
/** Kaiser's (1974) beta for 90 dB. */
const beta = 8.96;
/** The interpolating function is tabulated; a straight line between two entries is good to 5e-6. */
const stepsPerCrossing = 512;
/** Middle of the transition, as a part of half the lower of the two sample rates. */
const cutoff = 0.9;
/** As far as this part of half the rate, tones come through whole; from 0.98 on they are 90 dB down. */
export const passband = 0.82;
const blockSamples = 8192;

/**
 * Samples at equal angles of the shaft from samples at equal times, so that the lines of a shaft whose speed moves stand
 * still (order tracking by interpolation; Fyfe & Munck 1997). Fed in blocks of any size, holds some hundred samples.
 *
 * The time of an angle is interpolated between the turns by a cubic through them with the slopes of their neighbours; the
 * sample there by a windowed sinc (Kaiser) whose cutoff is 0.9 of half the lower of the two rates, at every sample anew:
 * where the shaft turns slowly, what is too high for the samples of a turn is taken out instead of folding down.
 *
 * Error: tones up to 0.82 of half the lower rate come through within 2e-4 of their amplitude, others fold in by less than
 * 1e-4 from 0.98 on. The first and last angles, where the function reaches beyond the samples, are left out.
 */
export class EqualAngle {
  readonly #turnTimes: Float64Array;
  readonly #perTurn: number;
  readonly #visit: AngleVisitor;
  readonly #table = interpolatingTable();
  readonly #out = new Float64Array(blockSamples);
  readonly #speed = new Float64Array(blockSamples);
  #filled = 0;
  /** Samples that are still needed, from number `first` on. */
  #held = new Float64Array(0);
  #count = 0;
  #first = 0;
  #next = 0;

  constructor({ turnTimes, samplesPerTurn }: EqualAngleSettings, visit: AngleVisitor) {
    if (turnTimes.length < 3)
      throw new RangeError(`${turnTimes.length} times of turns: at least 3 are needed`);
    this.#turnTimes = turnTimes;
    this.#perTurn = samplesPerTurn;
    this.#visit = visit;
  }

  /** Takes the next samples; the array may be used again by the caller. */
  add(samples: Float64Array): void {
    this.#hold(samples);
    const last = (this.#turnTimes.length - 1) * this.#perTurn;
    const end = this.#first + this.#count;
    for (; this.#next <= last; this.#next++) {
      const { time, turnsPerSample } = this.#at(this.#next / this.#perTurn);
      const rate = cutoff * Math.min(1, this.#perTurn * turnsPerSample);
      const reach = crossings / rate;
      if (time + reach >= end) break;
      if (time - reach < this.#first) {
        // Before the first sample; of what was let go nothing is asked for again.
        if (this.#first > 0) throw new Error('turns are not in the order of time');
        continue;
      }
      this.#put(this.#sampleAt(time, rate, reach), turnsPerSample);
    }
    this.#letGo();
  }

  /** Hands over what is left. */
  finish(): void {
    if (this.#filled > 0)
      this.#visit(this.#out.subarray(0, this.#filled), this.#speed.subarray(0, this.#filled));
    this.#filled = 0;
  }

  #put(sample: number, turnsPerSample: number): void {
    this.#out[this.#filled] = sample;
    this.#speed[this.#filled] = turnsPerSample;
    this.#filled++;
    if (this.#filled === blockSamples) this.finish();
  }

  #sampleAt(time: number, rate: number, reach: number): number {
    const held = this.#held;
    const table = this.#table;
    const from = Math.ceil(time - reach) - this.#first;
    const to = Math.floor(time + reach) - this.#first;
    const scale = rate * stepsPerCrossing;
    let sum = 0;
    for (let n = from; n <= to; n++) {
      const at = Math.abs(n + this.#first - time) * scale;
      const entry = Math.trunc(at);
      const below = table[entry];
      sum += held[n] * (below + (at - entry) * (table[entry + 1] - below));
    }
    return rate * sum;
  }

  /** Time of an angle, in samples, and the speed there. */
  #at(turns: number): { readonly time: number; readonly turnsPerSample: number } {
    const times = this.#turnTimes;
    const turn = Math.min(times.length - 2, Math.floor(turns));
    const t = turns - turn;
    const [from, to] = [times[turn], times[turn + 1]];
    const fromSlope = slopeAt(times, turn);
    const toSlope = slopeAt(times, turn + 1);
    const bend = 3 * (to - from) - 2 * fromSlope - toSlope;
    const twist = fromSlope + toSlope - 2 * (to - from);
    const time = from + t * (fromSlope + t * (bend + t * twist));
    return { time, turnsPerSample: 1 / (fromSlope + t * (2 * bend + 3 * t * twist)) };
  }

  #hold(samples: Float64Array): void {
    if (this.#count + samples.length > this.#held.length) {
      const larger = new Float64Array(2 * (this.#count + samples.length));
      larger.set(this.#held.subarray(0, this.#count));
      this.#held = larger;
    }
    this.#held.set(samples, this.#count);
    this.#count += samples.length;
  }

  /** Samples before the reach of the next angle are needed no more. */
  #letGo(): void {
    const last = (this.#turnTimes.length - 1) * this.#perTurn;
    const end = this.#first + this.#count;
    let needed = end;
    if (this.#next <= last) {
      const { time, turnsPerSample } = this.#at(this.#next / this.#perTurn);
      const reach = crossings / (cutoff * Math.min(1, this.#perTurn * turnsPerSample));
      // Twice the reach: where the shaft slows down the next ones reach farther back.
      needed = Math.min(end, Math.floor(time - 2 * reach));
    }
    const gone = needed - this.#first;
    if (gone <= 0) return;
    this.#held.copyWithin(0, gone, this.#count);
    this.#count -= gone;
    this.#first += gone;
  }
}

/** Time that a turn takes at its begin: half of the two beside it, at the ends by a straight line of the speed. */
function slopeAt(times: Float64Array, turn: number): number {
  const last = times.length - 1;
  if (turn === 0) return 1.5 * (times[1] - times[0]) - 0.5 * (times[2] - times[1]);
  if (turn === last) return 1.5 * (times[last] - times[last - 1]) - 0.5 * (times[last - 1] - times[last - 2]);
  return 0.5 * (times[turn + 1] - times[turn - 1]);
}

const tables = new Kept<'table', Float64Array>(1);

/** sinc(u) times Kaiser's window over 32 crossings, u = 0, 1/512, ...; two zeros behind it. */
function interpolatingTable(): Float64Array {
  return tables.get('table', () => {
    const table = new Float64Array(crossings * stepsPerCrossing + 2);
    const whole = besselI0(beta);
    for (let n = 0; n < crossings * stepsPerCrossing; n++) {
      const u = n / stepsPerCrossing;
      const sinc = n === 0 ? 1 : Math.sin(Math.PI * u) / (Math.PI * u);
      table[n] = (sinc * besselI0(beta * Math.sqrt(1 - (u / crossings) ** 2))) / whole;
    }
    return table;
  });
}

/** Modified Bessel function of order 0 by its series. */
function besselI0(x: number): number {
  let sum = 1;
  let term = 1;
  for (let k = 1; term > 1e-17 * sum; k++) {
    term *= (x / (2 * k)) ** 2;
    sum += term;
  }
  return sum;
}
