import { mountingRangeHz } from '../../config/bands.ts';
import { usualDemodulation } from '../../config/envelope-settings.ts';
import { segmentOf, usualLineSpacingHz } from '../../config/meaning.ts';
import { printFrequency } from '../../config/print-value.ts';
import type { Machine, Point, Quantity } from '../../config/site.ts';
import { integrationsBetween } from '../../signal/integration.ts';
import type { RecordingWish } from '../../signal/recording-plan.ts';
import type { AskedBand, ReachQuestion } from '../../signal/recording-reach.ts';
import { type RecordingKind, segmentSamplesFor } from '../../signal/segment-length.ts';
import type { AskedPlan } from './options.ts';

/** A band with the name under which people know it. */
export interface NamedBand extends AskedBand {
  readonly name: string;
}

/** What is asked, of a point of the site file or of no point at all. */
export interface PlanQuestion {
  readonly asked: AskedPlan;
  readonly at: { readonly machine: Machine; readonly point: Point } | null;
  readonly bands: readonly NamedBand[];
  readonly slowestHz: number | null;
  readonly fastestHz: number | null;
  readonly mounting: Point['mounting'];
}

/** The band that every velocity limit is about, where none is asked for. */
const overall: NamedBand = { name: 'velocity, 10 Hz to 1000 Hz', fromHz: 10, toHz: 1000, integrations: 1 };
/** What would be demodulated of a point, or of any, at a sample rate. */
export function demodulated(
  point: Point | null,
  sampleRateHz: number,
  mounting: Point['mounting'],
): ReachQuestion['envelope'] {
  return point?.envelope?.band ?? usualDemodulation(sampleRateHz, mounting);
}

export function questionOf(
  asked: AskedPlan,
  at: PlanQuestion['at'],
): PlanQuestion | { readonly wrong: string } {
  const quantity = at?.point.quantity ?? 'acceleration';
  const nominalHz = at?.machine.runningSpeedHz ?? null;
  const slowestHz = asked.speed?.slowestHz ?? nominalHz;
  const bands =
    asked.bands.length > 0 ? namedBands(asked, quantity) : bandsOfPoint(at?.point ?? null, slowestHz);
  if ('wrong' in bands) return bands;
  return {
    asked,
    at,
    bands,
    slowestHz,
    fastestHz: asked.speed?.fastestHz ?? nominalHz,
    mounting: asked.mounting ?? at?.point.mounting ?? null,
  };
}

function namedBands({ bands }: AskedPlan, quantity: Quantity): NamedBand[] | { readonly wrong: string } {
  const named: NamedBand[] = [];
  for (const { id, fromHz, toHz, quantity: wanted } of bands) {
    const integrations = integrationsBetween(quantity, wanted ?? quantity);
    if (typeof integrations !== 'number') return { wrong: `--band ${id}: ${integrations.reason}` };
    const name = `${wanted ?? quantity}, ${printFrequency(fromHz)} to ${printFrequency(toHz)}`;
    named.push({ name, fromHz, toHz, integrations });
  }
  return named;
}

/**
 * Bands of the plain spectrum. Those in orders lie where the slowest speed puts them; without a speed they lie nowhere.
 */
export function bandsOfPoint(point: Point | null, slowestHz: number | null): NamedBand[] {
  if (point === null) return [];
  return point.bands.flatMap((band) => {
    const perUnit = band.inOrders ? slowestHz : 1;
    const integrations = integrationsBetween(point.quantity, band.quantity);
    if (band.of === 'envelope' || perUnit === null || typeof integrations !== 'number') return [];
    return [{ name: band.id, fromHz: band.from * perUnit, toHz: band.to * perUnit, integrations }];
  });
}

/** Bands to say the uncertainty of. */
export function shownBands({ bands }: PlanQuestion): readonly NamedBand[] {
  return bands.length > 0 ? bands : [overall];
}

export function confidenceOf({ asked, at }: PlanQuestion): number {
  return asked.confidence?.percent ?? at?.point.analysis.confidencePercent ?? 95;
}

export function reachQuestion(question: PlanQuestion, sampleRateHz: number): ReachQuestion {
  const { at, mounting, slowestHz } = question;
  return {
    confidencePercent: confidenceOf(question),
    bands: shownBands(question),
    mountingHz: mounting === null ? null : mountingRangeHz[mounting],
    slowestHz,
    envelope: demodulated(at?.point ?? null, sampleRateHz, mounting),
  };
}

export function wishOf({ asked, at, bands, slowestHz }: PlanQuestion): RecordingWish {
  const { lineSpacingHz, separate, confidence, highestHz, sampleRateHz } = asked;
  return {
    lineSpacingHz,
    separate,
    confidence,
    bands,
    slowestHz,
    highestHz,
    sampleRateHz: sampleRateHz ?? at?.point.recordings.sampleRateHz ?? null,
    window: asked.window ?? at?.point.analysis.window ?? 'hann',
    overlapPercent: asked.overlapPercent ?? at?.point.analysis.overlapPercent ?? null,
    skipStartS: at?.point.analysis.skipStartS ?? 0,
  };
}

/** The recording as it is, under the settings asked for, else the point's, else the usual ones. */
export function recordingOf(
  question: PlanQuestion,
  { sampleRateHz, durationS }: { readonly sampleRateHz: number; readonly durationS: number },
): RecordingKind {
  const { asked, at, slowestHz } = question;
  const skipStartS = at?.point.analysis.skipStartS ?? 0;
  const explicit =
    asked.segmentSamples ??
    (asked.lineSpacingHz !== null
      ? segmentSamplesFor(sampleRateHz, asked.lineSpacingHz)
      : at === null
        ? null
        : segmentOf(at.point.analysis, sampleRateHz));
  const usual = segmentSamplesFor(sampleRateHz, usualLineSpacingHz(slowestHz));
  // Where nobody asked for a spacing, a short recording gets the longest segment that it holds.
  const longest = 2 ** Math.floor(Math.log2(Math.max(8, (durationS - skipStartS) * sampleRateHz)));
  return {
    window: asked.window ?? at?.point.analysis.window ?? 'hann',
    overlapPercent: asked.overlapPercent ?? at?.point.analysis.overlapPercent ?? 50,
    segmentSamples: explicit ?? Math.min(usual, longest),
    skipStartS,
    sampleRateHz,
    durationS,
  };
}
