import { createHash } from 'node:crypto';
import { realpathSync } from 'node:fs';
import { basename, dirname, join } from 'node:path';
import { hashingSource, readHead } from '../acquisition/byte-source.ts';
import { sidecarNameOf } from '../acquisition/file-name.ts';
import { readerFor } from '../acquisition/readers.ts';
import {
  isRefusal,
  type QualityFinding,
  type RecordingHeader,
  type Sidecar,
} from '../acquisition/recording.ts';
import { namePattern, startInName } from '../acquisition/start-in-name.ts';
import { type RecordingStart, recordingStart } from '../acquisition/start-time.ts';
import type { SampleLayout } from '../config/sample-layout.ts';
import type { RecordingSettings } from '../config/site.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { openRegularFile, sameFile } from './file-source.ts';
import { type PointTask, readRecording } from './read-recording.ts';
import { readSidecar } from './recording-worker.ts';

/** What a file is measured for, chosen once its header and sidecar are known. */
export interface AnalysisPlan {
  readonly points: readonly PointTask[];
  /** As it is to be applied. */
  readonly sidecar: Sidecar | null;
  readonly clock: RecordingSettings['clock'];
  readonly siteZone: string;
  readonly startInName: string | null;
}

export type PlanFor = (
  header: RecordingHeader,
  sidecar: Sidecar | null,
) => AnalysisPlan | { readonly reason: string };

/** A file's plan, and what is known of its samples' place before it is opened. */
export interface PlannedFile {
  readonly layout: SampleLayout;
  readonly planFor: PlanFor;
}

export interface FileAnalysis {
  readonly sha256: string;
  readonly header: RecordingHeader;
  readonly start: RecordingStart;
  readonly sampleRateHz: number | null;
  readonly frames: number;
  readonly measurements: readonly Measurement[];
  /** Behind each measurement, in full precision; null where it has no spectrum. */
  readonly densities: readonly (Float64Array | null)[];
  /** Channels or points that got nothing, in words. */
  readonly missing: readonly string[];
  /** Findings on the recording as a whole. */
  readonly quality: readonly QualityFinding[];
  /** What was odd but harmless. */
  readonly remarks: readonly string[];
}

/**
 * One file by itself, in the way in which the service measures it: one descriptor, one pass for hash and samples. No
 * ledger, nothing is moved. A link that a person names is followed; what then cannot be read is answered in words.
 */
export async function analyseFile(
  path: string,
  largestBytes: number,
  { layout, planFor }: PlannedFile,
): Promise<FileAnalysis | { readonly reason: string }> {
  const real = realPath(path);
  if (real === null) return { reason: 'there is no such file' };
  const file = openRegularFile(real, largestBytes);
  if ('reason' in file) return { reason: file.reason };
  try {
    const hash = createHash('sha256');
    const source = hashingSource(file.source, (bytes) => hash.update(bytes));
    const reader = readerFor(readHead(source), basename(real));
    if (isRefusal(reader)) return reader;
    await reader.prepare?.();
    const header = reader.header(source, layout);
    if (isRefusal(header)) return header;
    const beside = readSidecar(join(dirname(path), sidecarNameOf(basename(path))));
    const sidecar = beside !== null && 'content' in beside ? beside.content : null;
    const plan = planFor(header, sidecar);
    if ('reason' in plan) return plan;
    const densities: (Float64Array | null)[] = plan.points.map(() => null);
    const read = readRecording(source, reader, header, plan.sidecar, plan.points, (index, density) => {
      densities[index] = density;
    });
    if (isRefusal(read)) return read;
    if (source.finish() !== file.source.size || !sameFile(file.look(), file.first))
      return { reason: 'changed while it was read; try again when it is complete' };
    return {
      ...read,
      sha256: hash.digest('hex'),
      header,
      start: startOf(path, header, plan, file.first.mtimeMs),
      densities: densities.slice(0, read.measurements.length),
      remarks: [
        ...header.remarks,
        ...(beside !== null && 'reason' in beside ? [`its sidecar is left out: ${beside.reason}`] : []),
      ],
    };
  } finally {
    file.close();
  }
}

function startOf(
  path: string,
  header: RecordingHeader,
  plan: AnalysisPlan,
  modifiedMs: number,
): RecordingStart {
  const fileName =
    plan.startInName === null ? null : startInName(namePattern(plan.startInName), path.replaceAll('\\', '/'));
  return recordingStart({
    sidecar: plan.sidecar?.start ?? null,
    fileName,
    header: header.start,
    modifiedMs,
    clock: plan.clock,
    siteZone: plan.siteZone,
    previousMs: null,
  });
}

function realPath(path: string): string | null {
  try {
    return realpathSync(path);
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    if (code === 'ENOENT' || code === 'ENOTDIR' || code === 'ELOOP') return null;
    throw error;
  }
}
