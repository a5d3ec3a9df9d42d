import type { AnalysisSettings } from '../config/site.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import { poolDensities } from '../signal/pooled-density.ts';
import type { EnvelopeShare, Measurement, PoolShare } from './measurement.ts';

/**
 * Pooling of short recordings: `average_over: 30 recordings` averages the segments of thirty consecutive recordings of
 * one point as if they were one, so that a burst of a tenth of a second gets a spectrum of thirty averages.
 *
 * In blocks, not sliding: thirty recordings give one level, and the next begins a pool of its own. Levels of a sliding
 * pool would share 29 of 30 recordings with their neighbours: one knock would stay in thirty of them and pass any
 * on-delay, a trend would see a spread far below the true one, and every on-delay would count the same data again.
 * Levels of blocks are independent, so on-delays, baselines and trends mean what they say; the price is that a level
 * comes once a pool, which `check` tells.
 *
 * Rules, quoted by the tests:
 *   P1  A pool holds recordings of one point, one fingerprint of settings, one operating condition, in the order of their
 *       used times. A late recording enters no pool, nor does one that is only a repeat or a second version.
 *   P2  A flagged recording enters no pool. It is judged by itself: it can raise or hold an alarm, never clear one.
 *   P3  A full pool is judged, at the used time of its newest recording, and is over.
 *   P4  A pool ends early when the machine stops or changes its operating condition, when nothing came for longer than
 *       `overdue_after`, when a pool of a time is older than that time, or when the sample rate drifted off its lines. It is judged as it stands, its interval says how
 *       little it holds: a machine that never runs for a whole pool would be blind otherwise.
 *   P5  When the settings change, the pool is dropped: it was made under settings that no longer stand.
 */
export interface Pool {
  readonly settingsFingerprint: string;
  readonly condition: string | null;
  readonly firstUsedMs: number;
  readonly newestUsedMs: number;
  readonly averaging: AveragingSettings;
  /** Mean over the segments of all recordings so far. */
  readonly density: AveragedDensity;
  /** Segments of each recording, in order. */
  readonly segments: readonly number[];
  /** Of those recordings that had one. */
  readonly envelope: PooledEnvelope | null;
  /** Sum of the recordings' lengths. */
  readonly durationS: number;
  /** Of the recordings that had a speed: sum of segments, of segments times speed, lowest and highest less and plus uncertainty. */
  readonly speed: PooledSpeed | null;
}

export interface PooledEnvelope extends EnvelopeShare {
  readonly segments: readonly number[];
}

export interface PooledSpeed {
  readonly segments: number;
  readonly rpmTimesSegments: number;
  readonly lowestRpm: number;
  readonly highestRpm: number;
}

/** A recording that comes to a pooling point in its turn. */
export interface PoolArrival {
  readonly measurement: Measurement;
  readonly usedMs: number;
  readonly running: boolean;
  readonly condition: string | null;
  /** The recording, or this measurement of it, is flagged. */
  readonly flagged: boolean;
}

export interface PoolRule {
  readonly averageOver: NonNullable<AnalysisSettings['averageOver']>;
  readonly expectedEveryMs: number;
  readonly overdueAfterMs: number;
}

export interface PoolStep {
  /** What is kept; null: no pool is open. */
  readonly open: Pool | null;
  /** A pool that ended before this recording, to be judged as it stands (P4). */
  readonly ended: Pool | null;
  /** The pool that this recording filled (P3). */
  readonly full: Pool | null;
  /** The recording entered a pool. */
  readonly entered: boolean;
}

/** One recording more. Pure and total. */
export function poolStep(before: Pool | null, arrival: PoolArrival, rule: PoolRule): PoolStep {
  const sameSettings = before?.settingsFingerprint === arrival.measurement.settingsFingerprint;
  // A flagged recording of other settings, such as a wrong rate, says nothing of the pool.
  const dropped = before !== null && !sameSettings && !arrival.flagged;
  const kept = dropped ? null : before;
  const isOver = kept !== null && ends(kept, arrival, rule);
  const ended = isOver ? kept : null;
  const open = isOver ? null : kept;
  const { share } = arrival.measurement;
  if (!arrival.running || arrival.flagged || share === undefined)
    return { open, ended, full: null, entered: false };
  const grown = withRecording(open, arrival, share);
  const isFull = fills(grown, rule);
  return { open: isFull ? null : grown, ended, full: isFull ? grown : null, entered: true };
}

function ends(pool: Pool, arrival: PoolArrival, rule: PoolRule): boolean {
  const { measurement, running, condition, usedMs, flagged } = arrival;
  if (!running) return true;
  if (usedMs - pool.newestUsedMs > rule.overdueAfterMs) return true;
  if ('ms' in rule.averageOver && usedMs - pool.firstUsedMs > rule.averageOver.ms) return true;
  if (flagged) return false;
  return condition !== pool.condition || !liesOnLines(pool, measurement.share);
}

/** Sample rates that count as the same may still differ by more than half a line at the upper end of the spectrum. */
function liesOnLines(pool: Pool, share: PoolShare | undefined): boolean {
  if (share === undefined) return true;
  const { lineSpacingHz, density } = pool.density;
  return Math.abs(share.density.lineSpacingHz / lineSpacingHz - 1) * density.length < 0.5;
}

/** Of a time: full where the next recording, half an interval early at most, would no longer belong to it. */
function fills(pool: Pool, { averageOver, expectedEveryMs }: PoolRule): boolean {
  if ('recordings' in averageOver) return pool.segments.length >= averageOver.recordings;
  return pool.newestUsedMs + 1.5 * expectedEveryMs - pool.firstUsedMs >= averageOver.ms;
}

function withRecording(pool: Pool | null, arrival: PoolArrival, share: PoolShare): Pool {
  const { measurement, usedMs, condition } = arrival;
  const averaging = pool?.averaging ?? share.averaging;
  const { density } = share;
  return {
    settingsFingerprint: measurement.settingsFingerprint,
    condition,
    firstUsedMs: pool?.firstUsedMs ?? usedMs,
    newestUsedMs: usedMs,
    averaging,
    density: withDensity(pool?.density ?? null, density),
    segments: [...(pool?.segments ?? []), density.averages],
    envelope: withEnvelope(pool?.envelope ?? null, share.envelope),
    durationS: (pool?.durationS ?? 0) + measurement.durationS,
    speed: withSpeed(pool?.speed ?? null, measurement.speed, density.averages),
  };
}

/** Sample rates that count as the same give lines that count as the same: those of the first recording. */
function withDensity(before: AveragedDensity | null, density: AveragedDensity): AveragedDensity {
  if (before === null) return density;
  return poolDensities([before, { ...density, lineSpacingHz: before.lineSpacingHz }]);
}

function withEnvelope(before: PooledEnvelope | null, share: EnvelopeShare | null): PooledEnvelope | null {
  if (share === null || share.density.averages === 0) return before;
  return {
    plan: before?.plan ?? share.plan,
    density: withDensity(before?.density ?? null, share.density),
    segments: [...(before?.segments ?? []), share.density.averages],
  };
}

function withSpeed(
  before: PooledSpeed | null,
  speed: Measurement['speed'],
  segments: number,
): PooledSpeed | null {
  if (speed === null) return before;
  const { rpm, uncertaintyRpm } = speed;
  return {
    segments: (before?.segments ?? 0) + segments,
    rpmTimesSegments: (before?.rpmTimesSegments ?? 0) + rpm * segments,
    lowestRpm: Math.min(before?.lowestRpm ?? Number.POSITIVE_INFINITY, rpm - uncertaintyRpm),
    highestRpm: Math.max(before?.highestRpm ?? Number.NEGATIVE_INFINITY, rpm + uncertaintyRpm),
  };
}
