import type { RecordingHeader, Refusal, Sidecar } from '../acquisition/recording.ts';
import type { SampleLayout } from '../config/sample-layout.ts';
import type { FileLook } from './file-source.ts';
import type { PointTask, RecordingRead } from './read-recording.ts';

/** What the service asks of a worker thread, and what it answers: plain data that can be sent between threads. */
export type RecordingTask = HeaderTask | MeasureTask | HashTask;
export type RecordingAnswer = HeaderAnswer | MeasureAnswer | HashAnswer;

/** Read the header and the sidecar, no samples. */
export interface HeaderTask {
  readonly task: 'header';
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly largestBytes: number;
  /** What the points that take the file say of its samples' place. */
  readonly layout: SampleLayout;
}

/** Read everything once: hash, samples, measurements. */
export interface MeasureTask {
  readonly task: 'measure';
  readonly path: string;
  readonly largestBytes: number;
  /** What the header pass saw; anything else means that the file has changed since. */
  readonly seen: FileLook;
  readonly sidecar: SidecarRead | null;
  readonly points: readonly PointTask[];
}

/** Only the hash, of a file that cannot be used. A name that is no text comes as its bytes. */
export interface HashTask {
  readonly task: 'hash';
  readonly path: string | Uint8Array;
  readonly largestBytes: number;
}

export interface SidecarRead {
  readonly sha256: string;
  readonly look: FileLook;
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
      readonly refusal: Refusal;
      readonly headIsZeros: boolean;
    }
  | { readonly kind: 'left-alone'; readonly reason: string }
  | { readonly kind: 'gone' };

export type MeasureAnswer =
  | (RecordingRead & {
      readonly kind: 'measured';
      readonly look: FileLook;
      readonly sha256: string;
      readonly header: RecordingHeader;
    })
  | { readonly kind: 'refused'; readonly look: FileLook; readonly sha256: string; readonly refusal: Refusal }
  | { readonly kind: 'changed' }
  | { readonly kind: 'gone' };

export type HashAnswer =
  | { readonly kind: 'hashed'; readonly look: FileLook; readonly sha256: string }
  | { readonly kind: 'left-alone' }
  | { readonly kind: 'gone' };
