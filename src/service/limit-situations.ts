import type { Point } from '../config/site.ts';
import type { LimitSituation } from '../detection/thresholds.ts';
import type { Measurement, RunningSpeed } from '../manipulation/measurement.ts';
import { baselinesOf } from '../store/baselines.ts';
import { findConditionId } from '../store/conditions.ts';
import type { Reader } from '../store/lent-connection.ts';
import { lastBreak } from '../store/notes.ts';
import { readLevels, seriesOfPoint } from '../store/read-trends.ts';
import type { SiteView } from './site-view.ts';

/** More than a month of a recording every ten minutes: bounds what one limit may read. */
const mostPast = 5000;

/** A recording of a point as far as its limits ask for it, with the ids under which the ledger keeps it. */
export interface JudgedRecording {
  readonly point: Point;
  readonly machineLedgerId: number;
  readonly pointLedgerId: number;
  readonly usedMs: number;
  readonly speed: Pick<RunningSpeed, 'rpm' | 'origin'> | null;
  readonly loadPercent: number | null;
  /** Operating condition; null: outside all of them, or not running. */
  readonly condition: string | null;
  readonly levels: readonly JudgedBand[];
}

interface JudgedBand {
  readonly bandId: string;
  readonly bandLedgerId: number;
  /** SI r.m.s. */
  readonly level: number;
  /** Null: the ledger has no level made under these settings yet. */
  readonly seriesId: number | null;
}

/** What the point's limits need of a recording that is being decided. */
export async function limitSituations(
  reader: Reader,
  view: SiteView,
  point: Point,
  measurement: Measurement,
  at: { readonly condition: string | null; readonly usedMs: number },
): Promise<ReadonlyMap<string, LimitSituation>> {
  if (!point.limits.some(({ rule }) => rule !== undefined)) return new Map();
  const pointLedgerId = view.ids.pointId(point.machineId, point.id);
  const series = await seriesOfPoint(reader, pointLedgerId);
  return situationsOf(reader, {
    ...at,
    point,
    machineLedgerId: view.ids.machineId(point.machineId),
    pointLedgerId,
    speed: measurement.speed,
    loadPercent: measurement.loadPercent,
    levels: measurement.levels.map(({ bandId, level, fingerprint }) => {
      const bandLedgerId = view.ids.bandId(point.machineId, point.id, bandId);
      const own = series.find((one) => one.bandId === bandLedgerId && one.fingerprint === fingerprint);
      return { bandId, bandLedgerId, level, seriesId: own?.id ?? null };
    }),
  });
}

/**
 * Baseline, measured speed and load, levels before: by band. Read only for bands with a limit that is reckoned; for the
 * others nothing is asked of the ledger.
 */
export async function situationsOf(
  reader: Reader,
  recording: JudgedRecording,
): Promise<ReadonlyMap<string, LimitSituation>> {
  const { point, speed, loadPercent, condition, usedMs } = recording;
  const rules = point.limits.flatMap(({ bandId, rule }) => (rule === undefined ? [] : [{ bandId, rule }]));
  const bandIds = [...new Set(rules.map(({ bandId }) => bandId))];
  if (bandIds.length === 0) return new Map();
  const speedHz = speed === null || speed.origin === 'nominal' ? null : speed.rpm / 60;
  const conditionId =
    condition === null ? null : await findConditionId(reader, recording.machineLedgerId, condition);
  const situations = new Map<string, LimitSituation>();
  for (const bandId of bandIds) {
    const level = recording.levels.find((one) => one.bandId === bandId);
    if (level === undefined) continue;
    const { seriesId, bandLedgerId } = level;
    const known = seriesId !== null && conditionId !== null ? { seriesId, conditionId } : null;
    const overMs = Math.max(
      0,
      ...rules.map((one) => (one.bandId === bandId && one.rule.by === 'rate' ? one.rule.overMs : 0)),
    );
    const place = { pointId: recording.pointLedgerId, bandId: bandLedgerId };
    const before = known === null ? [] : await pastOf(reader, { ...place, ...known }, usedMs, overMs);
    const baselines = known === null ? [] : await baselinesOf(reader, [known.seriesId]);
    situations.set(bandId, {
      baseline: baselines.find((one) => one.conditionId === known?.conditionId) ?? null,
      speedHz,
      loadPercent,
      past: [...before, { usedMs, level: level.level }],
    });
  }
  return situations;
}

async function pastOf(
  reader: Reader,
  of: {
    readonly pointId: number;
    readonly bandId: number;
    readonly seriesId: number;
    readonly conditionId: number;
  },
  usedMs: number,
  overMs: number,
): Promise<{ usedMs: number; level: number }[]> {
  if (overMs === 0) return [];
  const { pointId, bandId, seriesId, conditionId } = of;
  const fromMs = Math.floor(usedMs - overMs);
  const brokenMs = (await lastBreak(reader, { pointId, toMs: usedMs }))?.atMs ?? fromMs;
  const levels = await readLevels(reader, {
    pointId,
    bandId,
    seriesId,
    conditionId,
    fromMs: Math.max(fromMs, brokenMs),
    toMs: usedMs,
    limit: mostPast,
  });
  return levels.filter(({ level }) => level > 0).map(({ usedMs: at, level }) => ({ usedMs: at, level }));
}
