import type { LevelUncertainty } from '../../signal/level-uncertainty.ts';
import type { OverlapRow } from '../../signal/overlap-gain.ts';
import type { RecordingReach } from '../../signal/recording-reach.ts';
import type { RecordingKind, SegmentLayout } from '../../signal/segment-length.ts';
import type { Advice } from './advice.ts';
import { type Planned, type Reached, siteLines } from './plan-text.ts';
import { type NamedBand, shownBands } from './question.ts';

/** The same for programs, in full precision. */
export function planJson({ question, plan, reach, overlaps }: Planned): Record<string, unknown> {
  return {
    plan: recordingJson(plan.recording, plan.layout),
    widest_line_spacing_hz: plan.widestSpacingHz,
    line_spacing_for: plan.spacingFor,
    site_file: siteLines(plan.recording),
    shows: reachJson(reach, shownBands(question)),
    overlaps: overlaps.map(overlapJson),
  };
}

export function reachedJson(reached: Reached): Record<string, unknown> {
  const { question, recording, reach, overlaps, advice, answers } = reached;
  return {
    recording: recordingJson(recording, reach.layout),
    shows: reachJson(reach, shownBands(question)),
    asked: answers.map(({ asked, met, remedy }) => ({ asked, met, remedy })),
    cannot_show: advice.map(adviceJson),
    overlaps: overlaps.map(overlapJson),
  };
}

export function adviceJson({ rule, band, what, remedy, lineSpacingHz, durationS }: Advice) {
  return { rule, band, text: what, remedy, line_spacing_hz: lineSpacingHz, duration_s: durationS };
}

function recordingJson({ window, overlapPercent, durationS }: RecordingKind, layout: SegmentLayout) {
  return {
    sample_rate_hz: layout.sampleRateHz,
    duration_s: durationS,
    window,
    overlap_percent: overlapPercent,
    segment_samples: layout.segmentSamples,
    line_spacing_hz: layout.lineSpacingHz,
    averages: layout.averages,
    effective_averages: layout.effectiveAverages,
    used_percent: layout.usedPercent,
  };
}

export function reachJson(reach: RecordingReach, bands: readonly NamedBand[]) {
  return {
    highest_hz: reach.highestHz,
    highest_by: reach.highestBy,
    narrowest_band_hz: reach.narrowestBandHz,
    lowest_velocity_hz: reach.lowestIntegratedHz,
    equal_tones_hz: reach.equalTonesHz,
    unequal_tones_hz: reach.unequalTonesHz,
    line: uncertaintyJson(reach.line),
    bands: bands.map(({ name, fromHz, toHz }, n) => ({
      band: name,
      from_hz: fromHz,
      to_hz: toHz,
      level: uncertaintyJson(reach.bands[n]?.level ?? null),
      hindrance: reach.bands[n]?.hindrance ?? null,
    })),
    turns: reach.turns,
    least_named_rpm: 60 * reach.leastNamedHz,
    slowest_repetition_hz: reach.slowestRepetitionHz,
    fastest_repetition_hz: reach.fastestRepetitionHz,
  };
}

function uncertaintyJson(known: LevelUncertainty | null) {
  if (known === null) return null;
  const { lowDb, highDb, degreesOfFreedom, confidencePercent } = known;
  return {
    low_db: lowDb,
    high_db: highDb,
    degrees_of_freedom: degreesOfFreedom,
    confidence_percent: confidencePercent,
  };
}

function overlapJson({
  overlapPercent,
  averages,
  effectiveAverages,
  line,
  shareOfMostPercent,
  repeats,
}: OverlapRow) {
  return {
    overlap_percent: overlapPercent,
    averages,
    effective_averages: effectiveAverages,
    line: uncertaintyJson(line),
    share_of_most_percent: shareOfMostPercent,
    repeats_data: repeats,
  };
}
