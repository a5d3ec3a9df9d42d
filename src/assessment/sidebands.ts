import type { Picture, PicturePlace } from './pictures.ts';
import { type SearchedSpectrum, type StandingLine, toleranceLines } from './standing-lines.ts';

/** A line that sidebands may stand beside. */
export interface Carrier {
  /** As it was observed. */
  readonly hz: number;
  /** What the sidebands are measured by, r.m.s. */
  readonly level: number;
  /** 1: the fundamental. */
  readonly harmonic: number;
}

/**
 * Two lines of unlike strength are two once their main lobes, two line spacings to either side with a Hann window, lie
 * apart: 1.33 Hz takes lines 0.33 Hz apart.
 */
export const mainLobesApartLines = 4;
/** Sidebands beyond the picture with which it is compared, on either side. */
const mostBeyond = 12;
const spans = [1, 2, 3, 5];

export interface Sidebands {
  readonly carriers: readonly Carrier[];
  /** Distance of the carriers from each other. */
  readonly betweenHz: number;
  readonly stepHz: number;
  readonly windowHz: number;
  readonly mostOrders: number;
  /** The first pair counts from this part of its carrier on, the others from `leastPart`. */
  readonly firstPart: number;
  readonly leastPart: number;
  readonly counts: (frequencyHz: number) => boolean;
}

/** The picture of sidebands; null where they would have no room between the carriers. */
export function sidebandPicture(of: Sidebands): Picture | null {
  const { carriers, stepHz, windowHz } = of;
  const room = Math.floor(of.betweenHz / (2 * stepHz) + 1e-6);
  const orders = Math.min(of.mostOrders, room - 1);
  if (orders < 1 || carriers.length === 0) return null;
  const beyond = Math.min(room, orders + mostBeyond);
  const places: PicturePlace[] = [];
  const compare: PicturePlace[] = [];
  for (const { hz, level } of carriers) {
    for (let order = 1; order <= beyond; order++) {
      const leastLevel = level * (order === 1 ? of.firstPart : of.leastPart);
      for (const side of [-1, 1]) {
        const place = { besideHz: hz, times: side * order, leastLevel };
        (order <= orders ? places : compare).push(place);
      }
    }
  }
  const reachHz = Math.min((beyond + 0.5) * stepHz, of.betweenHz / 2);
  return {
    stepHz,
    windowHz,
    places,
    compare,
    compareFrom: 0.5,
    spans: spans.filter((span, n, all) => span <= orders || all[n - 1] < orders),
    regions: carriers.map(({ hz }) => ({ fromHz: hz - reachHz, toHz: hz + reachHz })),
    least: 3,
    inPairs: true,
    counts: of.counts,
  };
}

/** The strongest line where one is expected; null where none stands. */
export function lineAt(
  { lines, lineSpacingHz }: SearchedSpectrum,
  hz: number,
  uncertaintyHz: number,
): StandingLine | null {
  const withinHz = toleranceLines * lineSpacingHz + uncertaintyHz;
  return lines
    .filter(({ frequencyHz }) => Math.abs(frequencyHz - hz) <= withinHz)
    .reduce<StandingLine | null>(
      (best, line) => (best === null || line.level > best.level ? line : best),
      null,
    );
}
