import type { Part } from '../config/parts.ts';
import type { Evidence } from '../manipulation/evidence.ts';
import { type Grade, gradeOfChance, mostChance, type ObservedSpeed } from './evidence.ts';
import { gearsSought } from './gear-pictures.ts';
import { motorSought } from './motor-pictures.ts';
import { highestDb } from './part-words.ts';
import { findPicture, type Picture, type Shown } from './pictures.ts';
import { type Looked, nothingSought, type PartSearch, type Sought, type Untold } from './sought.ts';
import { type SearchedSpectrum, type StandingLine, toleranceLines } from './standing-lines.ts';
import { beltSought, couplingSought, wheelSought } from './wheel-pictures.ts';

/** A single line at a known place is told where its crowd leaves less than this chance; it names no fault. */
const mostChanceOfLine = 0.05;

export interface PartsShown {
  readonly evidence: readonly Evidence[];
  /** Of the lines of each finding: what they are, without the caution. */
  readonly names: ReadonlyMap<StandingLine, readonly string[]>;
}

/**
 * What a spectrum says of the parts that are no bearings: gears, motors, belts, wheels, couplings. Closest sidebands
 * first, since those of a faster shaft may be every second or third of a slower one's; the lines of a finding are taken
 * away before the next is looked for. `fine`: parts whose faults these lines may name.
 */
export function partsShown(
  spectrum: SearchedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
  fine: (part: Part) => boolean,
  partsOfMachine: readonly Part[],
): PartsShown {
  const looked: Looked = { spectrum, speed, partsOfMachine };
  const searches = heard.map((part) => searchOf(looked, part));
  let left = searches
    .flatMap(({ sought }) => sought)
    .filter(({ isObservation, part }) => isObservation || fine(part))
    .sort((a, b) => (rankOf(a) > rankOf(b) ? 1 : rankOf(a) < rankOf(b) ? -1 : 0));
  const pictures = left.length;
  const evidence: Evidence[] = [];
  const names = new Map<StandingLine, string[]>();
  let lines = spectrum.lines;
  while (left.length > 0) {
    const [sought, ...others] = left;
    left = others;
    const shown = findPicture({ ...spectrum, lines }, sought.picture);
    if (shown === null) continue;
    const chance = Math.min(1, shown.chance * pictures);
    if (chance > (sought.picture.least === 1 ? mostChanceOfLine : mostChance)) continue;
    evidence.push(evidenceOf(sought, shown, chance));
    for (const { line, place } of shown.lines)
      names.set(line, [...(names.get(line) ?? []), `${sought.nameOf(place)}, ${sought.part.name}`]);
    lines = lines.filter((line) => !isOnComb(line, sought.picture, shown.stepHz, spectrum.lineSpacingHz));
  }
  return { evidence: [...evidence, ...searches.flatMap(({ untold }) => untold.map(untoldOf))], names };
}

/** Couplings last: what nothing else explains. */
function rankOf({ part, picture }: Sought): number {
  return part.kind === 'coupling' ? Number.POSITIVE_INFINITY : picture.stepHz;
}

/** Whether a line lies on the comb of a picture, within it or beyond: what is found there is told by it. */
function isOnComb(
  line: StandingLine,
  { places, compare }: Picture,
  stepHz: number,
  lineSpacingHz: number,
): boolean {
  return [...places, ...compare].some(
    ({ besideHz, times }) =>
      Math.abs(line.frequencyHz - besideHz - times * stepHz) <= toleranceLines * lineSpacingHz,
  );
}

function searchOf(looked: Looked, part: Part): PartSearch {
  switch (part.kind) {
    case 'gear-pair':
    case 'planetary-gear':
      return { sought: gearsSought(looked, part), untold: [] };
    case 'electric-motor':
      return motorSought(looked, part);
    case 'vanes':
    case 'blades':
      return { sought: wheelSought(looked, part), untold: [] };
    case 'belt':
      return beltSought(looked, part);
    case 'coupling':
      return { sought: couplingSought(looked, part), untold: [] };
    case 'rolling-bearing':
      return nothingSought;
  }
}

function evidenceOf(sought: Sought, shown: Shown, chance: number): Evidence {
  const { fault, frequency, expectedHz, isObservation, part } = sought;
  const beside = new Set(shown.lines.flatMap(({ place }) => (place.besideHz > 0 ? [place.besideHz] : [])));
  return {
    partId: part.id,
    fault,
    frequency,
    spectrum: 'plain',
    grade: gradeOf(shown, chance),
    ...(isObservation ? { isObservation } : {}),
    expectedHz,
    observedHz: sought.observedHz(shown),
    harmonics: beside.size > 0 ? beside.size : shown.lines.length,
    sidebands: beside.size > 0 ? shown.lines.length : 0,
    aboveFloorDb: highestDb(shown),
    chance,
    words: sought.words(shown),
  };
}

function gradeOf(shown: Shown, chance: number): Grade {
  return gradeOfChance(chance, shown.lines.length, highestDb(shown));
}

function untoldOf({ part, neededHz, ...about }: Untold): Evidence {
  return {
    partId: part.id,
    spectrum: 'plain',
    grade: 'not separable',
    ...about,
    neededLineSpacingHz: neededHz,
  };
}
