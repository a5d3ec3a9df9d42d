import type { AlarmChange, AlarmSubject } from '../detection/alarm.ts';
import { subjectKey } from '../detection/alarm.ts';
import { loadAlarms, type StoredAlarm } from './alarms.ts';
import { appendJournal, appendTelling, jsonOfFinite, tellingIdentity, type Via } from './journal.ts';
import type { Writer } from './lent-connection.ts';
import type { SiteIds } from './site-ids.ts';

/** What the ledger adds to a change: who, when, by which recording. `ids` also names the config version. */
export interface ChangeContext {
  readonly ids: SiteIds;
  readonly wallMs: number;
  readonly recordingId: number | null;
  readonly actor: string;
  readonly via: Via;
  readonly fromBacklog: boolean;
}

export interface ChangeSaved {
  /** The life this change belongs to; null when there is none. */
  readonly number: number | null;
  readonly sequences: readonly number[];
  readonly told: boolean;
}

/**
 * Stores one step of one alarm: its state, its life (a new number when it leaves normal, an end when it is normal
 * again), its journal rows and what is to be told. The step must follow the stored version by one, or leave it as it is
 * (a journal row without a change of state); anything else throws: the state was not read inside this transaction.
 */
export async function saveAlarmChange(
  writer: Writer,
  change: AlarmChange,
  context: ChangeContext,
): Promise<ChangeSaved> {
  const key = subjectKey(change.subject);
  const stored = (await loadAlarms(writer, [key])).get(key) ?? null;
  const storedVersion = stored?.state.version ?? 0;
  const { version } = change.state;
  if (version !== storedVersion && version !== storedVersion + 1) {
    throw new Error(
      `${key} is stored in version ${storedVersion}; a change to version ${version} does not follow`,
    );
  }
  const life = await keepLife(writer, key, stored, change, context);
  const ids = stored ?? subjectIds(change.subject, context.ids);
  if (version !== storedVersion) await keepState(writer, key, change, ids, life.latest);
  const saved = await keepJournal(writer, key, change, context, {
    machineId: ids.machineId,
    number: life.current,
  });
  return { number: life.current, ...saved };
}

/** `current`: the life this step belongs to, also when it ends it; `latest`: the one to remember in the record. */
async function keepLife(
  writer: Writer,
  key: string,
  stored: StoredAlarm | null,
  change: AlarmChange,
  context: ChangeContext,
): Promise<{ readonly current: number | null; readonly latest: number | null }> {
  const before = stored?.state.highest ?? null;
  const { highest, acknowledged } = change.state;
  const number = stored?.number ?? null;
  if (before === null) {
    if (highest === null) return { current: null, latest: number };
    const made = await writer
      .insertInto('alarms')
      .values({
        key,
        severity: highest,
        raised_used_ms: change.state.sinceMs,
        raised_wall_ms: context.wallMs,
        ended_wall_ms: null,
        acknowledged_wall_ms: null,
        acknowledged_by: null,
      })
      .returning('number')
      .executeTakeFirstOrThrow();
    return { current: made.number, latest: made.number };
  }
  if (number === null) throw new Error(`${key} stands without a number`);
  const acknowledgedNow = change.journal.some(({ event }) => event === 'acknowledged');
  const cleared = stored?.state.acknowledged === true && highest !== null && !acknowledged;
  await writer
    .updateTable('alarms')
    .set({
      severity: highest ?? before,
      ...(highest === null ? { ended_wall_ms: context.wallMs } : {}),
      ...(cleared ? { acknowledged_wall_ms: null, acknowledged_by: null } : {}),
      ...(acknowledgedNow ? { acknowledged_wall_ms: context.wallMs, acknowledged_by: context.actor } : {}),
    })
    .where('number', '=', number)
    .execute();
  return { current: number, latest: number };
}

const noShelf = { shelved_ms: null, shelved_until_ms: null, shelved_by: null, shelved_comment: null };

type SubjectIds = Pick<StoredAlarm, 'machineId' | 'pointId' | 'limitId'>;

async function keepState(
  writer: Writer,
  key: string,
  change: AlarmChange,
  ids: SubjectIds,
  number: number | null,
): Promise<void> {
  const moving = {
    number,
    condition: change.state.condition,
    state: jsonOfFinite(change.state),
    version: change.state.version,
    suppressed: change.state.suppressions.length > 0 ? 1 : 0,
    ...(change.state.suppressions.includes('shelved') ? {} : noShelf),
  };
  await writer
    .insertInto('alarm_states')
    .values({
      key,
      subject: JSON.stringify(change.subject),
      machine_id: ids.machineId,
      point_id: ids.pointId,
      limit_id: ids.limitId,
      ...moving,
    })
    .onConflict((conflict) => conflict.column('key').doUpdateSet(moving))
    .execute();
}

async function keepJournal(
  writer: Writer,
  key: string,
  change: AlarmChange,
  context: ChangeContext,
  about: { readonly machineId: number | null; readonly number: number | null },
): Promise<{ readonly sequences: readonly number[]; readonly told: boolean }> {
  const { tell } = change;
  const sequences: number[] = [];
  let telling: { readonly sequence: number; readonly usedMs: number | null } | null = null;
  for (const event of change.journal) {
    const { recordingId, actor, via, wallMs } = context;
    const sequence = await appendJournal(writer, {
      ...event,
      key,
      number: about.number,
      wallMs,
      recordingId,
      configVersionId: context.ids.configVersionId,
      actor,
      via,
    });
    sequences.push(sequence);
    if (tell !== null && event.event === tell.event) telling = { sequence, usedMs: event.usedMs };
  }
  if (tell === null) return { sequences, told: false };
  if (telling === null) throw new Error(`${key}: '${tell.event}' is to be told but is not in its journal`);
  await appendTelling(writer, {
    journalSequence: telling.sequence,
    key,
    number: about.number,
    machineId: about.machineId,
    severity: tell.severity,
    event: tell.event,
    level: tell.level,
    identity: tellingIdentity([key, about.number, tell.event, change.state.version, telling.usedMs]),
    wallMs: context.wallMs,
    fromBacklog: context.fromBacklog,
  });
  return { sequences, told: true };
}

function subjectIds(subject: AlarmSubject, ids: SiteIds): SubjectIds {
  const { machineId, pointId } = subject;
  return {
    machineId: machineId === null ? null : ids.machineId(machineId),
    pointId: machineId === null || pointId === null ? null : ids.pointId(machineId, pointId),
    limitId:
      subject.kind === 'limit' ? ids.limitId(subject.machineId, subject.pointId, subject.limitId) : null,
  };
}
