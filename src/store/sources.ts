import type { Selectable } from 'kysely';
import type { Reader, Writer } from './lent-connection.ts';
import type { SourcesTable } from './schema.ts';

/** One logger's series of files, with its clock. */
export interface Source {
  readonly id: number;
  readonly name: string;
  /** used = stated + this. */
  readonly clockOffsetMs: number;
  readonly newestStatedMs: number | null;
  readonly newestUsedMs: number | null;
  readonly lastArrivedMs: number | null;
  /** Arrival of the newest recording that was evaluated. */
  readonly lastEvaluatedArrivedMs: number | null;
  readonly repeatsInARow: number;
}

export async function findSource(reader: Reader, name: string): Promise<Source | null> {
  const row = await reader.selectFrom('sources').selectAll().where('name', '=', name).executeTakeFirst();
  return row === undefined ? null : source(row);
}

/** The source of that name, made where it is new. */
export async function getSource(writer: Writer, name: string): Promise<Source> {
  const known = await findSource(writer, name);
  if (known !== null) return known;
  const row = await writer
    .insertInto('sources')
    .values({
      name,
      clock_offset_ms: 0,
      newest_stated_ms: null,
      newest_used_ms: null,
      last_arrived_ms: null,
      last_evaluated_arrived_ms: null,
      repeats_in_a_row: 0,
    })
    .returningAll()
    .executeTakeFirstOrThrow();
  return source(row);
}

export async function allSources(reader: Reader): Promise<Source[]> {
  return (await reader.selectFrom('sources').selectAll().orderBy('name').execute()).map(source);
}

/** Stores all of a source but its id and name. */
export async function saveSource(writer: Writer, changed: Source): Promise<void> {
  await writer
    .updateTable('sources')
    .set({
      clock_offset_ms: changed.clockOffsetMs,
      newest_stated_ms: changed.newestStatedMs,
      newest_used_ms: changed.newestUsedMs,
      last_arrived_ms: changed.lastArrivedMs,
      last_evaluated_arrived_ms: changed.lastEvaluatedArrivedMs,
      repeats_in_a_row: changed.repeatsInARow,
    })
    .where('id', '=', changed.id)
    .execute();
}

/** What a point has sent: overdue is judged by arrivals, late and clock rules by used times. */
export interface PointArrivals {
  readonly pointId: number;
  readonly lastArrivedMs: number;
  readonly newestUsedMs: number | null;
  readonly newestEvaluatedUsedMs: number | null;
  /** Recordings taken since the ledger began. */
  readonly recordings: number;
}

/** A recording of the point was taken. Newest times never go back. */
export async function noteArrival(
  writer: Writer,
  pointId: number,
  arrival: { readonly arrivedMs: number; readonly usedMs: number | null; readonly evaluated: boolean },
): Promise<void> {
  const known = (await arrivalsOf(writer, [pointId])).get(pointId);
  const values = {
    last_arrived_ms: Math.max(arrival.arrivedMs, known?.lastArrivedMs ?? arrival.arrivedMs),
    newest_used_ms: later(known?.newestUsedMs ?? null, arrival.usedMs),
    newest_evaluated_used_ms: later(
      known?.newestEvaluatedUsedMs ?? null,
      arrival.evaluated ? arrival.usedMs : null,
    ),
    recordings: (known?.recordings ?? 0) + 1,
  };
  await writer
    .insertInto('point_arrivals')
    .values({ point_id: pointId, ...values })
    .onConflict((conflict) => conflict.column('point_id').doUpdateSet(values))
    .execute();
}

/** The wall clock was set by so much: every arrival is carried over to what it shows now. */
export async function carryArrivals(writer: Writer, byMs: number): Promise<void> {
  await writer
    .updateTable('point_arrivals')
    .set((to) => ({ last_arrived_ms: to('last_arrived_ms', '+', byMs) }))
    .execute();
  await writer
    .updateTable('sources')
    .set((to) => ({
      last_arrived_ms: to('last_arrived_ms', '+', byMs),
      last_evaluated_arrived_ms: to('last_evaluated_arrived_ms', '+', byMs),
    }))
    .execute();
}

/** Arrivals that are still to come by the wall clock count as of now. */
export async function noArrivalAfter(writer: Writer, wallMs: number): Promise<void> {
  await writer
    .updateTable('point_arrivals')
    .set({ last_arrived_ms: wallMs })
    .where('last_arrived_ms', '>', wallMs)
    .execute();
  for (const column of ['last_arrived_ms', 'last_evaluated_arrived_ms'] as const)
    await writer
      .updateTable('sources')
      .set({ [column]: wallMs })
      .where(column, '>', wallMs)
      .execute();
}

/** By point id; a point that never sent anything is not in the answer. Without ids: all points. */
export async function arrivalsOf(
  reader: Reader,
  pointIds?: readonly number[],
): Promise<Map<number, PointArrivals>> {
  let query = reader.selectFrom('point_arrivals').selectAll();
  if (pointIds !== undefined) query = query.where('point_id', 'in', pointIds);
  const rows = await query.orderBy('point_id').execute();
  return new Map(
    rows.map((row) => [
      row.point_id,
      {
        pointId: row.point_id,
        lastArrivedMs: row.last_arrived_ms,
        newestUsedMs: row.newest_used_ms,
        newestEvaluatedUsedMs: row.newest_evaluated_used_ms,
        recordings: row.recordings,
      },
    ]),
  );
}

/** `state` is JSON of whatever the rule of running machines keeps. */
export interface MachineRecord {
  readonly machineId: number;
  readonly state: string;
  readonly usedMs: number | null;
  readonly version: number;
}

export async function loadMachine(reader: Reader, machineId: number): Promise<MachineRecord | null> {
  const row = await reader
    .selectFrom('machine_states')
    .selectAll()
    .where('machine_id', '=', machineId)
    .executeTakeFirst();
  if (row === undefined) return null;
  return { machineId: row.machine_id, state: row.state, usedMs: row.used_ms, version: row.version };
}

/** Stores the next version (the stored one plus one, 1 for the first); any other throws. */
export async function saveMachine(writer: Writer, record: MachineRecord): Promise<void> {
  const stored = (await loadMachine(writer, record.machineId))?.version ?? 0;
  if (record.version !== stored + 1) {
    throw new Error(
      `machine ${record.machineId} is stored in version ${stored}; version ${record.version} does not follow`,
    );
  }
  const values = { state: record.state, used_ms: record.usedMs, version: record.version };
  await writer
    .insertInto('machine_states')
    .values({ machine_id: record.machineId, ...values })
    .onConflict((conflict) => conflict.column('machine_id').doUpdateSet(values))
    .execute();
}

function later(a: number | null, b: number | null): number | null {
  if (a === null || b === null) return a ?? b;
  return Math.max(a, b);
}

function source(row: Selectable<SourcesTable>): Source {
  return {
    id: row.id,
    name: row.name,
    clockOffsetMs: row.clock_offset_ms,
    newestStatedMs: row.newest_stated_ms,
    newestUsedMs: row.newest_used_ms,
    lastArrivedMs: row.last_arrived_ms,
    lastEvaluatedArrivedMs: row.last_evaluated_arrived_ms,
    repeatsInARow: row.repeats_in_a_row,
  };
}
