import { atLeast } from './families.ts';
import {
  type SearchedSpectrum,
  type StandingLine,
  separationLines,
  toleranceLines,
} from './standing-lines.ts';

/** A place where a line would stand: `times` steps beside a carrier, or from 0 Hz. */
export interface PicturePlace {
  /** 0: a multiple of the step itself. */
  readonly besideHz: number;
  /** Below the carrier negative. */
  readonly times: number;
  /** Weaker lines there are what sound machines show; 0: every line counts. */
  readonly leastLevel: number;
}

/** The lines that a fault, or a source, would make: all of them locked to frequencies that are known. */
export interface Picture {
  readonly stepHz: number;
  /** The true step lies this near. */
  readonly windowHz: number;
  readonly places: readonly PicturePlace[];
  /**
   * Places of the same comb beyond the picture, or between its places: what stands there as often is a comb throughout, and
   * no picture. `compareFrom`: lines that are counted there before any stands.
   */
  readonly compare: readonly Omit<PicturePlace, 'leastLevel'>[];
  readonly compareFrom: number;
  /** Tried up to so many steps; the best counts. */
  readonly spans: readonly number[];
  /** Where the crowd of lines is counted; apart from each other. */
  readonly regions: readonly { readonly fromHz: number; readonly toHz: number }[];
  /** Fewest lines, and whether one each side of a carrier must be among them. */
  readonly least: number;
  readonly inPairs: boolean;
  /** So many lines within so many steps must be among them; left out: none. */
  readonly leastWithin?: { readonly steps: number; readonly lines: number };
  /** Whether a line there could be of this picture: nothing ordinary stands there. */
  readonly counts: (frequencyHz: number) => boolean;
}

export interface Shown {
  /** As it was observed. */
  readonly stepHz: number;
  readonly lines: readonly { readonly line: StandingLine; readonly place: PicturePlace }[];
  /** Chance that this many lines of the picture stand out by accident, for one picture looked for. */
  readonly chance: number;
}

/** Counts of strongest lines at which pictures are tried. */
const rungs = [2, 3, 5, 8, 13, 21, 34, 55, 89, 144];
/** Pictures are tried at several heights and spans; by trials the best is so many times likelier than one (see the tests). */
const triesFactor = 4;

/**
 * A picture as far as it stands in a spectrum, at the step that is least likely by accident; null where too few of its
 * lines stand. The chance is that of the binomial sum, as of families (families.ts): a place is met with the probability
 * that the crowd of its region gives, or the rate at which the same comb stands beyond the picture, whichever is more.
 */
export function findPicture(spectrum: SearchedSpectrum, picture: Picture): Shown | null {
  const crowd = new Crowd(spectrum, picture);
  let best: Shown | null = null;
  for (const stepHz of stepsOf(crowd, picture)) {
    const shown = shownAt(crowd, picture, stepHz);
    if (shown !== null && (best === null || shown.chance < best.chance)) best = shown;
  }
  return best;
}

/** The step as expected, and those that some line would lead to. */
function stepsOf({ lines, toleranceHz }: Crowd, { stepHz, windowHz, places }: Picture): number[] {
  const found = [stepHz];
  if (windowHz < 0.05 * toleranceHz) return found;
  for (const { frequencyHz } of lines) {
    for (const { besideHz, times } of places) {
      const step = (frequencyHz - besideHz) / times;
      if (Math.abs(step - stepHz) <= windowHz) found.push(step);
    }
  }
  return found;
}

function shownAt(crowd: Crowd, picture: Picture, candidateHz: number): Shown | null {
  const stepHz = refined(crowd, picture, candidateHz);
  const placed = picture.places.flatMap((place) => {
    const hz = place.besideHz + place.times * stepHz;
    return crowd.isWithin(hz) && picture.counts(hz)
      ? [{ place, hz, rank: crowd.rankAt(hz, place.leastLevel) }]
      : [];
  });
  const lines = placed.flatMap(({ place, rank }) => (rank < 0 ? [] : [{ line: crowd.lines[rank], place }]));
  if (!isEnough(picture, lines)) return null;
  const beyond = picture.compare
    .map(({ besideHz, times }) => besideHz + times * stepHz)
    .filter((hz) => crowd.isWithin(hz) && picture.counts(hz))
    .map((hz) => crowd.rankAt(hz, 0));
  const between = crowd.between(picture, stepHz);
  let least = 1;
  for (const span of picture.spans) {
    const tried = placed.filter(({ place }) => Math.abs(place.times) <= span);
    const steps = 1 + (picture.windowHz * span) / crowd.toleranceHz;
    for (const rung of crowd.rungs) {
      const met = tried.filter(({ rank }) => rank >= 0 && rank < rung).length;
      if (met < Math.min(2, picture.least)) continue;
      const standing = beyond.filter((rank) => rank >= 0 && rank < rung).length;
      // Where most of the comb stands beyond the picture, it is a comb throughout.
      const isComb = 2 * standing > beyond.length;
      const rate = isComb ? 1 : (standing + picture.compareFrom) / (beyond.length + 1);
      const near = crowd.chanceNear(between, stepHz, span, rung);
      const chances = tried.map(({ hz }) => Math.min(1, Math.max(crowd.chanceAt(hz, rung), rate, near)));
      least = Math.min(least, steps * atLeast(chances, met));
    }
  }
  return { stepHz, lines, chance: Math.min(1, triesFactor * least) };
}

function isEnough({ least, inPairs, leastWithin }: Picture, lines: Shown['lines']): boolean {
  if (lines.length < least || (inPairs && !hasPair(lines))) return false;
  if (leastWithin === undefined) return true;
  return lines.filter(({ place }) => Math.abs(place.times) <= leastWithin.steps).length >= leastWithin.lines;
}

function hasPair(lines: Shown['lines']): boolean {
  return lines.some(
    ({ place }) =>
      place.times > 0 &&
      lines.some((other) => other.place.besideHz === place.besideHz && other.place.times < 0),
  );
}

/** By the lines that stand where the step puts them, the farthest telling most; never out of its window. */
function refined(crowd: Crowd, { places, counts, stepHz, windowHz }: Picture, candidateHz: number): number {
  if (windowHz < 0.05 * crowd.toleranceHz) return candidateHz;
  let products = 0;
  let squares = 0;
  for (const { besideHz, times, leastLevel } of places) {
    const hz = besideHz + times * candidateHz;
    const rank = counts(hz) ? crowd.rankAt(hz, leastLevel) : -1;
    if (rank < 0) continue;
    products += times * (crowd.lines[rank].frequencyHz - besideHz);
    squares += times * times;
  }
  const step = squares === 0 ? candidateHz : products / squares;
  return Math.min(stepHz + windowHz, Math.max(stepHz - windowHz, step));
}

/** The lines of a picture's regions that could be of it, strongest over the floor first, and how crowded they are. */
class Crowd {
  readonly lines: readonly StandingLine[];
  readonly rungs: readonly number[];
  readonly toleranceHz: number;
  readonly #carriers: readonly number[];
  readonly #rates = new Map<number, readonly number[]>();
  readonly #range: { readonly fromHz: number; readonly toHz: number };
  readonly #regions: readonly { readonly fromHz: number; readonly toHz: number; readonly width: number }[];

  constructor({ lines, lineSpacingHz, fromHz, toHz }: SearchedSpectrum, picture: Picture) {
    this.toleranceHz = toleranceLines * lineSpacingHz;
    this.#range = { fromHz, toHz };
    const carriers = [...new Set(picture.places.map(({ besideHz }) => besideHz))].filter((hz) => hz > 0);
    this.#carriers = carriers;
    const isOwn = (hz: number) =>
      hz >= fromHz &&
      hz <= toHz &&
      carriers.every((carrier) => Math.abs(hz - carrier) >= separationLines * lineSpacingHz) &&
      picture.counts(hz);
    const within = (hz: number) => picture.regions.some((one) => hz >= one.fromHz && hz <= one.toHz);
    this.lines = lines
      .filter(({ frequencyHz }) => within(frequencyHz) && isOwn(frequencyHz))
      .sort((a, b) => b.aboveFloorDb - a.aboveFloorDb);
    this.rungs = [...rungs.filter((rung) => rung < this.lines.length), this.lines.length];
    this.#regions = picture.regions.map((region) => {
      let width = 0;
      for (let hz = region.fromHz; hz <= region.toHz; hz += lineSpacingHz)
        if (isOwn(hz)) width += lineSpacingHz;
      return { ...region, width: Math.max(width, lineSpacingHz) };
    });
  }

  isWithin(hz: number): boolean {
    return hz >= this.#range.fromHz && hz <= this.#range.toHz;
  }

  /** The rank of the strongest line within the tolerance of a place, at least so strong; -1: none. */
  rankAt(hz: number, leastLevel: number): number {
    return this.lines.findIndex(
      (line) => Math.abs(line.frequencyHz - hz) <= this.toleranceHz && line.level >= leastLevel,
    );
  }

  /** Chance that one of so many strongest lines stands within the tolerance of a place; its own region may be fuller. */
  chanceAt(hz: number, rung: number): number {
    const own = this.#regions.findIndex(({ fromHz, toHz }) => hz >= fromHz && hz <= toHz);
    const rates = this.#rates.get(rung) ?? this.#ratesOf(rung);
    this.#rates.set(rung, rates);
    return 2 * this.toleranceHz * (rates[own] ?? 0);
  }

  /** Lines that stand at no place of the comb: their rank, and how far beside the next carrier. */
  between(
    { places, compare }: Picture,
    stepHz: number,
  ): readonly { readonly rank: number; readonly besideHz: number }[] {
    const comb = [...places, ...compare].map(({ besideHz, times }) => besideHz + times * stepHz);
    return this.lines.flatMap(({ frequencyHz }, rank) => {
      if (comb.some((hz) => Math.abs(frequencyHz - hz) <= this.toleranceHz)) return [];
      return [{ rank, besideHz: Math.min(...this.#carriers.map((hz) => Math.abs(frequencyHz - hz))) }];
    });
  }

  /** The chance by the lines between the places, as near to the carriers: noise may gather beside a strong line. */
  chanceNear(between: ReturnType<Crowd['between']>, stepHz: number, span: number, rung: number): number {
    if (this.#carriers.length === 0) return 0;
    const reachHz = (span + 0.5) * stepHz;
    const count = between.filter((one) => one.rank < rung && one.besideHz <= reachHz).length;
    const room = 2 * reachHz - (2 * separationLines + 4 * span) * this.toleranceHz;
    return (2 * this.toleranceHz * (count + 1)) / (this.#carriers.length * Math.max(room, this.toleranceHz));
  }

  /** Lines a hertz in each region, or in all of them where that is more; the one that may be met is not of the crowd. */
  #ratesOf(rung: number): number[] {
    const strongest = this.lines.slice(0, rung);
    const total = this.#regions.reduce((sum, { width }) => sum + width, 0);
    return this.#regions.map(({ fromHz, toHz, width }) => {
      const own = strongest.filter(({ frequencyHz }) => frequencyHz >= fromHz && frequencyHz <= toHz).length;
      return Math.max(rung / total, (own - 1) / width);
    });
  }
}
