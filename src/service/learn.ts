import { localDay } from '../config/local-time.ts';
import { levelEveryMs } from '../config/meaning.ts';
import type { Band, Machine, Point } from '../config/site.ts';
import { zonesOfBand } from '../config/zone-limits.ts';
import { baselineOf, baselineRules, isOpen } from '../detection/baseline.ts';
import { baselinesOf, goodLevels, type StoredBaseline, saveBaseline } from '../store/baselines.ts';
import { keepDailyLevels } from '../store/daily-levels.ts';
import type { Writer } from '../store/lent-connection.ts';
import { lastBreakMs } from '../store/notes.ts';
import type { SiteView } from './site-view.ts';

/**
 * What a recording adds to daily levels and baselines, inside its transaction. Both move once a day: with the first
 * recording of a later local day, the day before is reckoned, and every baseline that is still open learns from it.
 */
export async function learn(writer: Writer, view: SiteView, point: Point, usedMs: number): Promise<void> {
  const { timeZone } = view.site;
  const dayOf = (ms: number) => localDay(ms, timeZone);
  const pointId = view.ids.pointId(point.machineId, point.id);
  const day = await keepDailyLevels(writer, pointId, usedMs, dayOf);
  if (day === null) return;
  const learned = await writer
    .selectFrom('daily_levels')
    .select(['band_id', 'series_id', 'condition_id'])
    .where('point_id', '=', pointId)
    .where('day', '=', day)
    .where(
      'band_id',
      'in',
      point.bands.map(({ id }) => view.ids.bandId(point.machineId, point.id, id)),
    )
    .orderBy('series_id')
    .orderBy('condition_id')
    .execute();
  const machineId = view.ids.machineId(point.machineId);
  const brokenMs = (await lastBreakMs(writer, { machineId, pointId, toMs: usedMs })) ?? 0;
  const known = await baselinesOf(writer, [...new Set(learned.map((row) => row.series_id))]);
  for (const { band_id: bandId, series_id: seriesId, condition_id: conditionId } of learned) {
    const before = known.find((one) => one.seriesId === seriesId && one.conditionId === conditionId) ?? null;
    if (before !== null && !isOpen(before.state)) continue;
    const learnFromMs = before?.learnFromMs ?? brokenMs;
    await relearn(writer, view, { point, bandId, seriesId, conditionId, learnFromMs, before });
  }
}

/** Reckons one baseline anew from its beginning, and stores it. */
export async function relearn(
  writer: Writer,
  view: SiteView,
  about: {
    readonly point: Point;
    readonly bandId: number;
    readonly seriesId: number;
    readonly conditionId: number;
    readonly learnFromMs: number;
    readonly before: StoredBaseline | null;
  },
): Promise<void> {
  const { point, bandId, seriesId, conditionId, learnFromMs, before } = about;
  const { timeZone } = view.site;
  const pointId = view.ids.pointId(point.machineId, point.id);
  const levels = await goodLevels(
    writer,
    { pointId, bandId, seriesId, conditionId, fromMs: learnFromMs },
    { dayOf: (ms) => localDay(ms, timeZone), mostDays: 2 * baselineRules.refinedDays },
  );
  const band = point.bands.find(({ id }) => view.ids.bandId(point.machineId, point.id, id) === bandId);
  const baseline = baselineOf({
    levels,
    expectedADay: Math.max(1, 86_400_000 / levelEveryMs(point)),
    zoneC: band === undefined ? null : zoneCOf(view.machine(point.machineId), point, band),
    confirmed: before?.confirmed ?? null,
  });
  await saveBaseline(writer, { ...baseline, seriesId, conditionId, learnFromMs });
}

/** Where zone C begins for a band at the machine's nominal speed, SI r.m.s.; null: no table judges it. */
export function zoneCOf(machine: Machine, point: Point, band: Band): number | null {
  const { id: machineId, zones = null, runningSpeedHz } = machine;
  if (zones === null) return null;
  const { quantity, sensorOn = null } = point;
  const answer = zonesOfBand({ machineId, zones, runningSpeedHz, point: { quantity, sensorOn } }, band);
  return answer.ok ? answer.boundaries.bc : null;
}
