import { loadAlarms, type StoredAlarm, storedAlarm } from './alarms.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** Until when a person has shelved an alarm. Times of the wall clock. */
export interface Shelf {
  readonly sinceMs: number;
  readonly untilMs: number;
  readonly by: string;
  readonly comment: string | null;
}

/** A machine (point null) or a point that a person has taken out of service. Times of the wall clock. */
export interface OutOfService {
  readonly machineId: number;
  readonly pointId: number | null;
  /** As the site file calls them. */
  readonly machine: string;
  readonly point: string | null;
  readonly fromMs: number;
  readonly untilMs: number;
  readonly by: string;
  readonly comment: string;
}

/** The record must be stored as shelved; with its next change to a state that is not, the shelf goes by itself. */
export async function setShelf(writer: Writer, key: string, shelf: Shelf | null): Promise<void> {
  await writer
    .updateTable('alarm_states')
    .set({
      shelved_ms: shelf?.sinceMs ?? null,
      shelved_until_ms: shelf?.untilMs ?? null,
      shelved_by: shelf?.by ?? null,
      shelved_comment: shelf?.comment ?? null,
    })
    .where('key', '=', key)
    .execute();
}

/** Alarms whose time on the shelf is over by then. */
export async function shelvesOver(reader: Reader, wallMs: number): Promise<StoredAlarm[]> {
  const rows = await reader
    .selectFrom('alarm_states')
    .selectAll()
    .where('shelved_until_ms', '<=', wallMs)
    .orderBy('shelved_until_ms')
    .orderBy('key')
    .execute();
  return rows.map(storedAlarm);
}

/** Every record under a suppression, also where nothing stands. */
export async function suppressedAlarms(reader: Reader): Promise<StoredAlarm[]> {
  const rows = await reader
    .selectFrom('alarm_states')
    .selectAll()
    .where('suppressed', '=', 1)
    .orderBy('key')
    .execute();
  return rows.map(storedAlarm);
}

/** Records of what stands, is latched, or waits to be acknowledged. */
export async function liveAlarms(reader: Reader): Promise<StoredAlarm[]> {
  const lives = await reader
    .selectFrom('alarms')
    .select('key')
    .where('ended_wall_ms', 'is', null)
    .orderBy('number')
    .execute();
  const alarms = await loadAlarms(
    reader,
    lives.map(({ key }) => key),
  );
  return [...alarms.values()];
}

/** When the next shelf or place ends; null: none. */
export async function nextEndMs(reader: Reader): Promise<number | null> {
  const shelf = await reader
    .selectFrom('alarm_states')
    .select(({ fn }) => fn.min('shelved_until_ms').as('ms'))
    .where('shelved_until_ms', 'is not', null)
    .executeTakeFirst();
  const place = await reader
    .selectFrom('out_of_service')
    .select(({ fn }) => fn.min('until_ms').as('ms'))
    .executeTakeFirst();
  const ends = [shelf?.ms ?? null, place?.ms ?? null].filter((ms) => ms !== null);
  return ends.length === 0 ? null : Math.min(...ends);
}

/** The wall clock was set by so much: a shelf of eight hours still lasts eight hours. */
export async function carryShelves(writer: Writer, byMs: number): Promise<void> {
  await writer
    .updateTable('alarm_states')
    .set((to) => ({
      shelved_ms: to('shelved_ms', '+', byMs),
      shelved_until_ms: to('shelved_until_ms', '+', byMs),
    }))
    .where('shelved_until_ms', 'is not', null)
    .execute();
}

/** A shelf that is still to begin by the wall clock, which was set back while nobody saw it, begins now. */
export async function noShelfAfter(writer: Writer, wallMs: number): Promise<void> {
  await writer
    .updateTable('alarm_states')
    .set((to) => ({
      shelved_until_ms: to(to('shelved_until_ms', '-', to.ref('shelved_ms')), '+', wallMs),
      shelved_ms: wallMs,
    }))
    .where('shelved_ms', '>', wallMs)
    .execute();
}

/** All of them, in the order in which they were taken out. */
export async function placesOutOfService(reader: Reader): Promise<OutOfService[]> {
  const rows = await reader
    .selectFrom('out_of_service as place')
    .innerJoin('machines', 'machines.id', 'place.machine_id')
    .leftJoin('points', 'points.id', 'place.point_id')
    .selectAll('place')
    .select(['machines.id_in_site as machine', 'points.id_in_site as point'])
    .orderBy('place.id')
    .execute();
  return rows.map((row) => ({
    machineId: row.machine_id,
    pointId: row.point_id,
    machine: row.machine,
    point: row.point,
    fromMs: row.from_ms,
    untilMs: row.until_ms,
    by: row.by_name,
    comment: row.comment,
  }));
}

/** 'pump-2', 'pump-2/de-v'. */
export function placePath({ machine, point }: Pick<OutOfService, 'machine' | 'point'>): string {
  return point === null ? machine : `${machine}/${point}`;
}

/** The place by which something of that machine and point (null: of the machine itself) is out of service. */
export function placeOf(
  places: readonly OutOfService[],
  machine: string | null,
  point: string | null,
): OutOfService | null {
  const here = places.filter((one) => one.machine === machine);
  const own = point === null ? undefined : here.find((one) => one.point === point);
  return own ?? here.find((one) => one.point === null) ?? null;
}

/** Once more for the same place: another end, another reason. */
export async function putOutOfService(
  writer: Writer,
  place: Omit<OutOfService, 'machine' | 'point'>,
): Promise<void> {
  await removeOutOfService(writer, place);
  await writer
    .insertInto('out_of_service')
    .values({
      machine_id: place.machineId,
      point_id: place.pointId,
      from_ms: place.fromMs,
      until_ms: place.untilMs,
      by_name: place.by,
      comment: place.comment,
    })
    .execute();
}

/** Whether there was one. */
export async function removeOutOfService(
  writer: Writer,
  { machineId, pointId }: Pick<OutOfService, 'machineId' | 'pointId'>,
): Promise<boolean> {
  const removed = await writer
    .deleteFrom('out_of_service')
    .where('machine_id', '=', machineId)
    .where('point_id', pointId === null ? 'is' : '=', pointId)
    .returning('id')
    .executeTakeFirst();
  return removed !== undefined;
}

/** Troubles of a machine's points that stand, under whatever suppression. */
export async function standingTroubles(reader: Reader, machineId: number): Promise<StoredAlarm[]> {
  const rows = await reader
    .selectFrom('alarm_states')
    .selectAll()
    .where('machine_id', '=', machineId)
    .where('condition', '=', 'trouble')
    .orderBy('key')
    .execute();
  return rows.map(storedAlarm);
}
