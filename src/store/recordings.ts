import type { Insertable, Selectable } from 'kysely';
import type { QualityFinding, StartOrigin } from '../acquisition/recording.ts';
import { jsonOfFinite } from './journal.ts';
import type { Reader, Writer } from './lent-connection.ts';
import type { RecordingsTable } from './schema.ts';

export type RecordingOutcome = 'taken' | 'repeat' | 'quarantined' | 'unassigned';

/** What became of one file. Paths as in RecordingsTable. */
export interface NewRecording {
  readonly identity: string;
  readonly sourceId: number | null;
  readonly contentSha256: string;
  readonly sidecarSha256: string | null;
  readonly statedMs: number | null;
  readonly startOrigin: StartOrigin | null;
  readonly arrivedMs: number;
  readonly usedMs: number | null;
  readonly fileName: string;
  readonly sizeBytes: number;
  readonly durationS: number | null;
  readonly sampleRateHz: number | null;
  readonly channelCount: number | null;
  readonly configVersionId: number;
  readonly outcome: RecordingOutcome;
  readonly reason: string | null;
  readonly evaluated: boolean;
  readonly quality: readonly QualityFinding[];
  readonly filingFrom: string;
  readonly filingTo: string | null;
  readonly filingState: 'pending' | 'filed';
}

export interface StoredRecording extends NewRecording {
  readonly id: number;
}

/** Throws when a recording of that identity is taken already: `findTaken` is asked first, in the same transaction. */
export async function insertRecording(writer: Writer, recording: NewRecording): Promise<number> {
  const row = await writer
    .insertInto('recordings')
    .values(recordingRow(recording))
    .returning('id')
    .executeTakeFirstOrThrow();
  return row.id;
}

export async function findTaken(reader: Reader, identity: string): Promise<StoredRecording | null> {
  const row = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('outcome', '=', 'taken')
    .where('identity', '=', identity)
    .executeTakeFirst();
  return row === undefined ? null : storedRecording(row);
}

/** The newest taken recording of a source with this content, whatever its name and start. */
export async function findTakenByContent(
  reader: Reader,
  sourceId: number,
  contentSha256: string,
): Promise<StoredRecording | null> {
  const row = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('outcome', '=', 'taken')
    .where('content_sha256', '=', contentSha256)
    .where('source_id', '=', sourceId)
    .orderBy('id', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row === undefined ? null : storedRecording(row);
}

/** Taken recordings of a source whose used time lies in [fromMs, toMs], oldest first. */
export async function takenBetween(
  reader: Reader,
  sourceId: number,
  range: { readonly fromMs: number; readonly toMs: number; readonly limit: number },
): Promise<StoredRecording[]> {
  const rows = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('outcome', '=', 'taken')
    .where('source_id', '=', sourceId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<=', range.toMs)
    .orderBy('used_ms')
    .orderBy('id')
    .limit(range.limit)
    .execute();
  return rows.map(storedRecording);
}

/** The taken recording of a source with the newest used time. */
export async function latestTaken(reader: Reader, sourceId: number): Promise<StoredRecording | null> {
  const row = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('outcome', '=', 'taken')
    .where('source_id', '=', sourceId)
    .orderBy('used_ms', 'desc')
    .orderBy('id', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row === undefined ? null : storedRecording(row);
}

export async function recordingById(reader: Reader, id: number): Promise<StoredRecording | null> {
  const row = await reader.selectFrom('recordings').selectAll().where('id', '=', id).executeTakeFirst();
  return row === undefined ? null : storedRecording(row);
}

/** Files that are decided on and still to be moved, in the order of the decisions, from behind `afterId` on. */
export async function pendingFilings(reader: Reader, limit: number, afterId = 0): Promise<StoredRecording[]> {
  const rows = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('filing_state', '=', 'pending')
    .where('id', '>', afterId)
    .orderBy('id')
    .limit(limit)
    .execute();
  return rows.map(storedRecording);
}

/**
 * `filingTo`: where it went in the end, when a name was taken there; null: it lies nowhere (deleted, gone, replaced
 * before it could be moved). Filing twice changes nothing.
 */
export async function markFiled(writer: Writer, id: number, filingTo?: string | null): Promise<void> {
  await writer
    .updateTable('recordings')
    .set({ filing_state: 'filed', ...(filingTo === undefined ? {} : { filing_to: filingTo }) })
    .where('id', '=', id)
    .execute();
}

/** Files that arrived since then, by what became of them; what did not occur counts 0. */
export async function countByOutcome(
  reader: Reader,
  sinceArrivedMs: number,
): Promise<Record<RecordingOutcome, number>> {
  const rows = await reader
    .selectFrom('recordings')
    .select(({ fn }) => ['outcome', fn.countAll<number>().as('count')])
    .where('arrived_ms', '>=', sinceArrivedMs)
    .groupBy('outcome')
    .orderBy('outcome')
    .execute();
  const counts: Record<RecordingOutcome, number> = { taken: 0, repeat: 0, quarantined: 0, unassigned: 0 };
  for (const row of rows) counts[row.outcome as RecordingOutcome] = row.count;
  return counts;
}

/** The newest files of one outcome, newest first. */
export async function recentByOutcome(
  reader: Reader,
  outcome: RecordingOutcome,
  limit: number,
): Promise<StoredRecording[]> {
  const rows = await reader
    .selectFrom('recordings')
    .selectAll()
    .where('outcome', '=', outcome)
    .orderBy('arrived_ms', 'desc')
    .orderBy('id', 'desc')
    .limit(limit)
    .execute();
  return rows.map(storedRecording);
}

function recordingRow(recording: NewRecording): Insertable<RecordingsTable> {
  return {
    identity: recording.identity,
    source_id: recording.sourceId,
    content_sha256: recording.contentSha256,
    sidecar_sha256: recording.sidecarSha256,
    stated_ms: recording.statedMs,
    start_origin: recording.startOrigin,
    arrived_ms: recording.arrivedMs,
    used_ms: recording.usedMs,
    file_name: recording.fileName,
    size_bytes: recording.sizeBytes,
    duration_s: recording.durationS,
    sample_rate_hz: recording.sampleRateHz,
    channel_count: recording.channelCount,
    config_version_id: recording.configVersionId,
    outcome: recording.outcome,
    reason: recording.reason,
    evaluated: recording.evaluated ? 1 : 0,
    quality: jsonOfFinite(recording.quality),
    filing_from: recording.filingFrom,
    filing_to: recording.filingTo,
    filing_state: recording.filingState,
  };
}

function storedRecording(row: Selectable<RecordingsTable>): StoredRecording {
  return {
    id: row.id,
    identity: row.identity,
    sourceId: row.source_id,
    contentSha256: row.content_sha256,
    sidecarSha256: row.sidecar_sha256,
    statedMs: row.stated_ms,
    startOrigin: row.start_origin as StartOrigin | null,
    arrivedMs: row.arrived_ms,
    usedMs: row.used_ms,
    fileName: row.file_name,
    sizeBytes: row.size_bytes,
    durationS: row.duration_s,
    sampleRateHz: row.sample_rate_hz,
    channelCount: row.channel_count,
    configVersionId: row.config_version_id,
    outcome: row.outcome as RecordingOutcome,
    reason: row.reason,
    evaluated: row.evaluated === 1,
    quality: JSON.parse(row.quality) as QualityFinding[],
    filingFrom: row.filing_from,
    filingTo: row.filing_to,
    filingState: row.filing_state as 'pending' | 'filed',
  };
}
