import { quarantinePlace, unassignedPlace } from '../acquisition/filing-place.ts';
import { recordingIdentity } from '../acquisition/identity.ts';
import type { AlarmChange } from '../detection/alarm.ts';
import type { TroubleSubject } from '../detection/trouble.ts';
import { endAttempt } from '../store/intake-marks.ts';
import type { Writer } from '../store/lent-connection.ts';
import { insertRecording } from '../store/recordings.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { getSource } from '../store/sources.ts';
import { lookAtTrouble, sourceTrouble } from './evaluate.ts';
import type { FileLook } from './file-source.ts';
import type { SiteView } from './site-view.ts';

/** A file that cannot be used, or that no point takes. */
export interface AsideFile {
  readonly path: string;
  /** Of its sidecar, which goes with it. */
  readonly sidecarSha256: string | null;
  readonly look: FileLook;
  readonly sha256: string;
  readonly source: string | null;
  readonly arrivedMs: number;
  readonly outcome: 'quarantined' | 'unassigned';
  /** What tells of it; null: its kind of name was told already. */
  readonly trouble: 'unreadable' | 'late-sidecar' | null;
  readonly reason: string;
  readonly fileKey: string;
}

/** The transaction that sets a file aside: its row with the place it goes to, and the trouble that tells of it. */
export async function decideAside(
  writer: Writer,
  view: SiteView,
  file: AsideFile,
  wallMs: number,
): Promise<number> {
  await endAttempt(writer, file.fileKey);
  const quarantined = file.outcome === 'quarantined';
  const recordingId = await insertRecording(writer, {
    identity: recordingIdentity({
      contentSha256: file.sha256,
      sidecarSha256: file.sidecarSha256,
      source: file.source ?? file.path,
      statedMs: null,
      path: file.path,
      modifiedMs: file.look.mtimeMs,
    }),
    sourceId: file.source === null ? null : (await getSource(writer, file.source)).id,
    contentSha256: file.sha256,
    sidecarSha256: file.sidecarSha256,
    statedMs: null,
    startOrigin: null,
    arrivedMs: Math.round(file.arrivedMs),
    usedMs: null,
    fileName: file.path,
    sizeBytes: file.look.size,
    durationS: null,
    sampleRateHz: null,
    channelCount: null,
    configVersionId: view.ids.configVersionId,
    outcome: file.outcome,
    reason: file.reason,
    evaluated: false,
    quality: [],
    filingFrom: file.path,
    filingTo: quarantined ? quarantinePlace(file.path, file.sha256) : unassignedPlace(file.path, file.sha256),
    filingState: 'pending',
  });
  const change = file.trouble === null ? null : await troubleOf(writer, file, file.trouble, wallMs);
  if (change !== null) {
    await saveAlarmChange(writer, change, {
      ids: view.ids,
      wallMs,
      recordingId,
      actor: 'service',
      via: 'service',
      fromBacklog: false,
    });
  }
  return recordingId;
}

/** One trouble a source, however many of its files cannot be read; a good one ends it. */
function troubleOf(
  writer: Writer,
  file: AsideFile,
  trouble: 'unreadable' | 'late-sidecar',
  wallMs: number,
): Promise<AlarmChange | null> {
  const nobodys = trouble === 'unreadable' ? 'files with unusable names' : 'sidecars of no recording';
  const subject: TroubleSubject = sourceTrouble(trouble, file.source ?? nobodys);
  return lookAtTrouble(writer, subject, {
    present: true,
    usedMs: Math.round(wallMs),
    reason: { file: file.path, detail: file.reason },
  });
}

const uuid = /[0-9a-f]{8}(?:-[0-9a-f]{4}){3}-[0-9a-f]{12}/gi;
/** Eight hex digits or more that are no part of a longer word; a word of letters alone is none. */
const hexRun = /(?<![a-z0-9])(?=[a-f]*[0-9])[0-9a-f]{8,}(?![a-z0-9])/gi;

/** A name with its digits, UUIDs and hex numbers folded, so that a logger's next file of the same kind is no news. */
export function namePattern(path: string): string {
  return path
    .replace(uuid, '#')
    .replace(hexRun, '#')
    .replace(/[0-9]+/g, '#');
}
