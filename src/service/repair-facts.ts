import { comparedDays, type RepairedBand, type RepairFacts } from '../advisory/repair-words.ts';
import { localDay } from '../config/local-time.ts';
import type { Machine, Point } from '../config/site.ts';
import { median } from '../signal/statistics.ts';
import { conditionNames } from '../store/conditions.ts';
import { type DayMedian, mediansOfPoint } from '../store/daily-levels.ts';
import type { Reader } from '../store/lent-connection.ts';
import { breakingKinds, notesOf, type StoredNote } from '../store/notes.ts';
import { newestInTrend } from '../store/past-levels.ts';
import { measurementById } from '../store/read-measurements.ts';
import { seriesOfPoint } from '../store/read-trends.ts';
import { bandFacts, machineFacts, machineOfId, pointFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** What the levels say of the repairs and changed sensors of the last fourteen days. */

const dayMs = 86_400_000;

/** The newest repair first. */
export async function repairsNow(reader: Reader, view: SiteView, nowMs: number): Promise<RepairFacts[]> {
  const { timeZone } = view.site;
  const today = localDay(nowMs, timeZone);
  // Two windows back: what was done before a repair ends the days that it is compared with.
  const notes = (
    await notesOf(reader, { fromMs: nowMs - 2 * (comparedDays + 2) * dayMs, toMs: nowMs + 1 })
  ).filter(({ kind }) => breakingKinds.includes(kind));
  const found: RepairFacts[] = [];
  for (const note of notes) {
    const daysSince = today - localDay(note.atMs, timeZone) - 1;
    const machine = machineOfId(view, note.machineId);
    if (daysSince > comparedDays || machine === undefined) continue;
    const points = machine.points.filter(
      ({ id }) => note.pointId === null || view.ids.pointId(machine.id, id) === note.pointId,
    );
    const bands: RepairedBand[] = [];
    for (const point of points)
      bands.push(...(await pointCompared(reader, view, { machine, point, note, notes, nowMs })));
    const [only] = points;
    found.push({
      kind: note.kind === 'repair' ? 'repair' : 'sensor-changed',
      atMs: note.atMs,
      by: note.by,
      comment: note.comment,
      machine: machineFacts(view, machine.id),
      point: note.pointId === null || only === undefined ? null : pointFacts(view, machine.id, only.id),
      daysSince: Math.max(0, daysSince),
      bands,
    });
  }
  return found.reverse();
}

interface Asked {
  readonly machine: Machine;
  readonly point: Point;
  readonly note: StoredNote;
  readonly notes: readonly StoredNote[];
  readonly nowMs: number;
}

async function pointCompared(reader: Reader, view: SiteView, asked: Asked): Promise<RepairedBand[]> {
  const { machine, point, note, nowMs } = asked;
  const pointId = view.ids.pointId(machine.id, point.id);
  const newestId = await newestInTrend(reader, pointId, note.atMs);
  const newest = newestId === null ? null : await measurementById(reader, newestId);
  if (newest === null) return [];
  const { fromDay, brokenDay, toDay } = daysAround(view, pointId, asked);
  const days = await mediansOfPoint(reader, { pointId, series: newest.levels, fromDay, toDay });
  const series = new Map((await seriesOfPoint(reader, pointId)).map((one) => [one.id, one]));
  const names = await conditionNames(reader);
  return point.bands.flatMap((band) => {
    const bandId = view.ids.bandId(machine.id, point.id, band.id);
    const level = newest.levels.find((one) => one.bandId === bandId);
    if (level === undefined) return [];
    const own = days.filter((day) => day.bandId === bandId && day.seriesId === level.seriesId);
    const compared = bestCompared(own, brokenDay, localDay(nowMs, view.site.timeZone));
    if (compared === null) return [];
    const { conditionId, ...levels } = compared;
    return [
      {
        point: pointFacts(view, machine.id, point.id),
        band: bandFacts(band.id, band, series.get(level.seriesId), machine),
        condition: names.get(conditionId) ?? '',
        ...levels,
      },
    ];
  });
}

/** Fourteen days to both sides, fewer where another repair came between. The day itself may be of both and counts for neither. */
function daysAround(view: SiteView, pointId: number, { note, notes }: Asked) {
  const dayOf = (ms: number) => localDay(ms, view.site.timeZone);
  const brokenDay = dayOf(note.atMs);
  const others = notes
    .filter((one) => one.machineId === note.machineId && (one.pointId === null || one.pointId === pointId))
    .map(({ atMs }) => dayOf(atMs));
  const before = Math.max(...others.filter((day) => day < brokenDay), Number.NEGATIVE_INFINITY);
  const after = Math.min(...others.filter((day) => day > brokenDay), Number.POSITIVE_INFINITY);
  return {
    fromDay: Math.max(brokenDay - comparedDays, before + 1),
    brokenDay,
    toDay: Math.min(brokenDay + 1 + comparedDays, after),
  };
}

/** In the operating condition of which most days are known on the side that has fewer; null: none on both sides. */
function bestCompared(
  days: readonly DayMedian[],
  brokenDay: number,
  today: number,
): (Pick<RepairedBand, 'before' | 'after'> & { readonly conditionId: number }) | null {
  const conditions = [...new Set(days.map(({ conditionId }) => conditionId))];
  const sides = conditions.flatMap((conditionId) => {
    const own = days.filter((day) => day.conditionId === conditionId && day.median > 0 && day.day < today);
    const before = own.filter(({ day }) => day < brokenDay);
    const after = own.filter(({ day }) => day > brokenDay);
    const fewer = Math.min(before.length, after.length);
    return fewer === 0 ? [] : [{ conditionId, fewer, before: side(before), after: side(after) }];
  });
  const [best] = sides.sort((a, b) => b.fewer - a.fewer);
  return best === undefined
    ? null
    : { conditionId: best.conditionId, before: best.before, after: best.after };
}

function side(days: readonly DayMedian[]): RepairedBand['before'] {
  return { level: median(days.map(({ median: level }) => level)), days: days.length };
}
