import type { Selectable } from 'kysely';
import type { Severity } from '../config/site.ts';
import { type AlarmState, type AlarmSubject, normalState } from '../detection/alarm.ts';
import type { AlarmStatesTable, AlarmsTable } from './alarm-tables.ts';
import type { Reader } from './lent-connection.ts';
import type { Shelf } from './suppressions.ts';

/** The record of one limit or one kind of trouble as it is stored. `number`: the life that stands or last stood. */
export interface StoredAlarm {
  readonly key: string;
  readonly subject: AlarmSubject;
  readonly machineId: number | null;
  readonly pointId: number | null;
  readonly limitId: number | null;
  readonly number: number | null;
  readonly state: AlarmState;
  /** Null where it is not shelved. */
  readonly shelf: Shelf | null;
}

/** One life of an alarm or trouble. `severity`: the highest it has had. */
export interface AlarmLife {
  readonly number: number;
  readonly key: string;
  readonly severity: Severity;
  readonly raisedUsedMs: number | null;
  readonly raisedWallMs: number;
  readonly endedWallMs: number | null;
  readonly acknowledgedWallMs: number | null;
  readonly acknowledgedBy: string | null;
}

export interface StandingLife {
  readonly alarm: StoredAlarm;
  readonly life: AlarmLife;
}

const keysAtOnce = 500;

/** States by key; a key without a row is not in the answer (its state is `normalState`). */
export async function loadAlarms(reader: Reader, keys: readonly string[]): Promise<Map<string, StoredAlarm>> {
  const found = new Map<string, StoredAlarm>();
  for (let from = 0; from < keys.length; from += keysAtOnce) {
    const rows = await reader
      .selectFrom('alarm_states')
      .selectAll()
      .where('key', 'in', keys.slice(from, from + keysAtOnce))
      .orderBy('key')
      .execute();
    for (const row of rows) found.set(row.key, storedAlarm(row));
  }
  return found;
}

export async function loadAlarmsOfMachine(reader: Reader, machineId: number): Promise<StoredAlarm[]> {
  const rows = await reader
    .selectFrom('alarm_states')
    .selectAll()
    .where('machine_id', '=', machineId)
    .orderBy('key')
    .execute();
  return rows.map(storedAlarm);
}

/** Every record there is, also those at rest: one a limit and one a kind of trouble that was ever judged. */
export async function loadAllAlarms(reader: Reader): Promise<StoredAlarm[]> {
  return (await reader.selectFrom('alarm_states').selectAll().orderBy('key').execute()).map(storedAlarm);
}

/** What stands, is latched, or waits to be acknowledged; oldest number first. */
export async function standingAlarms(reader: Reader): Promise<StandingLife[]> {
  const lives = await reader
    .selectFrom('alarms')
    .selectAll()
    .where('ended_wall_ms', 'is', null)
    .orderBy('number')
    .execute();
  const alarms = await loadAlarms(
    reader,
    lives.map((life) => life.key),
  );
  return lives.flatMap((life) => {
    const alarm = alarms.get(life.key);
    return alarm === undefined ? [] : [{ alarm, life: alarmLife(life) }];
  });
}

/** The life of that number, and the record as it is now (which may be in a later life). Null: no such number. */
export async function alarmByNumber(reader: Reader, number: number): Promise<StandingLife | null> {
  const life = await reader.selectFrom('alarms').selectAll().where('number', '=', number).executeTakeFirst();
  if (life === undefined) return null;
  const alarm = (await loadAlarms(reader, [life.key])).get(life.key);
  return alarm === undefined ? null : { alarm, life: alarmLife(life) };
}

/** Lives that began in [fromMs, toMs) of the wall clock, newest first, at most `limit`. */
export async function livesRaised(
  reader: Reader,
  range: { readonly fromMs: number; readonly toMs: number; readonly limit: number },
): Promise<AlarmLife[]> {
  const rows = await reader
    .selectFrom('alarms')
    .selectAll()
    .where('raised_wall_ms', '>=', range.fromMs)
    .where('raised_wall_ms', '<', range.toMs)
    .orderBy('number', 'desc')
    .limit(range.limit)
    .execute();
  return rows.map(alarmLife);
}

/** Standing lives whose limit, point or machine has been retired. */
export async function standingOfRetired(reader: Reader): Promise<StoredAlarm[]> {
  const rows = await reader
    .selectFrom('alarm_states as state')
    .innerJoin('alarms as life', 'life.number', 'state.number')
    .leftJoin('machines', 'machines.id', 'state.machine_id')
    .leftJoin('points', 'points.id', 'state.point_id')
    .leftJoin('limits', 'limits.id', 'state.limit_id')
    .selectAll('state')
    .where('life.ended_wall_ms', 'is', null)
    .where((where) =>
      where.or([
        where('machines.retired_ms', 'is not', null),
        where('points.retired_ms', 'is not', null),
        where('limits.retired_ms', 'is not', null),
      ]),
    )
    .orderBy('state.key')
    .execute();
  return rows.map(storedAlarm);
}

export function storedAlarm(row: Selectable<AlarmStatesTable>): StoredAlarm {
  return {
    key: row.key,
    subject: JSON.parse(row.subject) as AlarmSubject,
    machineId: row.machine_id,
    pointId: row.point_id,
    limitId: row.limit_id,
    number: row.number,
    // What a state of an older program lacks is as in the beginning.
    state: { ...normalState, ...(JSON.parse(row.state) as Partial<AlarmState>) },
    shelf:
      row.shelved_until_ms === null
        ? null
        : {
            sinceMs: row.shelved_ms ?? row.shelved_until_ms,
            untilMs: row.shelved_until_ms,
            by: row.shelved_by ?? '',
            comment: row.shelved_comment,
          },
  };
}

function alarmLife(row: Selectable<AlarmsTable>): AlarmLife {
  return {
    number: row.number,
    key: row.key,
    severity: row.severity as Severity,
    raisedUsedMs: row.raised_used_ms,
    raisedWallMs: row.raised_wall_ms,
    endedWallMs: row.ended_wall_ms,
    acknowledgedWallMs: row.acknowledged_wall_ms,
    acknowledgedBy: row.acknowledged_by,
  };
}
