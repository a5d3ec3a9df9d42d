import type { DemodulationBand } from '../config/envelope-settings.ts';
import type { Point } from '../config/site.ts';
import type { EnvelopeCandidate } from './envelope-measured.ts';
import { searchSettings } from './envelope-plan.ts';
import { seriesRate } from './fingerprint.ts';

/**
 * Choosing the demodulation band of a point by kurtosis. Each recording offers the band in which shocks stand out most.
 *
 *   C1  A band that does not pass what noise alone may show wins nothing.
 *   C2  The band that has won five of the last ten recordings is chosen.
 *   C3  A choice is for good: levels of another band would begin a series of their own.
 *   C4  Only where the sample rate, the sensor's mounting or the bands that the site file names change, the search begins
 *       anew: the choice was made among other bands.
 */
export interface EnvelopeChoice {
  /** What the bands were that could be chosen (C4). */
  readonly among: string;
  /** Bands that won in the newest recordings, oldest first; null: none passed. Empty once a band is chosen. */
  readonly winners: readonly (DemodulationBand | null)[];
  readonly chosen: ChosenBand | null;
}

export interface ChosenBand extends DemodulationBand {
  /** Of the recording that decided it. */
  readonly kurtosis: number;
  readonly sinceUsedMs: number;
}

const winsNeeded = 5;
const recordingsLookedAt = 10;

/** One recording more. Pure and total; the same state again where nothing changes. */
export function choiceStep(
  before: EnvelopeChoice | null,
  among: string,
  candidate: EnvelopeCandidate,
  usedMs: number,
): EnvelopeChoice {
  const known = before !== null && before.among === among ? before : { among, winners: [], chosen: null };
  if (known.chosen !== null) return known;
  const { fromHz, toHz, kurtosis, passes } = candidate;
  const winner = passes ? { fromHz, toHz } : null;
  const winners = [...known.winners, winner].slice(-recordingsLookedAt);
  const wins = winners.filter((one) => one !== null && one.fromHz === fromHz && one.toHz === toHz).length;
  if (!passes || wins < winsNeeded) return { among, winners, chosen: null };
  return { among, winners: [], chosen: { fromHz, toHz, kurtosis, sinceUsedMs: usedMs } };
}

/** Names the bands among which a point's recordings of that rate choose. */
export function choiceAmong(
  { envelope, mounting, recordings }: Pick<Point, 'envelope' | 'mounting' | 'recordings'>,
  sampleRateHz: number,
): string | null {
  if (envelope?.choose !== 'kurtosis') return null;
  return JSON.stringify(
    searchSettings(envelope, seriesRate(sampleRateHz, recordings.sampleRateHz), mounting),
  );
}

/** The band that holds for a point's recordings of that rate; null: none is chosen yet, or it was among other bands. */
export function chosenBand(
  choice: EnvelopeChoice | null,
  point: Pick<Point, 'envelope' | 'mounting' | 'recordings'>,
  sampleRateHz: number | null,
): DemodulationBand | null {
  if (choice?.chosen == null || sampleRateHz === null) return null;
  if (choice.among !== choiceAmong(point, sampleRateHz)) return null;
  const { fromHz, toHz } = choice.chosen;
  return { fromHz, toHz };
}
