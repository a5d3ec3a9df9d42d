import { type FreeLines, type StandingLine, toleranceLines } from './standing-lines.ts';

/** Where a family of lines is expected: harmonics of a fundamental, each with a pair of sidebands. */
export interface Comb {
  /** Fundamental by formula and observed speed, Hz. */
  readonly hz: number;
  /** The true one lies this near, as a part of it: slip and speed. */
  readonly window: number;
  /** Distance of the sidebands from their harmonic, Hz; null: none are expected. */
  readonly sidebandHz: number | null;
}

export interface FamilyLine {
  readonly line: StandingLine;
  /** 1: the fundamental. */
  readonly harmonic: number;
  /** 0: the harmonic itself; -1, 1: the sideband below, above. */
  readonly sideband: -1 | 0 | 1;
}

export interface Family {
  /** Fundamental as it was observed, Hz. */
  readonly hz: number;
  readonly lines: readonly FamilyLine[];
  /** Chance that this many lines of such a family stand out by accident, for one family looked for. */
  readonly chance: number;
}

/** Harmonics that are looked at; families are tried as their first 2, 3, 5 and 8. */
const mostHarmonics = 8;
const spans = [2, 3, 5, 8];
/** Fundamentals nearer than the tolerance by so many times are one. */
const sameFundamental = 200;
/**
 * Families are tried with several spans, at several heights, with and without sidebands, and the best counts. The tries
 * overlap: by trials with lines at random places the best of all is so many times likelier than one (see the tests).
 */
const triesFactor = 1.5;

/** Lines of one side may be stronger than those between by chance, in power by about a decibel. */
const strongerSide = 1.26;

/**
 * The family of a comb that is least likely by accident; null where fewer than two of its lines stand out, where its
 * fundamental could be told from the shaft and does not stand out, or where another family explains its lines: its
 * harmonics lead out of the window, only every second or third of them stands, or one of its sides is the middle.
 *
 * The chance of accident: `lines` lines stand anywhere. A place of the family is met by one of them with the probability
 * p = lines x width of the place / width in which lines can stand (an octave around, or the whole range, whichever is
 * more crowded); so many of its places are met with the tail of the binomial sum; and the fundamental could lie at as
 * many places as the window holds. The family's own lines are counted among the crowd, which errs on the side of caution.
 */
export function findFamily(free: FreeLines, comb: Comb): Family | null {
  let best: Family | null = null;
  const toleranceHz = toleranceLines * free.lineSpacingHz;
  const tried = new Set<number>();
  for (const candidateHz of candidates(free, comb)) {
    const hz = refined(free, candidateHz, toleranceHz);
    // Each line of a family leads to the same fundamental.
    const place = Math.round((hz / toleranceHz) * sameFundamental);
    if (tried.has(place)) continue;
    tried.add(place);
    const family = scoreFamily(free, comb, hz);
    if (family !== null && (best === null || family.chance < best.chance)) best = family;
  }
  return best;
}

/** Fundamentals that some line would be a harmonic of. */
function candidates(free: FreeLines, { hz, window }: Comb): number[] {
  const found: number[] = [];
  const slack = toleranceLines * free.lineSpacingHz;
  for (const { frequencyHz } of free.lines) {
    for (let harmonic = 1; harmonic <= mostHarmonics; harmonic++) {
      const fundamental = frequencyHz / harmonic;
      if (Math.abs(fundamental - hz) <= window * hz + slack / harmonic) found.push(fundamental);
    }
  }
  return found;
}

interface Place {
  readonly hz: number;
  readonly harmonic: number;
  readonly sideband: -1 | 0 | 1;
  /** Rank of the line that stands there; -1: none. */
  readonly rank: number;
}

function scoreFamily(free: FreeLines, comb: Comb, hz: number): Family | null {
  const toleranceHz = toleranceLines * free.lineSpacingHz;
  const places = placesOf(free, hz, comb.sidebandHz, toleranceHz);
  const first = places.find(({ harmonic, sideband }) => harmonic === 1 && sideband === 0);
  if (first !== undefined && first.rank < 0) return null;
  const met = places.filter(({ rank }) => rank >= 0);
  const harmonics = met.filter(({ sideband }) => sideband === 0).map(({ harmonic }) => harmonic);
  if (harmonics.length === 0 || met.length < 2) return null;
  const top = harmonics[harmonics.length - 1];
  if (Math.abs(hz - comb.hz) > comb.window * comb.hz + toleranceHz / top) return null;
  if (isOfCoarserComb(places, harmonics) || isBesideItsMiddle(free, places)) return null;
  let least = 1;
  for (const span of spans) {
    const harmonics = places.filter(({ harmonic, sideband }) => harmonic <= span && sideband === 0);
    const all = places.filter(({ harmonic }) => harmonic <= span);
    const tried = all.length > harmonics.length ? [harmonics, all] : [harmonics];
    const fundamentals = 1 + (comb.window * comb.hz * span) / toleranceHz;
    for (const rung of free.rungs.keys()) {
      for (const group of tried) {
        least = Math.min(least, fundamentals * accident(free, group, rung, toleranceHz));
      }
    }
  }
  const lines = met.map(({ rank, harmonic, sideband }) => ({ line: free.lines[rank], harmonic, sideband }));
  return { hz, lines, chance: Math.min(1, triesFactor * least) };
}

/**
 * Whether only multiples of a multiple stand, though others could be seen: shocks twice or three times as fast, of
 * something else, make no more.
 */
function isOfCoarserComb(places: readonly Place[], harmonics: readonly number[]): boolean {
  if (harmonics.length < 2) return false;
  const step = harmonics.reduce(greatestDivisor);
  const top = harmonics[harmonics.length - 1];
  return (
    step > 1 &&
    places.some(({ harmonic, sideband }) => sideband === 0 && harmonic < top && harmonic % step > 0)
  );
}

function greatestDivisor(a: number, b: number): number {
  return b === 0 ? a : greatestDivisor(b, a % b);
}

/**
 * Whether the sidebands of one side carry more than the harmonics that they stand beside: what passes the load zone once
 * a turn is strongest in the middle (amplitude modulation by m makes sidebands m / 2 as strong), so the middle is there.
 */
function isBesideItsMiddle(free: FreeLines, places: readonly Place[]): boolean {
  const power = ({ rank }: Place) => (rank < 0 ? 0 : free.lines[rank].level ** 2);
  return ([-1, 1] as const).some((side) => {
    let middle = 0;
    let beside = 0;
    for (const place of places) {
      if (place.sideband !== side) continue;
      const own = places.find(({ harmonic, sideband }) => harmonic === place.harmonic && sideband === 0);
      if (own === undefined) continue;
      middle += power(own);
      beside += power(place);
    }
    return beside > strongerSide * middle;
  });
}

/** Higher harmonics tell the fundamental better; each is looked for where the lower ones put it. */
function refined(free: FreeLines, candidateHz: number, toleranceHz: number): number {
  let hz = candidateHz;
  let products = 0;
  let squares = 0;
  for (let harmonic = 1; harmonic <= mostHarmonics; harmonic++) {
    const rank = free.rankAt(harmonic * hz, toleranceHz);
    if (rank < 0) continue;
    products += harmonic * free.lines[rank].frequencyHz;
    squares += harmonic * harmonic;
    hz = products / squares;
  }
  return hz;
}

/** The places of a family that could be told from the shaft. */
function placesOf(free: FreeLines, hz: number, sidebandHz: number | null, toleranceHz: number): Place[] {
  const places: Place[] = [];
  for (let harmonic = 1; harmonic <= mostHarmonics; harmonic++) {
    for (const sideband of sidebandHz === null ? ([0] as const) : ([0, -1, 1] as const)) {
      const at = harmonic * hz + sideband * (sidebandHz ?? 0);
      if (!free.isFree(at)) continue;
      places.push({ hz: at, harmonic, sideband, rank: free.rankAt(at, toleranceHz) });
    }
  }
  return places;
}

/** Chance that as many of the places are met by the strongest lines by accident as are; 1 where fewer than two are. */
function accident(free: FreeLines, places: readonly Place[], rung: number, toleranceHz: number): number {
  const strongest = free.rungs[rung];
  const met = places.reduce((sum, { rank }) => sum + (rank >= 0 && rank < strongest ? 1 : 0), 0);
  if (met < 2) return 1;
  return atLeast(
    places.map(({ hz }) => free.chanceAt(rung, hz, toleranceHz)),
    met,
  );
}

/** Probability that at least `count` of independent events happen: 1 less the distribution's head, summed from above. */
export function atLeast(probabilities: readonly number[], count: number): number {
  const distribution = new Float64Array(probabilities.length + 1);
  distribution[0] = 1;
  probabilities.forEach((p, n) => {
    for (let k = n + 1; k > 0; k--) distribution[k] = distribution[k] * (1 - p) + distribution[k - 1] * p;
    distribution[0] *= 1 - p;
  });
  let tail = 0;
  for (let k = probabilities.length; k >= count; k--) tail += distribution[k];
  return Math.min(1, tail);
}
