import { type FamilyTone, familyScore, fitFamily, matchesOf, type ShaftFamily } from './harmonic-family.ts';
import type { Peak, PeakSearch, PeakSettings } from './peaks.ts';

/** The peaks of one point of the machine. */
export interface SpeedSpectrum {
  /** Segments behind it. */
  readonly averages: number;
  readonly settings: Pick<PeakSettings, 'sampleRateHz' | 'segmentSamples'>;
  readonly search: Pick<PeakSearch, 'peaks'>;
}

export interface SpeedFound {
  readonly speedHz: number;
  /** At about 95 %. */
  readonly uncertaintyHz: number;
  /** Sum over the harmonics of how far each stands over the floor, dB, each up to 30. */
  readonly score: number;
  /** What the other lines would give a speed in the same range, as a part of the score. */
  readonly nextScore: number;
  /** Multiples of the speed at which a line stands, ascending. */
  readonly harmonics: readonly number[];
}

export interface SpeedNotFound {
  readonly refused: string;
}

/** Multiples of the speed that are looked at. */
const mostHarmonics = 20;
/** Slowest shaft, in lines: below, the harmonics run into each other. */
const leastLines = 5;
/** Fewest harmonics of a family among the lower ones, where few lines meet a multiple by chance; and the first of them. */
const leastHarmonics = 3;
const lowerHarmonics = 10;
const firstHarmonics = 3;
/** A family that the other lines could match to this part is not the only one. */
const mostNextScore = 0.5;
/** Half orders, or thirds, that are so many of the whole ones speak for a slower shaft. */
const mostFractions = 0.5;
/** Wider humps are no harmonics. */
const widestLines = 8;
/** Mains, and how far a peak at its multiples may be off: the grid wanders by 0.15 %, a peak is known to a tenth of a line. */
const mainsHz = [50, 60] as const;
const mostMainsMultiple = 20;
const mainsWander = 0.0015;
const mainsLines = 0.1;

/**
 * Running speed from the family of shaft harmonics that it leaves in the spectra of a machine's points, within a part
 * of the nominal speed either way (0.05: 5 %).
 *
 * For speeds over the range, in steps of a quarter of a line at the 20th harmonic, what stands over the floor at the
 * first 20 multiples is added in dB; a line counts by its interpolated frequency, in full right at the multiple and
 * nothing a third of a line beside it. The best speed is fitted to its lines. Peaks at multiples of 50 and 60 Hz count
 * for nothing.
 *
 * Refused, with the reason, where the answer is not the only one: fewer than three harmonics up to the tenth, or none
 * of the first three; only every second or third multiple (a shaft twice or three times as fast, a blade pass); half orders or thirds
 * as well (a slower shaft); another speed in the range that the lines not of this family give half its score.
 */
export function findSpeed(
  spectra: readonly SpeedSpectrum[],
  nominalHz: number,
  within: number,
): SpeedFound | SpeedNotFound {
  const range = { fromHz: nominalHz * (1 - within), toHz: nominalHz * (1 + within) };
  const usable = spectra.filter(({ settings }) => range.fromHz >= leastLines * spacingOf(settings));
  if (usable.length === 0)
    return { refused: 'the lines lie too far apart to tell the harmonics of so slow a shaft' };
  const tones = usable.flatMap((spectrum) => tonesOf(spectrum, (mostHarmonics + 1) * range.toHz));
  const best = bestSpeed(tones, range);
  if (best === null) return { refused: 'no line of the spectrum fits a speed in the range' };
  const family = onlyFamily(tones, best.speedHz, range);
  if ('refused' in family) return family;
  const { speedHz, uncertaintyHz, harmonics } = family;
  const score = familyScore(tones, speedHz, mostHarmonics);
  const next = rival(without(tones, speedHz, mostHarmonics), range);
  const nextScore = (next?.score ?? 0) / score;
  if (next !== null && nextScore > mostNextScore)
    return {
      refused: `${rpm(next.speedHz)} fits other lines nearly as well as ${rpm(speedHz)} fits its own`,
    };
  return { speedHz, uncertaintyHz, score, nextScore, harmonics };
}

/**
 * The speed of the highest score that one could take for the shaft's. One that only every fourth multiple or fewer speak
 * for would be refused itself: the harmonics of a damaged bearing, strong as they are, meet every seventh multiple of
 * some speed in the range.
 */
function rival(others: readonly FamilyTone[], range: SpeedRange): ReturnType<typeof bestSpeed> {
  for (let left = others; left.length > 0; ) {
    const best = bestSpeed(left, range);
    if (best === null) return null;
    const multiples = matchesOf(left, best.speedHz, mostHarmonics, 1).map(({ harmonic }) => harmonic);
    if (multiples.length === 0 || multiples.reduce(greatestDivisor) <= firstHarmonics) return best;
    const fewer = without(left, best.speedHz, mostHarmonics);
    if (fewer.length === left.length) return null;
    left = fewer;
  }
  return null;
}

function without(tones: readonly FamilyTone[], speedHz: number, harmonics: number): FamilyTone[] {
  const own = new Set(matchesOf(tones, speedHz, harmonics, 1).map(({ tone }) => tone));
  return tones.filter((tone) => !own.has(tone));
}

interface SpeedRange {
  readonly fromHz: number;
  readonly toHz: number;
}

/** The fitted family, where its multiples leave no other shaft possible. */
function onlyFamily(
  tones: readonly FamilyTone[],
  roughHz: number,
  { fromHz, toHz }: SpeedRange,
): ShaftFamily | SpeedNotFound {
  const family = fitFamily(tones, roughHz, mostHarmonics);
  const lower = family?.harmonics.filter((harmonic) => harmonic <= lowerHarmonics) ?? [];
  if (family === null || lower.length < leastHarmonics)
    return { refused: `fewer than ${leastHarmonics} harmonics of one speed stand out of the noise` };
  const { speedHz, harmonics } = family;
  const step = harmonics.reduce(greatestDivisor);
  if (step > 1) {
    const fasterHz = step * speedHz;
    if (fasterHz <= toHz) return onlyFamily(tones, fasterHz, { fromHz: fasterHz, toHz: fasterHz });
    const every = step === 2 ? 'second' : step === 3 ? 'third' : `${step}th`;
    return {
      refused: `only every ${every} harmonic of ${rpm(speedHz)} stands out: the shaft may turn ${step} times as fast`,
    };
  }
  if (harmonics[0] > firstHarmonics) return { refused: `the first harmonics of ${rpm(speedHz)} are missing` };
  if (speedHz < fromHz * 0.999 || speedHz > toHz * 1.001)
    return { refused: `the lines lead out of the range, to ${rpm(speedHz)}` };
  const top = harmonics[harmonics.length - 1];
  for (const parts of [2, 3]) {
    const all = matchesOf(tones, speedHz / parts, parts * top, 0.25).map(({ harmonic }) => harmonic);
    const between = new Set(all.filter((harmonic) => harmonic % parts !== 0)).size / (parts - 1);
    if (between < leastHarmonics - 1 || between < mostFractions * harmonics.length) continue;
    const slower = parts === 2 ? 'half' : 'a third of';
    return {
      refused: `lines between the harmonics of ${rpm(speedHz)} fit a shaft of ${slower} its speed as well`,
    };
  }
  return family;
}

/** What may be a harmonic of the shaft: peaks that are no mains. */
function tonesOf({ averages, settings, search }: SpeedSpectrum, toHz: number): FamilyTone[] {
  const lineSpacingHz = spacingOf(settings);
  const peaks = search.peaks.filter(({ frequencyHz }) => frequencyHz <= toHz);
  const mains = mainsHz.flatMap((hz) => mainsAmong(peaks, hz, lineSpacingHz));
  return peaks
    .filter((peak) => peak.lastLine - peak.firstLine <= widestLines && !mains.includes(peak))
    .map((peak) => ({
      frequencyHz: peak.frequencyHz,
      deviationHz: lineSpacingHz * deviationLines(peak, averages),
      lineSpacingHz,
      aboveFloorDb: peak.aboveFloorDb,
    }));
}

/** The peaks at multiples of a mains frequency, where one of the first two stands: without, there is no such mains here. */
function mainsAmong(peaks: readonly Peak[], hz: number, lineSpacingHz: number): readonly Peak[] {
  const found = peaks.filter(({ frequencyHz }) => {
    const multiple = Math.round(frequencyHz / hz);
    if (multiple < 1 || multiple > mostMainsMultiple) return false;
    const off = Math.abs(frequencyHz - multiple * hz);
    return off < mainsLines * lineSpacingHz + mainsWander * frequencyHz;
  });
  return found.some(({ frequencyHz }) => frequencyHz < 2.5 * hz) ? found : [];
}

/** How far a peak's frequency may be off: by the noise on its lines; a hump's by a quarter of its width. */
function deviationLines({ kind, aboveFloorDb, firstLine, lastLine }: Peak, averages: number): number {
  const byNoise = Math.hypot(0.02, 0.6 / Math.sqrt(averages * 10 ** (aboveFloorDb / 10)));
  return kind === 'tone' ? byNoise : Math.max(byNoise, 0.1 * (lastLine - firstLine + 1));
}

/** The speed of the highest score; of equal ones the fastest, which needs no harmonics that are not there. */
function bestSpeed(
  tones: readonly FamilyTone[],
  { fromHz, toHz }: SpeedRange,
): { readonly speedHz: number; readonly score: number } | null {
  const finest = Math.min(...tones.map(({ lineSpacingHz }) => lineSpacingHz));
  const steps = Math.ceil((toHz - fromHz) / (finest / (4 * mostHarmonics)));
  let best = { speedHz: 0, score: 0 };
  for (let step = 0; step <= steps; step++) {
    const speedHz = fromHz + ((toHz - fromHz) * step) / Math.max(1, steps);
    const score = familyScore(tones, speedHz, mostHarmonics);
    if (score >= best.score) best = { speedHz, score };
  }
  return best.score > 0 ? best : null;
}

function spacingOf({ sampleRateHz, segmentSamples }: SpeedSpectrum['settings']): number {
  return sampleRateHz / segmentSamples;
}

function greatestDivisor(a: number, b: number): number {
  return b === 0 ? a : greatestDivisor(b, a % b);
}

function rpm(hz: number): string {
  return `${(60 * hz).toPrecision(4)} rpm`;
}
