import { shaftsOf } from '../../assessment/fault-frequencies.ts';
import { printFrequency, printSpeed } from '../../config/print-value.ts';
import { type Machine, pointPath } from '../../config/site.ts';
import { lineUncertainty } from '../../signal/level-uncertainty.ts';
import { type RecordingReach, recordingReach } from '../../signal/recording-reach.ts';
import { type RecordingKind, secondsFor } from '../../signal/segment-length.ts';
import type { WindowName } from '../../signal/window.ts';
import { type Advice, adviceOn, dbText } from '../recording-plan/advice.ts';
import { bandsOfPoint, demodulated } from '../recording-plan/question.ts';
import type { AveragingCheck, PointCheck } from './point-check.ts';

/** What a point's recordings show, in a line, and what they cannot, with what would do. */
export interface PointAdvice {
  readonly recording: RecordingKind;
  readonly reach: RecordingReach;
  readonly cannot: readonly Advice[];
}

/** Advises point by point; what points of one kind have in common is worked out once. */
export class RecordingAdviser {
  readonly #reaches = new Map<string, RecordingReach>();

  /** Null where nothing says how its recordings are made. */
  adviseOn(
    machine: Machine,
    { point, averaging }: Pick<PointCheck, 'point' | 'averaging'>,
  ): PointAdvice | null {
    if (averaging === null || averaging.averages === 0) return null;
    const recording = recordingOf(averaging, point.analysis.skipStartS);
    const heard = (machine.parts ?? []).filter(({ at }) => at.includes(point.id));
    const slowestHz =
      machine.runningSpeedHz === null
        ? null
        : machine.runningSpeedHz * Math.min(...shaftsOf(heard).filter((turns) => turns > 0));
    const bands = bandsOfPoint(point, machine.runningSpeedHz);
    const question = {
      confidencePercent: point.analysis.confidencePercent,
      bands,
      mountingHz: null,
      slowestHz,
      envelope: demodulated(point, averaging.sampleRateHz, point.mounting),
    };
    const key = JSON.stringify([recording, question]);
    const reach = this.#reaches.get(key) ?? recordingReach(recording, question);
    this.#reaches.set(key, reach);
    const cannot = adviceOn(recording, reach, { slowestHz, named: heard.length > 0, bands });
    if (point.analysis.averageOver == null) return { recording, reach, cannot };
    // Pooling adds averages, never resolution: only what the spacing forbids still holds.
    const line = lineUncertainty(averaging.effectiveAverages, question.confidencePercent);
    return { recording, reach: { ...reach, line }, cannot: cannot.filter(({ rule }) => rule === 'names') };
  }
}

/** One recording, as long as its segments and their share of it say. */
function recordingOf(averaging: AveragingCheck, skipStartS: number): RecordingKind {
  const { overlapPercent, segmentSamples, sampleRateHz, usedPercent } = averaging;
  const averages = Math.max(1, Math.round(averaging.averages / (averaging.recordings ?? 1)));
  const shape = { overlapPercent, segmentSamples, sampleRateHz };
  const usedS = secondsFor(averages, { ...shape, skipStartS: 0 });
  return {
    ...shape,
    window: averaging.window as WindowName,
    skipStartS,
    durationS: skipStartS + (100 * usedS) / usedPercent,
  };
}

/** In a line; like for like it is the same text, so that it is said once. */
export function showsText({ reach }: PointAdvice): string {
  const { equalTonesHz, unequalTonesHz, line, highestHz, leastNamedHz } = reach;
  const tones =
    equalTonesHz === null || unequalTonesHz === null
      ? 'no two tones apart for certain'
      : `two tones from ${printFrequency(equalTonesHz)} apart on (${printFrequency(unequalTonesHz)} where one is 20 dB weaker)`;
  const level = line === null ? [] : [`a line of noise to ${dbText(line)}`];
  return [
    `up to ${printFrequency(highestHz)}`,
    tones,
    ...level,
    `faults named in the spectrum of shafts from ${printSpeed(leastNamedHz)} on`,
  ].join('; ');
}

interface Told {
  readonly ids: string[];
  advice: Advice;
}

/** What recordings cannot show, over the whole site: one text for all points of one kind, the most demanding one's. */
export function cannotTexts(points: readonly PointCheck[]): string[] {
  const kinds = new Map<string, Told>();
  for (const { point, advice } of points) {
    for (const one of advice?.cannot ?? []) {
      const band = one.rule === 'band-level' ? one.band : null;
      const key = JSON.stringify([one.rule, band, advice?.recording]);
      const told = kinds.get(key) ?? { ids: [], advice: one };
      told.ids.push(pointPath(point));
      if (demands(one) > demands(told.advice)) told.advice = one;
      kinds.set(key, told);
    }
  }
  return [...kinds.values()].map(({ ids, advice }) => `${shortly(ids)}: ${advice.what}; ${advice.remedy}`);
}

function demands({ lineSpacingHz, durationS }: Advice): number {
  return lineSpacingHz === null ? (durationS ?? 0) : 1 / lineSpacingHz;
}

function shortly(ids: readonly string[]): string {
  return ids.length <= 3 ? ids.join(', ') : `${ids.slice(0, 2).join(', ')} and ${ids.length - 2} more`;
}
