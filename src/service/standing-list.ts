import type { LimitFacts } from '../advisory/facts.ts';
import type { ChatterFacts } from '../advisory/history-words.ts';
import type { Band, Point, Severity, Site } from '../config/site.ts';
import type { AlarmStanding } from '../detection/alarm.ts';
import { isLongStanding } from '../detection/alarm-history.ts';
import { standing } from '../detection/alarm-state.ts';
import { alarmByNumber, type StandingLife, standingAlarms } from '../store/alarms.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestInTrend } from '../store/past-levels.ts';
import { measurementById } from '../store/read-measurements.ts';
import { readLevels, type TrendPoint } from '../store/read-trends.ts';
import { placesOutOfService, suppressedAlarms } from '../store/suppressions.ts';
import { chatterFactsNow } from './chattering.ts';
import { limitOfLife } from './limit-of-journal.ts';
import { limitFactsNow, limitsInForce } from './limits-in-force.ts';
import { readersView } from './readers-view.ts';
import type { SiteView } from './site-view.ts';
import { type SuppressionNow, suppressionNow } from './suppression-now.ts';

/**
 * One alarm or trouble that stands, is latched, waits to be acknowledged or lies on a shelf, with what the site file says
 * of it.
 */
export interface StandingNow extends StandingLife {
  readonly standing: AlarmStanding;
  /** As it stands for the newest recording. Null where it or its band has left the site file, and for trouble. */
  readonly limit: LimitFacts | null;
  readonly band: Band | null;
  /** Newest level of the band that belongs to the trend. */
  readonly newest: TrendPoint | null;
  /** What holds it back. */
  readonly suppression: SuppressionNow | null;
  /** It comes and goes. */
  readonly chattering: ChatterFacts | null;
  readonly longStanding: boolean;
  /** What was found, of a trouble that says it. */
  readonly detail: string | null;
}

/** Everything that stands, by number; with it what is shelved, also where it has come back meanwhile. */
export async function listStanding(reader: Reader, site: Site, nowMs: number): Promise<StandingNow[]> {
  const found: StandingNow[] = [];
  const view = await readersView(reader, site);
  const places = await placesOutOfService(reader);
  for (const one of await standingOrShelved(reader)) {
    const { alarm, life } = one;
    const { subject } = alarm;
    const point = site.machines
      .find(({ id }) => id === subject.machineId)
      ?.points.find(({ id }) => id === subject.pointId);
    const ofLimit = subject.kind === 'limit' ? subject : null;
    found.push({
      alarm,
      life,
      standing: standing(alarm.state),
      limit: point === undefined || ofLimit === null ? null : await limitNow(reader, view, point, one),
      band: point?.bands.find(({ id }) => id === ofLimit?.bandId) ?? null,
      newest: await newestLevel(reader, alarm),
      suppression: await suppressionNow(reader, alarm, places),
      chattering: await chatterFactsNow(
        reader,
        alarm,
        point?.limits.find(({ id }) => id === ofLimit?.limitId),
      ),
      longStanding: isLongStanding(alarm.state, nowMs),
      detail: ofLimit === null ? await detailOf(reader, life.number) : null,
    });
  }
  return found;
}

async function standingOrShelved(reader: Reader): Promise<StandingLife[]> {
  const lives = await standingAlarms(reader);
  for (const { number, state } of await suppressedAlarms(reader)) {
    if (number === null || state.highest !== null || !state.suppressions.includes('shelved')) continue;
    const found = await alarmByNumber(reader, number);
    if (found !== null) lives.push(found);
  }
  return lives.sort((a, b) => a.life.number - b.life.number);
}

async function limitNow(
  reader: Reader,
  view: SiteView | null,
  point: Point,
  { alarm, life }: StandingLife,
): Promise<LimitFacts | null> {
  const { subject, pointId } = alarm;
  const limitId = subject.kind === 'limit' ? subject.limitId : null;
  const limit = point.limits.find(({ id }) => id === limitId);
  if (limit === undefined) return null;
  const newest = view === null || pointId === null ? null : await newestInTrend(reader, pointId, 0);
  if (view !== null && newest !== null) {
    const all = await limitsInForce(reader, view, point, await measurementById(reader, newest));
    const own = all.find((one) => one.limit.id === limitId);
    if (own !== undefined) return limitFactsNow(own);
  }
  const { id, side, alert, danger } = limit;
  return (await limitOfLife(reader, life.number, id)) ?? { id, side, alert, danger };
}

async function newestLevel(reader: Reader, alarm: StandingLife['alarm']): Promise<TrendPoint | null> {
  const { pointId, limitId } = alarm;
  if (pointId === null || limitId === null) return null;
  const limit = await reader
    .selectFrom('limits')
    .select('band_id')
    .where('id', '=', limitId)
    .executeTakeFirst();
  if (limit === undefined) return null;
  const all = { fromMs: Number.MIN_SAFE_INTEGER, toMs: Number.MAX_SAFE_INTEGER, limit: 1 };
  return (await readLevels(reader, { pointId, bandId: limit.band_id, ...all }))[0] ?? null;
}

/** The newest journal row of the life that says what was found. */
async function detailOf(reader: Reader, number: number): Promise<string | null> {
  const rows = await readJournal(reader, { number, limit: 20 });
  const details = rows.map(({ reason }) => reason.detail ?? reason.file);
  return details.find((detail): detail is string => typeof detail === 'string') ?? null;
}

/** The condition now; of what has returned or is latched, the highest it had. */
export function severityNow({ alarm, life }: StandingLife): Severity {
  const { condition } = alarm.state;
  return condition === 'normal' ? life.severity : condition;
}
