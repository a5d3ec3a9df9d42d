import type { Severity } from '../config/site.ts';
import type { Reader } from './lent-connection.ts';
import type { Thread } from './threads.ts';

/** When a conversation is over: nothing of its machine stands or waits for a person. */

/** At most one a machine. */
export async function openThreads(reader: Reader): Promise<Thread[]> {
  const rows = await reader
    .selectFrom('threads')
    .selectAll()
    .where('closed_ms', 'is', null)
    // By `id` alone SQLite would read every thread there ever was.
    .orderBy('opened_ms')
    .orderBy('id')
    .execute();
  return rows.map((row) => ({
    id: row.id,
    machineId: row.machine_id,
    openedMs: row.opened_ms,
    subject: row.subject,
    severity: row.severity as Severity,
  }));
}

/** Whether anything of the machine (null: of the site as a whole) has not ended. */
export async function standsFor(reader: Reader, machineId: number | null): Promise<boolean> {
  const row = await reader
    .selectFrom('alarms as life')
    .innerJoin('alarm_states as state', 'state.key', 'life.key')
    .select('life.number')
    .where('life.ended_wall_ms', 'is', null)
    .where('state.machine_id', machineId === null ? 'is' : '=', machineId)
    .limit(1)
    .executeTakeFirst();
  return row !== undefined;
}

/** Whether a life with a number below `beforeNumber` had not ended at that wall time. */
export async function stoodAt(
  reader: Reader,
  machineId: number | null,
  at: { readonly beforeNumber: number; readonly wallMs: number },
): Promise<boolean> {
  const row = await reader
    .selectFrom('alarm_states as state')
    .innerJoin('alarms as life', 'life.key', 'state.key')
    .select('life.number')
    .where('state.machine_id', machineId === null ? 'is' : '=', machineId)
    .where('life.number', '<', at.beforeNumber)
    .where((where) =>
      where.or([where('life.ended_wall_ms', 'is', null), where('life.ended_wall_ms', '>=', at.wallMs)]),
    )
    .limit(1)
    .executeTakeFirst();
  return row !== undefined;
}

/** Whether anything of the machine is still to be put into a message. */
export async function hasUntold(reader: Reader, machineId: number | null): Promise<boolean> {
  const row = await reader
    .selectFrom('to_tell')
    .select('id')
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .where('machine_id', machineId === null ? 'is' : '=', machineId)
    .limit(1)
    .executeTakeFirst();
  return row !== undefined;
}
