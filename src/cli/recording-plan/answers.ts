import { printFrequency, printNumber } from '../../config/print-value.ts';
import { planRecording, type RecordingWish } from '../../signal/recording-plan.ts';
import type { RecordingReach } from '../../signal/recording-reach.ts';
import type { RecordingKind } from '../../signal/segment-length.ts';
import { lengthText } from './advice.ts';
import type { WishAnswer } from './plan-text.ts';
import { type PlanQuestion, wishOf } from './question.ts';

/** Of a recording that is as it is: whether it does what was asked, wish by wish. */
export function answersTo(
  question: PlanQuestion,
  recording: RecordingKind,
  reach: RecordingReach,
): WishAnswer[] {
  const { separate, confidence, highestHz } = question.asked;
  const answers: WishAnswer[] = [];
  const add = (asked: string, met: boolean, needs: Partial<RecordingWish>) =>
    answers.push({ asked, met, remedy: met ? null : remedyFor(question, recording, needs) });
  if (highestHz !== null)
    add(`up to ${printFrequency(highestHz)}`, highestHz <= reach.highestHz * (1 + 1e-9), {
      highestHz,
      sampleRateHz: null,
    });
  if (separate !== null) {
    const apart = separate.highHz - separate.lowHz;
    add(
      `${printFrequency(separate.lowHz)} told from ${printFrequency(separate.highHz)}`,
      reach.unequalTonesHz !== null && reach.unequalTonesHz <= apart * (1 + 1e-9),
      { separate },
    );
  }
  if (confidence !== null) {
    const bands = question.bands;
    const known = bands.length > 0 ? reach.bands.map(({ level }) => level) : [reach.line];
    const of = bands.length > 0 ? 'levels of the bands' : 'a single line';
    const met = known.every((one) => one !== null && one.highDb <= confidence.db);
    const spacing = recording.sampleRateHz / recording.segmentSamples;
    add(`${of} within ${printNumber(confidence.db)} dB at ${printNumber(confidence.percent)} %`, met, {
      confidence,
      lineSpacingHz: spacing,
      bands,
    });
  }
  return answers;
}

function remedyFor(question: PlanQuestion, recording: RecordingKind, needs: Partial<RecordingWish>): string {
  const { window, overlapPercent, skipStartS, sampleRateHz } = recording;
  const bare = {
    ...wishOf(question),
    separate: null,
    confidence: null,
    lineSpacingHz: null,
    highestHz: null,
    bands: [],
  };
  const spacing = needs.separate == null ? sampleRateHz / recording.segmentSamples : null;
  const plan = planRecording({
    ...bare,
    window,
    overlapPercent,
    skipStartS,
    sampleRateHz,
    lineSpacingHz: spacing,
    ...needs,
  });
  if ('refused' in plan) return plan.reason;
  const { recording: would, layout } = plan;
  const rate =
    would.sampleRateHz === sampleRateHz ? [] : [`sample_rate: ${printFrequency(would.sampleRateHz, 9)}`];
  const lines = needs.separate == null ? [] : [`line_spacing: ${printNumber(layout.lineSpacingHz, 4)} Hz`];
  const length =
    needs.highestHz == null && would.durationS > recording.durationS
      ? [`duration: ${lengthText(would.durationS)}`]
      : [];
  return `${[...rate, ...lines, ...length].join(' and ') || 'another mounting of the sensor'} would do`;
}
