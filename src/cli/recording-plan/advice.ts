import { printFrequency, printNumber, printSeconds, printSpeed } from '../../config/print-value.ts';
import type { LevelUncertainty } from '../../signal/level-uncertainty.ts';
import { handyLength, planRecording, type RecordingWish } from '../../signal/recording-plan.ts';
import { linesForNames, type RecordingReach } from '../../signal/recording-reach.ts';
import {
  advisedAverages,
  layOutSegments,
  type RecordingKind,
  secondsFor,
  segmentSamplesFor,
} from '../../signal/segment-length.ts';
import type { NamedBand } from './question.ts';

/** Something that recordings of one kind cannot show, and the settings with which they would. */
export interface Advice {
  /** Names the rule, so that many points of one kind are told once. */
  readonly rule: 'names' | 'few-averages' | 'band-level' | 'unused';
  /** The band it is about, where it is about one. */
  readonly band: string | null;
  readonly what: string;
  readonly remedy: string;
  readonly lineSpacingHz: number | null;
  readonly durationS: number | null;
}

/** A change of 25 % is what a severity standard calls significant (ISO 20816-1); chance should stay below it. */
const significantDb = 20 * Math.log10(1.25);
/** Below it, part of each recording is made for nothing. */
const leastUsedPercent = 80;

/**
 * What recordings cannot show of a machine that turns as slowly as `slowestHz`, and what would do. `named`: whether its
 * site file lists parts, whose faults could be named.
 */
export function adviceOn(
  recording: RecordingKind,
  reach: RecordingReach,
  about: {
    readonly slowestHz: number | null;
    readonly named: boolean;
    readonly bands: readonly NamedBand[];
  },
): Advice[] {
  if (reach.layout.averages === 0) return [];
  return [
    about.named ? names(recording, reach, about.slowestHz) : null,
    fewAverages(recording, reach),
    ...reach.bands.map(({ level }, n) => bandLevel(recording, about.bands[n] as NamedBand, level)),
    unused(recording, reach),
  ].filter((advice) => advice !== null);
}

function names(recording: RecordingKind, reach: RecordingReach, slowestHz: number | null): Advice | null {
  if (slowestHz === null || slowestHz >= reach.leastNamedHz * (1 - 1e-9)) return null;
  const needs = roundDown(slowestHz / linesForNames);
  return {
    rule: 'names',
    band: null,
    what: `the spectrum names no fault at ${printSpeed(slowestHz)}: a line every ${printFrequency(reach.layout.lineSpacingHz)} does from ${printSpeed(reach.leastNamedHz)} on`,
    ...finerLines(recording, needs),
  };
}

function fewAverages(recording: RecordingKind, { layout, line }: RecordingReach): Advice | null {
  if (layout.averages >= advisedAverages || line === null) return null;
  const durationS = handyLength(secondsFor(advisedAverages, recording));
  const steady = layout.averages < 4 ? ', and nothing tells whether it was steady' : '';
  return {
    rule: 'few-averages',
    band: null,
    what: `${layout.averages} ${layout.averages === 1 ? 'average' : 'averages'} a recording: a danger is not told at once${steady}`,
    remedy: `duration: ${lengthText(durationS)} would do (${advisedAverages} averages)`,
    lineSpacingHz: null,
    durationS,
  };
}

function bandLevel(recording: RecordingKind, band: NamedBand, known: LevelUncertainty | null): Advice | null {
  if (known === null || known.highDb <= significantDb) return null;
  const what = `the level of ${band.name}, where it is noise, is known to ${dbText(known)} only; a change of 25 % is ${printNumber(significantDb, 2)} dB`;
  const longer = planRecording({
    ...nothingElse(recording),
    lineSpacingHz: recording.sampleRateHz / recording.segmentSamples,
    confidence: { db: significantDb, percent: known.confidencePercent },
    bands: [band],
  });
  const durationS = 'refused' in longer ? null : longer.recording.durationS;
  return {
    rule: 'band-level',
    band: band.name,
    what,
    remedy:
      durationS === null ? 'widen the band' : `duration: ${lengthText(durationS)} would do, or a wider band`,
    lineSpacingHz: null,
    durationS,
  };
}

function unused(recording: RecordingKind, { layout }: RecordingReach): Advice | null {
  if (layout.usedPercent >= leastUsedPercent) return null;
  const usedS = secondsFor(layout.averages, recording);
  const nextS = secondsFor(layout.averages + 1, recording);
  return {
    rule: 'unused',
    band: null,
    what: `${printNumber(layout.usedPercent)} % of each recording is used, the rest is shorter than a segment`,
    remedy: `${printSeconds(usedS)} would do as well, ${printSeconds(nextS)} gives one average more`,
    lineSpacingHz: null,
    durationS: nextS,
  };
}

function nothingElse({ sampleRateHz, window, overlapPercent, skipStartS }: RecordingKind): RecordingWish {
  return {
    lineSpacingHz: null,
    separate: null,
    confidence: null,
    bands: [],
    slowestHz: null,
    highestHz: null,
    sampleRateHz,
    window,
    overlapPercent,
    skipStartS,
  };
}

/** What a finer line spacing takes: recordings as they are, where these still give enough averages, or longer ones. */
function finerLines(
  recording: RecordingKind,
  lineSpacingHz: number,
): Pick<Advice, 'remedy' | 'lineSpacingHz' | 'durationS'> {
  const finer = { ...recording, segmentSamples: segmentSamplesFor(recording.sampleRateHz, lineSpacingHz) };
  const spacing = `line_spacing: ${printNumber(lineSpacingHz, 2)} Hz`;
  const { averages } = layOutSegments(finer);
  if (averages >= advisedAverages) {
    const remedy = `${spacing} would do; the recordings are long enough (${averages} averages)`;
    return { remedy, lineSpacingHz, durationS: null };
  }
  const durationS = handyLength(secondsFor(advisedAverages, finer));
  const remedy = `${spacing} and duration: ${lengthText(durationS)} would do (${advisedAverages} averages)`;
  return { remedy, lineSpacingHz, durationS };
}

/** Two figures, never more than asked. */
function roundDown(value: number): number {
  const step = 10 ** (1 - Math.floor(Math.log10(value)));
  return Number((Math.floor(value * step + 1e-9) / step).toPrecision(2));
}

/** As the site file takes it: '0.5 s', '450 s', '10 min'. */
export function lengthText(seconds: number): string {
  const minutes = seconds / 60;
  return Number.isInteger(minutes) ? `${minutes} min` : `${printNumber(seconds, 6)} s`;
}

/** '-1.3 to +1.5 dB'. */
export function dbText({ lowDb, highDb }: LevelUncertainty): string {
  return `${printNumber(lowDb, 2)} to +${printNumber(highDb, 2)} dB`;
}
