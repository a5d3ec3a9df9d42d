import type { Reader, Writer } from './lent-connection.ts';

/** Files whose analysis was begun and not ended. `unfinished`: how often. */
export interface UnfinishedAttempt {
  readonly fileKey: string;
  readonly fileName: string;
  readonly begunMs: number;
  readonly unfinished: number;
}

/** Committed before a file is analysed; returns how many attempts at it have now been begun and not ended. */
export async function beginAttempt(
  writer: Writer,
  attempt: { readonly fileKey: string; readonly fileName: string; readonly begunMs: number },
): Promise<number> {
  const row = await writer
    .insertInto('attempts')
    .values({
      file_key: attempt.fileKey,
      file_name: attempt.fileName,
      begun_ms: attempt.begunMs,
      unfinished: 1,
    })
    .onConflict((conflict) =>
      conflict.column('file_key').doUpdateSet((to) => ({
        begun_ms: attempt.begunMs,
        unfinished: to('attempts.unfinished', '+', 1),
      })),
    )
    .returning('unfinished')
    .executeTakeFirstOrThrow();
  return row.unfinished;
}

/** Part of the transaction that decides on the file. */
export async function endAttempt(writer: Writer, fileKey: string): Promise<void> {
  await writer.deleteFrom('attempts').where('file_key', '=', fileKey).execute();
}

/** What a service that was stopped had in its hands, first begun first. */
export async function unfinishedAttempts(reader: Reader): Promise<UnfinishedAttempt[]> {
  const rows = await reader
    .selectFrom('attempts')
    .selectAll()
    .orderBy('begun_ms')
    .orderBy('file_key')
    .execute();
  return rows.map((row) => ({
    fileKey: row.file_key,
    fileName: row.file_name,
    begunMs: row.begun_ms,
    unfinished: row.unfinished,
  }));
}

/** A file that stays where it is after reading, as it was when it was read. */
export interface SeenFile {
  readonly path: string;
  readonly sizeBytes: number;
  readonly mtimeMs: number;
  readonly ctimeMs: number;
  readonly recordingId: number | null;
}

export async function seenFile(reader: Reader, path: string): Promise<SeenFile | null> {
  const row = await reader.selectFrom('seen_files').selectAll().where('path', '=', path).executeTakeFirst();
  if (row === undefined) return null;
  return {
    path: row.path,
    sizeBytes: row.size_bytes,
    mtimeMs: row.mtime_ms,
    ctimeMs: row.ctime_ms,
    recordingId: row.recording_id,
  };
}

/** File systems give times as fractions of a millisecond; they are kept, and to be compared, in whole ones. */
export async function noteSeen(writer: Writer, file: SeenFile): Promise<void> {
  const values = {
    size_bytes: file.sizeBytes,
    mtime_ms: Math.floor(file.mtimeMs),
    ctime_ms: Math.floor(file.ctimeMs),
    recording_id: file.recordingId,
  };
  await writer
    .insertInto('seen_files')
    .values({ path: file.path, ...values })
    .onConflict((conflict) => conflict.column('path').doUpdateSet(values))
    .execute();
}

export async function forgetSeen(writer: Writer, path: string): Promise<void> {
  await writer.deleteFrom('seen_files').where('path', '=', path).execute();
}

/** True the first time that this key is told; false ever after. */
export async function tellOnce(writer: Writer, key: string, wallMs: number): Promise<boolean> {
  const rows = await writer
    .insertInto('told_once')
    .values({ key, wall_ms: wallMs })
    .onConflict((conflict) => conflict.column('key').doNothing())
    .returning('key')
    .execute();
  return rows.length === 1;
}

/** Small facts of the service itself, such as when it last started and whether it stopped cleanly. */
export async function readMark(reader: Reader, key: string): Promise<string | null> {
  const row = await reader.selectFrom('meta').select('value').where('key', '=', key).executeTakeFirst();
  return row?.value ?? null;
}

export async function writeMark(writer: Writer, key: string, value: string): Promise<void> {
  if (key === 'ledger-id') throw new Error('the name of a ledger never changes');
  await writer
    .insertInto('meta')
    .values({ key, value })
    .onConflict((conflict) => conflict.column('key').doUpdateSet({ value }))
    .execute();
}
