import { archivePlace } from '../acquisition/filing-place.ts';
import { recordingIdentity } from '../acquisition/identity.ts';
import type { QualityFinding } from '../acquisition/recording.ts';
import type { Reader } from '../store/lent-connection.ts';
import { findTaken, type NewRecording, type StoredRecording } from '../store/recordings.ts';
import type { Source } from '../store/sources.ts';
import type { FileLook } from './file-source.ts';
import type { MeasureAnswer } from './recording-task.ts';
import type { RecordingTime } from './recording-time.ts';
import type { SiteView } from './site-view.ts';
import type { ReadyRecording } from './verdicts.ts';

/** A recording that was read and is now to be decided on: what it is, and its row in the ledger. */
export interface TakenFile {
  readonly ready: ReadyRecording;
  readonly answer: Extract<MeasureAnswer, { kind: 'measured' }>;
  readonly fileKey: string;
  /** Newest start among the files of this source that wait together. */
  readonly batchNewestStatedMs: number;
}

export function identityOf({ ready, answer }: TakenFile, statedMs: number | null): string {
  return recordingIdentity({
    contentSha256: answer.sha256,
    sidecarSha256: ready.header.sidecar?.sha256 ?? null,
    source: ready.source,
    statedMs,
    path: ready.path,
    modifiedMs: answer.look.mtimeMs,
  });
}

/** In the hour that comes twice the same file may have been kept under the other reading. */
export async function otherReading(
  reader: Reader,
  taken: TakenFile,
  otherMs: number | null,
): Promise<StoredRecording | null> {
  return otherMs === null ? null : findTaken(reader, identityOf(taken, otherMs));
}

/** The recording, and the sidecar that was read with it, as they lay in the drop folder. */
export function looksOf(
  { path, sidecarPath, header }: ReadyRecording,
  look: FileLook,
): ({ readonly path: string } & FileLook)[] {
  const { sidecar } = header;
  const beside = sidecar === null || sidecarPath === null ? [] : [{ path: sidecarPath, ...sidecar.look }];
  return [{ path, ...look }, ...beside];
}

/** What the file as a whole lacks. An incomplete one may be replaced by a second version. */
export function fileFindings({ ready, answer }: TakenFile): QualityFinding[] {
  if (!ready.zeroTail) return [...answer.quality];
  const detail = 'its tail is all zeros: it may not have been written to its end';
  return [...answer.quality, { flag: 'dropouts', detail }];
}

export interface RowFacts {
  readonly identity: string;
  readonly source: Source;
  readonly usedMs: number;
  readonly statedMs: number | null;
  readonly origin: NewRecording['startOrigin'];
}

export function recordingRow(
  view: SiteView,
  taken: TakenFile,
  facts: RowFacts,
): Omit<NewRecording, 'outcome' | 'reason' | 'evaluated'> {
  const { ready, answer } = taken;
  const after = view.site.folders.afterReading;
  const usedMs = Math.round(facts.usedMs);
  return {
    identity: facts.identity,
    sourceId: facts.source.id,
    contentSha256: answer.sha256,
    sidecarSha256: ready.header.sidecar?.sha256 ?? null,
    statedMs: facts.statedMs,
    startOrigin: facts.origin,
    arrivedMs: Math.round(ready.arrivedMs),
    usedMs,
    fileName: ready.path,
    sizeBytes: answer.look.size,
    durationS: answer.sampleRateHz === null ? null : answer.frames / answer.sampleRateHz,
    sampleRateHz: answer.sampleRateHz,
    channelCount: answer.header.channelNames.length,
    configVersionId: view.ids.configVersionId,
    quality: fileFindings(taken),
    filingFrom: ready.path,
    filingTo:
      ready.archived ?? (after === 'archive' ? archivePlace(ready.path, usedMs, answer.sha256) : null),
    filingState: after === 'keep' || ready.archived !== null ? 'filed' : 'pending',
  };
}

export function remarkOf({ ready, answer }: TakenFile, time: RecordingTime): string | null {
  const remarks = [
    ready.header.sidecarRefused,
    time.start.remark,
    ready.zeroTail ? 'its tail is all zeros' : null,
    time.secondVersion ? 'a second version of a recording that was whole: kept, not evaluated' : null,
    ...answer.missing,
    ...answer.header.remarks,
  ].filter((remark) => remark !== null);
  return remarks.length === 0 ? null : remarks.join('; ');
}
