import { envelopeAveraging, secondsForEnvelope } from '../signal/envelope.ts';
import { mountingRangeHz } from './bands.ts';
import type { AnalysisLayers } from './build-settings.ts';
import {
  canDemodulate,
  type DemodulationBand,
  envelopeSpacingHz,
  fixedDemodulation,
  hasEnvelope,
  type PointEnvelope,
} from './envelope-settings.ts';
import { type Build, innermost } from './layers.ts';
import { printFrequency, printSeconds } from './print-value.ts';
import type { AnalysisSettings, Band, Point, Quantity, RecordingSettings } from './site.ts';
import type { Span } from './site-text.ts';

/** What the envelope of a point must be judged against. */
export interface EnvelopeCase {
  readonly quantity: Quantity;
  readonly mounting: Point['mounting'];
  readonly recordings: Pick<RecordingSettings, 'sampleRateHz' | 'durationS' | 'sidecar'>;
  readonly analysis: AnalysisSettings;
  /** Null: nothing says it. */
  readonly runningSpeedHz: number | null;
  /** Turns, for one of the machine's speed, of the shafts on which rolling bearings of this point sit. */
  readonly bearingShafts: readonly number[];
  readonly at: Span;
  readonly shown: string;
}

/**
 * The envelope as the site file means it, whether or not anything asks for it; null where the point's quantity has
 * none. Tells what is wrong with a written band.
 */
export function readEnvelope(
  build: Build,
  layers: AnalysisLayers,
  situation: EnvelopeCase,
): PointEnvelope | null {
  const { quantity, runningSpeedHz, bearingShafts, analysis } = situation;
  if (!hasEnvelope(quantity)) return null;
  const written = innermost(layers, 'envelope');
  const slowest = runningSpeedHz === null ? null : runningSpeedHz * Math.min(1, ...bearingShafts);
  return {
    band: writtenBand(build, layers, situation),
    choose: written?.value.keys.choose == null ? 'fixed' : 'kurtosis',
    lineSpacingHz: envelopeSpacingHz(analysis.lineSpacingHz, slowest),
    highestHz: 0,
  };
}

function writtenBand(
  { reading }: Build,
  layers: AnalysisLayers,
  situation: EnvelopeCase,
): DemodulationBand | null {
  const written = innermost(layers, 'envelope');
  if (written === null) return null;
  const { from, to } = written.value.keys;
  const { has } = written.value;
  if (has.has('from') !== has.has('to')) {
    const missing = has.has('from') ? 'to: 8 kHz' : 'from: 2 kHz';
    reading.problem(
      written.at,
      'envelope has one edge of its band only',
      `add: ${missing}`,
      'envelope edges',
    );
    return null;
  }
  if (from === null || to === null) return null;
  const band = { fromHz: from.value, toHz: to.value };
  if (band.fromHz >= band.toHz) {
    reading.problem(
      to.at,
      'the envelope band does not end above its begin',
      'compare from and to',
      'envelope order',
    );
    return null;
  }
  const { mounting, shown, recordings } = situation;
  const { sampleRateHz } = recordings;
  const told = (what: string, highestHz: number, rule: string) => {
    const right =
      highestHz > band.fromHz ? reading.write(to.at, printFrequency(floor(highestHz))) : 'take a lower band';
    reading.problem(
      to.at,
      `the envelope band of ${shown} ends at ${printFrequency(band.toHz)}, ${what}`,
      right,
      rule,
    );
  };
  if (mounting !== null && band.toHz > mountingRangeHz[mounting]) {
    const range = mountingRangeHz[mounting];
    told(
      `a sensor fixed by ${mounting} is usable to about ${printFrequency(range)} (common practice)`,
      range,
      'envelope mounting',
    );
    return null;
  }
  if (sampleRateHz === null) return band;
  if (band.toHz > (sampleRateHz / 2.56) * (1 + 1e-9)) {
    const highest = sampleRateHz / 2.56;
    told(`above the sample rate / 2.56 = ${printFrequency(highest)}`, highest, 'envelope range');
    return null;
  }
  if (canDemodulate(band, sampleRateHz)) return band;
  const what = `the envelope band of ${shown} from ${printFrequency(band.fromHz)} to ${printFrequency(band.toHz)} cannot be demodulated at ${printFrequency(sampleRateHz)}`;
  reading.problem(written.at, what, 'take a wider band that begins higher above 0', 'envelope width');
  return null;
}

/**
 * The envelope of a point where something asks for it: the site file's `envelope`, a band of it, a rolling bearing; else
 * null. Tells where the recordings are too short for it; bursts that are pooled have as long a segment as they hold.
 */
export function askedEnvelope(
  build: Build,
  layers: AnalysisLayers,
  envelope: PointEnvelope | null,
  bands: readonly Band[],
  situation: EnvelopeCase,
): PointEnvelope | null {
  const ofEnvelope = bands.filter(({ of }) => of === 'envelope');
  const written = innermost(layers, 'envelope');
  const asked = written !== null || ofEnvelope.length > 0 || situation.bearingShafts.length > 0;
  if (envelope === null || !asked) return null;
  const highestHz = Math.max(
    0,
    ...ofEnvelope.map(({ to, inOrders }) =>
      inOrders ? to * (situation.runningSpeedHz ?? usualSpeedHz) : to,
    ),
  );
  const { bearingShafts, runningSpeedHz } = situation;
  const fastest = Math.max(0, ...bearingShafts) * (runningSpeedHz ?? usualSpeedHz);
  const faults = bearingShafts.length === 0 ? {} : { faultsToHz: ordersOfFaults * fastest };
  const isWanted = written !== null || ofEnvelope.length > 0;
  return fitted(build, { ...envelope, highestHz, ...faults }, isWanted, {
    ...situation,
    at: written?.at ?? situation.at,
  });
}

/** Three harmonics of an inner ring's passing frequency, which is about half of 8 to 14 elements times the shaft speed. */
const ordersOfFaults = 20;

/** For bands in orders of a machine whose speed only its sidecars say: 3000 rpm. */
const usualSpeedHz = 50;

function fitted(
  { reading }: Build,
  envelope: PointEnvelope,
  isWanted: boolean,
  situation: EnvelopeCase,
): PointEnvelope | null {
  const { recordings, analysis, mounting, shown, at } = situation;
  const { sampleRateHz, durationS } = recordings;
  if (sampleRateHz === null || durationS === null) return envelope;
  const band = fixedDemodulation(envelope, sampleRateHz, mounting);
  if (band === null) return envelope;
  const { window, overlapPercent, skipStartS } = analysis;
  const neededS = (lineSpacingHz: number) =>
    skipStartS +
    secondsForEnvelope(
      envelopeAveraging({ ...band, sampleRateHz, highestHz: 0, window, overlapPercent, lineSpacingHz }),
      1,
    );
  const { lineSpacingHz } = envelope;
  if (neededS(lineSpacingHz) <= durationS) return envelope;
  const needs = `the envelope of ${shown} needs recordings of ${printSeconds(neededS(lineSpacingHz))} for a line every ${printFrequency(lineSpacingHz)}, a segment of 25 turns of its slowest shaft; they are ${printSeconds(durationS)} long`;
  let wider = lineSpacingHz;
  while (neededS(wider) > durationS && wider < sampleRateHz / 16) wider *= 2;
  if (!isWanted) {
    reading.warn(at, `${needs}; its bearings are judged without it`, 'envelope length');
    return null;
  }
  if (analysis.averageOver === undefined || neededS(wider) > durationS) {
    reading.problem(at, needs, 'record for longer, or leave the envelope out', 'envelope length');
    return envelope;
  }
  reading.warn(
    at,
    `${needs}; lines at most ${printFrequency(wider)} apart are used, at which no fault is named`,
    'envelope length',
  );
  return { ...envelope, lineSpacingHz: wider };
}

function floor(hz: number): number {
  const step = 10 ** (Math.floor(Math.log10(hz)) - 3);
  return Number((Math.floor(hz / step) * step).toPrecision(4));
}
