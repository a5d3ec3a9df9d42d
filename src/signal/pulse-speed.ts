import { PulseFinder, type PulseReading, type PulseTimes } from './pulse-times.ts';
import { repairPulses } from './repair-pulses.ts';
import { median } from './statistics.ts';

export interface PulseSettings extends PulseReading {
  readonly sampleRateHz: number;
  readonly pulsesPerTurn: number;
}

/** Running speed by counting pulses. */
export interface TurnSpeed {
  /** Whole turns over the time they took, Hz. */
  readonly meanHz: number;
  /** Of the mean, at about 95 %. */
  readonly uncertaintyHz: number;
  /** Slowest and fastest, over as many turns as the jitter of the pulses asks for. */
  readonly lowestHz: number;
  readonly highestHz: number;
  /** When each turn began and the last one ended, in samples from the first: one more than there are turns. */
  readonly turnTimes: Float64Array;
  /** Pulses that were put in because they must have been missed, and taken out because they came twice. */
  readonly missed: number;
  readonly doubled: number;
}

export interface NoTurnSpeed {
  /** Why, in words. */
  readonly refused: string;
}

/** Fewest whole turns that give a speed. */
const leastTurns = 3;
/** Largest part of the pulses that may have been repaired: more is no pulse channel, or another number of pulses a turn. */
const mostRepaired = 0.1;
/** The regular pulses must be this part of all. */
const leastRegular = 0.8;
/** Jitter that a rise of one sample has, in samples: its place within the sample is not known. */
const leastJitter = 0.3;
/** Part of the speed that jitter may add to the slowest and the fastest. */
const jitterInRange = 0.0005;

/**
 * Running speed from a pulse channel, fed in blocks of any size.
 *
 * Missed and doubled pulses are repaired by their neighbours (`repair-pulses.ts`); where one cannot be, the longest
 * regular stretch counts. A turn is timed by one and the same mark, so that marks need not be evenly spaced. Refused with
 * a reason where less than three turns, or too few regular pulses, are there.
 *
 * Checked: marks of two samples at 25.6 kHz and 24.37 Hz, 4 s: mean within 2e-5; a wheel of 60 teeth: within 1e-5.
 */
export class PulseSpeed {
  readonly #settings: PulseSettings;
  readonly #finder: PulseFinder;

  constructor(settings: PulseSettings) {
    this.#settings = settings;
    this.#finder = new PulseFinder(settings);
  }

  /** The array may be used again by the caller. */
  add(samples: Float64Array): void {
    this.#finder.add(samples);
  }

  finish(): TurnSpeed | NoTurnSpeed {
    return turnSpeed(this.#finder.finish(), this.#settings);
  }
}

/** As `PulseSpeed`, from the times of the pulses. */
export function turnSpeed(
  { times, samples, refused }: PulseTimes,
  { sampleRateHz, pulsesPerTurn }: Pick<PulseSettings, 'sampleRateHz' | 'pulsesPerTurn'>,
): TurnSpeed | NoTurnSpeed {
  if (refused !== null) return { refused };
  if (times.length < leastTurns + 1)
    return {
      refused: `${counted(times.length, 'pulse')}: the shaft stands still, or the sensor sees nothing`,
    };
  const repaired = repairPulses(times);
  const { missed, doubled } = repaired;
  if (missed + doubled > mostRepaired * times.length) {
    const what = `${missed} of ${times.length} pulses would be missing and ${doubled} too many`;
    return { refused: `${what}; compare pulses_per_turn and the threshold` };
  }
  const regular = repaired.longest;
  if (regular.length < leastRegular * repaired.pulses)
    return { refused: `the pulses are irregular; the longest row has ${regular.length} of ${times.length}` };
  const turns = Math.floor((regular.length - 1) / pulsesPerTurn);
  if (turns < leastTurns)
    return { refused: `${counted(turns, 'whole turn')}, at least ${leastTurns} are needed` };
  const turnTimes = Float64Array.from({ length: turns + 1 }, (_, turn) => regular[turn * pulsesPerTurn]);
  return { ...speedOf(turnTimes, samples, sampleRateHz), turnTimes, missed, doubled };
}

function speedOf(turnTimes: Float64Array, samples: number, sampleRateHz: number) {
  const turns = turnTimes.length - 1;
  const span = turnTimes[turns] - turnTimes[0];
  const perTurn = span / turns;
  const jitter = Math.max(leastJitter, jitterOf(turnTimes));
  const wanted = Math.ceil((Math.SQRT2 * jitter) / (jitterInRange * perTurn));
  const over = Math.max(1, Math.min(wanted, Math.floor(turns / 4)));
  let shortest = Number.POSITIVE_INFINITY;
  let longest = 0;
  for (let turn = over; turn <= turns; turn++) {
    const took = (turnTimes[turn] - turnTimes[turn - over]) / over;
    if (took < shortest) shortest = took;
    if (took > longest) longest = took;
  }
  const meanHz = sampleRateHz / perTurn;
  const [lowestHz, highestHz] = [sampleRateHz / longest, sampleRateHz / shortest];
  // Where no pulse is, the speed may have been anything within the range.
  const unseen = Math.max(0, 1 - (span + 2 * perTurn) / samples);
  const uncertaintyHz = (2 * Math.SQRT2 * jitter * meanHz) / span + 0.5 * unseen * (highestHz - lowestHz);
  return { meanHz, uncertaintyHz, lowestHz, highestHz };
}

/** Deviation of a turn's time from its neighbours', in samples; a speed that changes evenly adds next to nothing. */
function jitterOf(turnTimes: Float64Array): number {
  const bends = new Float64Array(turnTimes.length - 2);
  for (let n = 0; n < bends.length; n++)
    bends[n] = Math.abs(turnTimes[n + 2] - 2 * turnTimes[n + 1] + turnTimes[n]);
  // The second difference of independent errors has 6 times their variance; the median is 0.6745 deviations.
  return median(bends) / 0.6745 / Math.sqrt(6);
}

function counted(count: number, what: string): string {
  return `${count === 0 ? 'no' : count} ${what}${count === 1 ? '' : 's'}`;
}
