import type { Selectable } from 'kysely';
import type { NotesTable } from './baseline-tables.ts';
import type { Reader, Writer } from './lent-connection.ts';

export const noteKinds = ['repair', 'sensor-changed', 'lubricated', 'balanced', 'remark'] as const;
export type NoteKind = (typeof noteKinds)[number];

/** What was done to a machine, or is to be said of it. */
export interface Note {
  readonly machineId: number;
  /** null: the whole machine. */
  readonly pointId: number | null;
  readonly kind: NoteKind;
  /** Used time from which it holds. */
  readonly atMs: number;
  readonly wallMs: number;
  /** What was found, in people's words. */
  readonly found: string | null;
  readonly by: string;
  readonly comment: string | null;
}

export interface StoredNote extends Note {
  readonly id: number;
}

/** Kinds after which levels are another machine's: nothing is compared across them. */
export const breakingKinds: readonly NoteKind[] = ['repair', 'sensor-changed'];

export async function insertNote(writer: Writer, note: Note): Promise<number> {
  const row = await writer
    .insertInto('notes')
    .values({
      machine_id: note.machineId,
      point_id: note.pointId,
      kind: note.kind,
      at_ms: Math.round(note.atMs),
      wall_ms: Math.round(note.wallMs),
      found: note.found,
      by_name: note.by,
      comment: note.comment,
    })
    .returning('id')
    .executeTakeFirstOrThrow();
  return row.id;
}

/** Notes of a machine with their time in [fromMs, toMs), oldest first; of all its points, or of one and the whole. */
export async function notesOf(
  reader: Reader,
  range: {
    readonly machineId?: number;
    readonly pointId?: number;
    readonly fromMs: number;
    readonly toMs: number;
  },
): Promise<StoredNote[]> {
  let query = reader
    .selectFrom('notes')
    .selectAll()
    .where('at_ms', '>=', range.fromMs)
    .where('at_ms', '<', range.toMs);
  const { machineId, pointId } = range;
  if (machineId !== undefined) query = query.where('machine_id', '=', machineId);
  if (pointId !== undefined)
    query = query.where((is) => is.or([is('point_id', 'is', null), is('point_id', '=', pointId)]));
  const rows = await query.orderBy('at_ms').orderBy('id').execute();
  return rows.map(storedNote);
}

/** Time of the newest repair or change of sensor of a point up to a time; null: there is none. */
export async function lastBreakMs(
  reader: Reader,
  point: { readonly machineId: number; readonly pointId: number; readonly toMs: number },
): Promise<number | null> {
  const row = await reader
    .selectFrom('notes')
    .select('at_ms')
    .where('machine_id', '=', point.machineId)
    .where((is) => is.or([is('point_id', 'is', null), is('point_id', '=', point.pointId)]))
    .where('kind', 'in', breakingKinds)
    .where('at_ms', '<=', point.toMs)
    .orderBy('at_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.at_ms ?? null;
}

/** The newest repair or change of sensor of a point, or of its machine, up to a time; null: there is none. */
export async function lastBreak(
  reader: Reader,
  { pointId, toMs }: { readonly pointId: number; readonly toMs: number },
): Promise<StoredNote | null> {
  const row = await reader
    .selectFrom('notes')
    .innerJoin('points', 'points.machine_id', 'notes.machine_id')
    .selectAll('notes')
    .where('points.id', '=', pointId)
    .where((is) => is.or([is('notes.point_id', 'is', null), is('notes.point_id', '=', pointId)]))
    .where('notes.kind', 'in', breakingKinds)
    .where('notes.at_ms', '<=', toMs)
    .orderBy('notes.at_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row === undefined ? null : storedNote(row);
}

function storedNote(row: Selectable<NotesTable>): StoredNote {
  return {
    id: row.id,
    machineId: row.machine_id,
    pointId: row.point_id,
    kind: row.kind as NoteKind,
    atMs: row.at_ms,
    wallMs: row.wall_ms,
    found: row.found,
    by: row.by_name,
    comment: row.comment,
  };
}
