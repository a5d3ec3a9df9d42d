/** A line that may be a harmonic of the shaft, with how well its frequency is known. */
export interface FamilyTone {
  readonly frequencyHz: number;
  readonly deviationHz: number;
  readonly lineSpacingHz: number;
  readonly aboveFloorDb: number;
}

/** A speed with the multiples of it at which a line stands. */
export interface ShaftFamily {
  readonly speedHz: number;
  /** At about 95 %. */
  readonly uncertaintyHz: number;
  /** Ascending. */
  readonly harmonics: readonly number[];
}

/** A line farther from a multiple of the speed than this, in lines, and than twice its deviation counts for nothing. */
const reachLines = 0.35;
/** Lines of the fitted family lie this near. */
const fittedLines = 0.25;
/** One strong line must not outweigh a family. */
const mostPerHarmonicDb = 30;
/** Lines that scatter by more, in deviations, do not all belong together; so many are left in any case. */
const mostScatter = 2.5;
const fewest = 3;
/** Of a shaft speed that is never quite steady, as a part of it. */
const leastUncertainty = 1e-4;

interface Match {
  readonly tone: FamilyTone;
  readonly harmonic: number;
}

/** Lines within a part of a line, and twice their own deviation, of a multiple of the speed. */
export function matchesOf(
  tones: readonly FamilyTone[],
  speedHz: number,
  mostHarmonics: number,
  lines: number,
): readonly Match[] {
  return tones.flatMap((tone) => {
    const harmonic = Math.round(tone.frequencyHz / speedHz);
    if (harmonic < 1 || harmonic > mostHarmonics) return [];
    const off = Math.abs(tone.frequencyHz - harmonic * speedHz);
    return off <= lines * tone.lineSpacingHz + 2 * tone.deviationHz ? [{ tone, harmonic }] : [];
  });
}

/** Sum over the multiples of a speed of the dB that stand there: in full right at the multiple, less beside it. */
export function familyScore(tones: readonly FamilyTone[], speedHz: number, mostHarmonics: number): number {
  const most = new Float64Array(mostHarmonics + 1);
  for (const { frequencyHz, deviationHz, lineSpacingHz, aboveFloorDb } of tones) {
    const harmonic = Math.round(frequencyHz / speedHz);
    if (harmonic < 1 || harmonic > mostHarmonics) continue;
    const reachHz = reachLines * lineSpacingHz + 2 * deviationHz;
    const off = (frequencyHz - harmonic * speedHz) / reachHz;
    const counts = (1 - off * off) * Math.min(mostPerHarmonicDb, aboveFloorDb);
    if (counts > most[harmonic]) most[harmonic] = counts;
  }
  return most.reduce((sum, value) => sum + value, 0);
}

/**
 * The speed whose multiples lie nearest to the lines, by least squares: sum of ((f_i - h_i speed) / deviation_i)².
 * Lines farther than a quarter of a line from their multiple are none of the family; nor is the one that lies worst,
 * again and again, while they scatter far more than their deviations: a line of other origin may lie near a multiple by
 * chance, and outweigh all others. The uncertainty is what the deviations say, or what the lines scatter where that is
 * more. Null where no line lies near a multiple.
 */
export function fitFamily(
  tones: readonly FamilyTone[],
  roughHz: number,
  mostHarmonics: number,
): ShaftFamily | null {
  let speedHz = roughHz;
  let matches: readonly Match[] = [];
  for (const lines of [reachLines, fittedLines, fittedLines]) {
    matches = matchesOf(tones, speedHz, mostHarmonics, lines);
    if (matches.length === 0) return null;
    speedHz = leastSquares(matches);
  }
  while (matches.length > fewest && scatterOf(matches, speedHz) > mostScatter) {
    const worst = matches.reduce((a, b) => (misfit(a, speedHz) > misfit(b, speedHz) ? a : b));
    matches = matches.filter((match) => match !== worst);
    speedHz = leastSquares(matches);
  }
  let weights = 0;
  for (const { tone, harmonic } of matches) weights += (harmonic / tone.deviationHz) ** 2;
  const scatter = Math.max(1, scatterOf(matches, speedHz));
  const uncertaintyHz = Math.max((2 * scatter) / Math.sqrt(weights), leastUncertainty * speedHz);
  const harmonics = [...new Set(matches.map(({ harmonic }) => harmonic))].sort((a, b) => a - b);
  return { speedHz, uncertaintyHz, harmonics };
}

/** Of the lines about the multiples, in deviations. */
function scatterOf(matches: readonly Match[], speedHz: number): number {
  if (matches.length < 2) return 1;
  const squares = matches.reduce((sum, match) => sum + misfit(match, speedHz) ** 2, 0);
  return Math.sqrt(squares / (matches.length - 1));
}

function misfit({ tone, harmonic }: Match, speedHz: number): number {
  return Math.abs(tone.frequencyHz - harmonic * speedHz) / tone.deviationHz;
}

function leastSquares(matches: readonly Match[]): number {
  let above = 0;
  let below = 0;
  for (const { tone, harmonic } of matches) {
    const weight = tone.deviationHz ** -2;
    above += weight * harmonic * tone.frequencyHz;
    below += weight * harmonic * harmonic;
  }
  return above / below;
}
