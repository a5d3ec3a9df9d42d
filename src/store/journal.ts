import { createHash } from 'node:crypto';
import type { Severity } from '../config/site.ts';
import type { JournalEventName } from '../detection/alarm.ts';
import type { Reader, Writer } from './lent-connection.ts';

export type Via = 'service' | 'command' | 'page' | 'link';

/** One line of history, about an alarm or (key null) about the service, a machine or a point. */
export interface JournalEntry {
  readonly key: string | null;
  readonly number: number | null;
  readonly event: JournalEventName;
  readonly before: string | null;
  readonly after: string | null;
  readonly usedMs: number | null;
  readonly wallMs: number;
  readonly recordingId: number | null;
  readonly configVersionId: number | null;
  readonly actor: string;
  readonly via: Via;
  readonly comment: string | null;
  /** Why, as data; every number in it finite. */
  readonly reason: Readonly<Record<string, unknown>>;
}

export interface JournalRow extends JournalEntry {
  readonly sequence: number;
}

/** An event that people are to be told of. */
export interface NewTelling {
  readonly journalSequence: number;
  readonly key: string | null;
  readonly number: number | null;
  readonly machineId: number | null;
  readonly severity: Severity;
  readonly event: JournalEventName;
  readonly level: number | null;
  readonly identity: string;
  readonly wallMs: number;
  readonly fromBacklog: boolean;
}

/** Adds a row and returns its sequence, which alone gives the journal its order. */
export async function appendJournal(writer: Writer, entry: JournalEntry): Promise<number> {
  const row = await writer
    .insertInto('journal')
    .values({
      key: entry.key,
      number: entry.number,
      event: entry.event,
      before: entry.before,
      after: entry.after,
      used_ms: entry.usedMs,
      wall_ms: entry.wallMs,
      recording_id: entry.recordingId,
      config_version_id: entry.configVersionId,
      actor: entry.actor,
      via: entry.via,
      comment: entry.comment,
      reason: jsonOfFinite(entry.reason),
    })
    .returning('sequence')
    .executeTakeFirstOrThrow();
  return row.sequence;
}

/** An event that is already due to be told (same identity) is not told again. */
export async function appendTelling(writer: Writer, telling: NewTelling): Promise<void> {
  await writer
    .insertInto('to_tell')
    .values({
      journal_sequence: telling.journalSequence,
      key: telling.key,
      number: telling.number,
      machine_id: telling.machineId,
      severity: telling.severity,
      event: telling.event,
      level: telling.level,
      identity: telling.identity,
      wall_ms: telling.wallMs,
      message_id: null,
      from_backlog: telling.fromBacklog ? 1 : 0,
    })
    .onConflict((conflict) => conflict.column('identity').doNothing())
    .execute();
}

/** Names an event for ever, from what it is about; never from a row number of its own. */
export function tellingIdentity(about: readonly (string | number | null)[]): string {
  return createHash('sha256').update(JSON.stringify(about)).digest('hex');
}

export interface JournalPage {
  /** Only rows after this sequence, oldest first; without it the newest rows, newest first. */
  readonly afterSequence?: number;
  /** Only rows before this sequence: the next page of a list that begins with the newest. */
  readonly beforeSequence?: number;
  readonly key?: string;
  readonly number?: number;
  readonly fromWallMs?: number;
  /** Rows at most. */
  readonly limit: number;
}

export async function readJournal(reader: Reader, page: JournalPage): Promise<JournalRow[]> {
  let query = reader.selectFrom('journal').selectAll();
  if (page.afterSequence !== undefined) query = query.where('sequence', '>', page.afterSequence);
  if (page.beforeSequence !== undefined) query = query.where('sequence', '<', page.beforeSequence);
  if (page.key !== undefined) query = query.where('key', '=', page.key);
  if (page.number !== undefined) query = query.where('number', '=', page.number);
  if (page.fromWallMs !== undefined) query = query.where('wall_ms', '>=', page.fromWallMs);
  const rows = await query
    .orderBy('sequence', page.afterSequence === undefined ? 'desc' : 'asc')
    .limit(page.limit)
    .execute();
  return rows.map((row) => ({
    sequence: row.sequence,
    key: row.key,
    number: row.number,
    event: row.event as JournalEventName,
    before: row.before,
    after: row.after,
    usedMs: row.used_ms,
    wallMs: row.wall_ms,
    recordingId: row.recording_id,
    configVersionId: row.config_version_id,
    actor: row.actor,
    via: row.via as Via,
    comment: row.comment,
    reason: JSON.parse(row.reason) as Record<string, unknown>,
  }));
}

/** Sequence of the newest row; 0 in an empty journal. For whoever looks each second whether there is news. */
export async function newestSequence(reader: Reader): Promise<number> {
  const row = await reader
    .selectFrom('journal')
    .select('sequence')
    .orderBy('sequence', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.sequence ?? 0;
}

/** JSON would write NaN and Infinity as null without a word. */
export function jsonOfFinite(value: unknown): string {
  return JSON.stringify(value, (name, part: unknown) => {
    if (typeof part === 'number' && !Number.isFinite(part)) {
      throw new Error(`${name || 'a value'} is ${part}, which the ledger never stores`);
    }
    return part;
  });
}
