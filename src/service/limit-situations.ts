import type { Point } from '../config/site.ts';
import type { LimitSituation } from '../detection/thresholds.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { baselinesOf } from '../store/baselines.ts';
import { findConditionId } from '../store/conditions.ts';
import type { Reader } from '../store/lent-connection.ts';
import { readLevels, seriesOfPoint } from '../store/read-trends.ts';
import type { SiteView } from './site-view.ts';

/** More than a month of a recording every ten minutes: bounds what one limit may read. */
const mostPast = 5000;

/**
 * What the point's limits need besides the levels: baseline, measured speed and load, levels before. Read only for bands
 * with a limit that is reckoned; for the others nothing is asked of the ledger.
 */
export async function limitSituations(
  reader: Reader,
  view: SiteView,
  point: Point,
  measurement: Measurement,
  at: { readonly condition: string | null; readonly usedMs: number },
): Promise<ReadonlyMap<string, LimitSituation>> {
  const rules = point.limits.flatMap(({ bandId, rule }) => (rule === undefined ? [] : [{ bandId, rule }]));
  const bandIds = [...new Set(rules.map(({ bandId }) => bandId))];
  if (bandIds.length === 0) return new Map();
  const { speed, loadPercent } = measurement;
  const speedHz = speed === null || speed.origin === 'nominal' ? null : speed.rpm / 60;
  const pointId = view.ids.pointId(point.machineId, point.id);
  const series = await seriesOfPoint(reader, pointId);
  const conditionId =
    at.condition === null
      ? null
      : await findConditionId(reader, view.ids.machineId(point.machineId), at.condition);
  const situations = new Map<string, LimitSituation>();
  for (const bandId of bandIds) {
    const level = measurement.levels.find((one) => one.bandId === bandId);
    if (level === undefined) continue;
    const ledgerBand = view.ids.bandId(point.machineId, point.id, bandId);
    const own = series.find((one) => one.bandId === ledgerBand && one.fingerprint === level.fingerprint);
    const known = own !== undefined && conditionId !== null ? { seriesId: own.id, conditionId } : null;
    const overMs = Math.max(
      0,
      ...rules.map((one) => (one.bandId === bandId && one.rule.by === 'rate' ? one.rule.overMs : 0)),
    );
    const before =
      known === null
        ? []
        : await pastOf(reader, { pointId, bandId: ledgerBand, ...known }, at.usedMs, overMs);
    const baselines = known === null ? [] : await baselinesOf(reader, [known.seriesId]);
    situations.set(bandId, {
      baseline: baselines.find((one) => one.conditionId === known?.conditionId) ?? null,
      speedHz,
      loadPercent,
      past: [...before, { usedMs: at.usedMs, level: level.level }],
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
  const levels = await readLevels(reader, {
    pointId,
    bandId,
    seriesId,
    fromMs,
    toMs: usedMs,
    limit: mostPast,
  });
  return levels
    .filter((one) => one.conditionId === conditionId && one.level > 0)
    .map((one) => ({ usedMs: one.usedMs, level: one.level }));
}
