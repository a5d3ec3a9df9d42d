import type { QualityFinding, RecordingHeader, Refusal, Sidecar } from '../acquisition/recording.ts';
import type { Point } from '../config/site.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import type { FileLook } from './file-source.ts';

/** What the service asks of a worker thread, and what it answers: plain data that can be sent between threads. */
export type RecordingTask = HeaderTask | MeasureTask;

/** Read the header and the sidecar, no samples. */
export interface HeaderTask {
  readonly task: 'header';
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly largestBytes: number;
}

/** Read everything once: hash, samples, measurements. */
export interface MeasureTask {
  readonly task: 'measure';
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly largestBytes: number;
  /** What the header pass saw; anything else means that the file has changed since. */
  readonly seen: FileLook;
  readonly seenSidecarSha256: string | null;
  readonly points: readonly PointTask[];
}

export interface PointTask {
  readonly point: Point;
  /** Nominal running speed of its machine; null where the site file has none. */
  readonly nominalHz: number | null;
}

export interface SidecarRead {
  readonly sha256: string;
  readonly content: Sidecar;
}

export type HeaderAnswer =
  | {
      readonly kind: 'header';
      readonly look: FileLook;
      readonly header: RecordingHeader;
      readonly sidecar: SidecarRead | null;
      /** Set where there is a sidecar that cannot be used. */
      readonly sidecarRefused: string | null;
      /** The last part of the file is all zeros, as in a file that is still being filled. */
      readonly zeroTail: boolean;
    }
  | {
      readonly kind: 'refused';
      readonly look: FileLook;
      readonly refusal: Refusal;
      readonly sidecarSha256: string | null;
    }
  | { readonly kind: 'left-alone'; readonly reason: string }
  | { readonly kind: 'gone' };

export type MeasureAnswer =
  | {
      readonly kind: 'measured';
      readonly look: FileLook;
      readonly sha256: string;
      readonly header: RecordingHeader;
      readonly frames: number;
      readonly sampleRateHz: number | null;
      readonly measurements: readonly Measurement[];
      /** Points whose channel the file does not have, in words. */
      readonly missing: readonly string[];
      /** Findings on the recording as a whole. */
      readonly quality: readonly QualityFinding[];
    }
  | { readonly kind: 'refused'; readonly look: FileLook; readonly sha256: string; readonly refusal: Refusal }
  | { readonly kind: 'changed' }
  | { readonly kind: 'gone' };
