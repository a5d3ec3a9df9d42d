import type { AlarmSubject } from '../detection/alarm.ts';
import { subjectKey } from '../detection/alarm.ts';
import type { Writer } from './lent-connection.ts';

interface Move {
  readonly from: string;
  readonly to: string;
  readonly subject: AlarmSubject;
}

/**
 * Alarm records are found by the ids that people use. After machines, points, bands or limits got other ids, this
 * gives each record the key it has now, with its lives and what is still to be told. The journal keeps what it said.
 */
export async function carryAlarmKeys(writer: Writer): Promise<void> {
  const moves = await movesDue(writer);
  if (moves.length === 0) return;
  const leaving = new Set(moves.map((move) => move.from));
  // A key that is taken although its owner does not move belongs to a retired thing, whose lives stay in `alarms`.
  for (const { to } of moves) {
    if (!leaving.has(to)) await writer.deleteFrom('alarm_states').where('key', '=', to).execute();
  }
  // Names may be given on from one to the next, so all step aside before any takes its new one.
  for (const { from } of moves) await rename(writer, from, aside(from));
  for (const { from, to, subject } of moves) {
    await rename(writer, aside(from), to);
    await writer
      .updateTable('alarm_states')
      .set({ subject: JSON.stringify(subject) })
      .where('key', '=', to)
      .execute();
  }
}

function aside(key: string): string {
  return `\u0001renaming ${key}`;
}

async function rename(writer: Writer, from: string, to: string): Promise<void> {
  await writer.updateTable('alarm_states').set({ key: to }).where('key', '=', from).execute();
  await writer.updateTable('alarms').set({ key: to }).where('key', '=', from).execute();
  await writer
    .updateTable('to_tell')
    .set({ key: to })
    .where('key', '=', from)
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .execute();
}

async function movesDue(writer: Writer): Promise<Move[]> {
  const rows = await writer
    .selectFrom('alarm_states as state')
    .leftJoin('machines', 'machines.id', 'state.machine_id')
    .leftJoin('points', 'points.id', 'state.point_id')
    .leftJoin('limits', 'limits.id', 'state.limit_id')
    .leftJoin('bands', 'bands.id', 'limits.band_id')
    .select([
      'state.key',
      'state.subject',
      'machines.id_in_site as machine',
      'points.id_in_site as point',
      'limits.id_in_site as limit',
      'bands.id_in_site as band',
    ])
    .orderBy('state.key')
    .execute();
  return rows.flatMap((row) => {
    const subject = renamed(JSON.parse(row.subject) as AlarmSubject, row);
    const to = subjectKey(subject);
    return to === row.key ? [] : [{ from: row.key, to, subject }];
  });
}

function renamed(
  subject: AlarmSubject,
  names: {
    readonly machine: string | null;
    readonly point: string | null;
    readonly band: string | null;
    readonly limit: string | null;
  },
): AlarmSubject {
  if (subject.kind === 'trouble') {
    return {
      ...subject,
      machineId: names.machine ?? subject.machineId,
      pointId: names.point ?? subject.pointId,
    };
  }
  return {
    ...subject,
    machineId: names.machine ?? subject.machineId,
    pointId: names.point ?? subject.pointId,
    bandId: names.band ?? subject.bandId,
    limitId: names.limit ?? subject.limitId,
  };
}
