/** A line that stands out of the floor of a spectrum. */
export interface StandingLine {
  readonly frequencyHz: number;
  /** r.m.s. in the unit of the spectrum. */
  readonly level: number;
  readonly aboveFloorDb: number;
}

/** A shaft as it was seen to turn. */
export interface SeenShaft {
  readonly hz: number;
  readonly uncertaintyHz: number;
  /** Harmonics of it that may be taken for something else; the machine's own shaft: all. */
  readonly harmonics: number;
}

export interface SearchedSpectrum {
  readonly lines: readonly StandingLine[];
  readonly lineSpacingHz: number;
  /** The range in which lines were looked for. */
  readonly fromHz: number;
  readonly toHz: number;
}

/** Lines at least so many line spacings off a shaft's harmonic can be told from it: the main lobe of the window. */
export const separationLines = 2;
/** A line of a family lies this near its place, in line spacings: what interpolation in noise and uneven speed leave. */
export const toleranceLines = 1;

/** Counts of strongest lines at which families are tried. */
const rungs = [2, 3, 5, 8, 13, 21, 34, 55, 89, 144, 233];
/** Bins an octave in which the crowd of lines is counted; what counts is the crowd within an octave around. */
const binsPerOctave = 2;

/**
 * The lines of a spectrum that can be told from harmonics of the shafts, strongest over the floor first, and how
 * crowded they are: what a family of lines must beat to be more than accident.
 */
export class FreeLines {
  readonly lines: readonly StandingLine[];
  readonly lineSpacingHz: number;
  readonly fromHz: number;
  readonly toHz: number;
  readonly rungs: readonly number[];
  readonly #shafts: readonly SeenShaft[];
  readonly #byFrequency: readonly number[];
  readonly #crowd: readonly Float64Array[];
  readonly #free: Float64Array;

  /** `before`: of the same spectrum with more lines; what of the range is free need not be worked out again. */
  constructor(spectrum: SearchedSpectrum, shafts: readonly SeenShaft[], before: FreeLines | null = null) {
    const { lineSpacingHz, fromHz, toHz } = spectrum;
    this.lineSpacingHz = lineSpacingHz;
    this.fromHz = fromHz;
    this.toHz = toHz;
    this.#shafts = shafts;
    this.lines = spectrum.lines
      .filter(({ frequencyHz }) => this.isFree(frequencyHz))
      .sort((a, b) => b.aboveFloorDb - a.aboveFloorDb);
    this.#byFrequency = this.lines
      .map((_, rank) => rank)
      .sort((a, b) => this.lines[a].frequencyHz - this.lines[b].frequencyHz);
    const useful = rungs.filter((rung) => rung < this.lines.length);
    this.rungs = this.lines.length === 0 ? [] : [...useful, this.lines.length];
    if (before !== null) this.#free = before.#free;
    else this.#free = this.lines.length === 0 ? new Float64Array(0) : this.#freeWidths();
    this.#crowd = this.rungs.map((rung) => this.#crowdOf(rung, this.#free));
  }

  /** In the range, and told from every harmonic of the shafts. */
  isFree(frequencyHz: number): boolean {
    return (
      frequencyHz >= this.fromHz &&
      frequencyHz <= this.toHz &&
      this.#shafts.every((shaft) => isSeparable(frequencyHz, shaft, this.lineSpacingHz))
    );
  }

  /** The rank of the strongest line within the tolerance of a place; -1 where none stands there. */
  rankAt(frequencyHz: number, toleranceHz: number): number {
    const order = this.#byFrequency;
    let low = 0;
    let high = order.length;
    while (low < high) {
      const middle = (low + high) >> 1;
      if (this.lines[order[middle]].frequencyHz < frequencyHz - toleranceHz) low = middle + 1;
      else high = middle;
    }
    let best = -1;
    for (; low < order.length && this.lines[order[low]].frequencyHz <= frequencyHz + toleranceHz; low++) {
      if (best < 0 || order[low] < best) best = order[low];
    }
    return best;
  }

  /** Chance that one of the strongest lines (`rungs[rung]` of them) stands within the tolerance of a place by accident. */
  chanceAt(rung: number, frequencyHz: number, toleranceHz: number): number {
    const bin = binOf(frequencyHz, this.fromHz);
    const crowd = this.#crowd[rung];
    return Math.min(1, 2 * toleranceHz * crowd[Math.min(bin, crowd.length - 1)]);
  }

  /** Hz of each bin in which a line could be free. */
  #freeWidths(): Float64Array {
    const bins = new Float64Array(binOf(this.toHz, this.fromHz) + 1);
    const step = this.lineSpacingHz;
    for (let hz = this.fromHz; hz <= this.toHz; hz += step)
      if (this.isFree(hz)) bins[binOf(hz, this.fromHz)] += step;
    return bins;
  }

  /** Lines a hertz around each bin but for the one that may be met there, or over the whole range where that is more. */
  #crowdOf(rung: number, free: Float64Array): Float64Array {
    const counts = new Float64Array(free.length);
    for (let rank = 0; rank < rung; rank++) counts[binOf(this.lines[rank].frequencyHz, this.fromHz)]++;
    const sum = (of: Float64Array, from: number, to: number) =>
      of.subarray(Math.max(0, from), to).reduce((total, value) => total + value, 0);
    const whole = rung / Math.max(sum(free, 0, free.length), this.lineSpacingHz);
    return free.map((_, bin) => {
      const width = sum(free, bin - binsPerOctave, bin + binsPerOctave + 1);
      const around = sum(counts, bin - binsPerOctave, bin + binsPerOctave + 1);
      return Math.max(whole, (around - 1) / Math.max(width, this.lineSpacingHz));
    });
  }
}

function binOf(hz: number, fromHz: number): number {
  return Math.max(0, Math.floor(binsPerOctave * Math.log2(Math.max(hz, fromHz) / fromHz)));
}

/** Whether a frequency lies so far off every harmonic of a shaft that the two make two lines. */
export function isSeparable(frequencyHz: number, shaft: SeenShaft, lineSpacingHz: number): boolean {
  const harmonic = nearestHarmonic(frequencyHz, shaft);
  return (
    Math.abs(frequencyHz - harmonic * shaft.hz) >=
    separationLines * lineSpacingHz + harmonic * shaft.uncertaintyHz
  );
}

export function nearestHarmonic(frequencyHz: number, { hz, harmonics }: SeenShaft): number {
  return Math.max(1, Math.min(harmonics, Math.round(frequencyHz / hz)));
}
