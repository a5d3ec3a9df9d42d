import { nameOf, printableName } from '../acquisition/file-name.ts';
import type { SeenFile } from '../acquisition/sweep.ts';
import type { Point } from '../config/site.ts';
import type { FileLook } from './file-source.ts';
import type { HeaderAnswer } from './recording-task.ts';
import { sourceOfSidecar } from './sidecar-pairs.ts';
import type { SiteView } from './site-view.ts';

/** What a look at one file of the drop folder comes to. */
export type Verdict =
  | { readonly at: 'waiting'; readonly againInMs: number; readonly points: readonly Point[] }
  | { readonly at: 'ready'; readonly recording: ReadyRecording }
  | { readonly at: 'given-up'; readonly file: GivenUp }
  | { readonly at: 'unassigned'; readonly file: Unassigned }
  | { readonly at: 'not-read'; readonly file: NotRead }
  | { readonly at: 'ignored' };

export interface ReadyRecording {
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly header: Extract<HeaderAnswer, { kind: 'header' }>;
  readonly points: readonly Point[];
  readonly source: string;
  /** Wall time at which the file was first noticed. */
  readonly arrivedMs: number;
  /** Taken although its tail is all zeros, after waiting. */
  readonly zeroTail: boolean;
  /** The site file by which its points were found. */
  readonly view: SiteView;
  /** Where it was filed before, below the data folder: it is taken again from there. Null: it lies in the drop folder. */
  readonly archived: string | null;
}

/** A file that cannot become a recording. */
export interface GivenUp {
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly reason: string;
  readonly source: string | null;
  readonly arrivedMs: number;
  readonly kind: 'unreadable' | 'late-sidecar' | 'bad-name';
}

export interface Unassigned {
  readonly path: string;
  readonly look: FileLook;
  readonly arrivedMs: number;
}

/** A file of a point that cannot be opened, or is too large to be read: it stays where it is, and that is told. */
export interface NotRead {
  readonly path: string;
  readonly source: string;
  readonly reason: string;
}

export interface Look {
  readonly ready: readonly ReadyRecording[];
  readonly givenUp: readonly GivenUp[];
  readonly unassigned: readonly Unassigned[];
  readonly notRead: readonly NotRead[];
  /** Files still settling, and when the first of them is worth another look. */
  readonly waiting: number;
  /** Points that these files are for. */
  readonly waitingFor: readonly Point[];
  readonly againInMs: number | null;
}

/** A file with its sidecar, as a sweep saw them, and since when it has been there. */
export interface Arrival {
  readonly file: SeenFile;
  readonly sidecar: SeenFile | null;
  readonly arrivedMs: number;
  readonly looked: HeaderAnswer | null;
}

export function ready(
  view: SiteView,
  { file, sidecar, arrivedMs, looked }: Arrival,
  points: readonly Point[],
  zeroTail: boolean,
): Verdict {
  if (looked?.kind !== 'header') throw new Error(`${file.path} is ready without a header`);
  const source = view.files.sourceOf(file.path) ?? file.path;
  const sidecarPath = sidecar?.path ?? null;
  return {
    at: 'ready',
    recording: {
      path: file.path,
      sidecarPath,
      header: looked,
      points,
      source,
      arrivedMs,
      zeroTail,
      view,
      archived: null,
    },
  };
}

export function givenUp(
  view: SiteView,
  { file, sidecar, arrivedMs }: Arrival,
  reason: string,
  kind: GivenUp['kind'],
): Verdict {
  const { path } = file;
  const named = file.nameProblem === null;
  const source = kind === 'late-sidecar' ? sourceOfSidecar(path, view) : view.files.sourceOf(path);
  return {
    at: 'given-up',
    file: {
      path,
      sidecarPath: sidecar?.path ?? null,
      reason: `${printableName(nameOf(path))}: ${reason}`,
      source: named ? source : null,
      arrivedMs,
      kind,
    },
  };
}

export function notRead(view: SiteView, { file }: Arrival, reason: string): Verdict {
  const source = view.files.sourceOf(file.path) ?? file.path;
  return {
    at: 'not-read',
    file: { path: file.path, source, reason: `${printableName(nameOf(file.path))}: ${reason}` },
  };
}

export function collect(verdicts: readonly Verdict[]): Look {
  const waits = verdicts.flatMap((verdict) => (verdict.at === 'waiting' ? [verdict.againInMs] : []));
  return {
    ready: verdicts.flatMap((verdict) => (verdict.at === 'ready' ? [verdict.recording] : [])),
    givenUp: verdicts.flatMap((verdict) => (verdict.at === 'given-up' ? [verdict.file] : [])),
    unassigned: verdicts.flatMap((verdict) => (verdict.at === 'unassigned' ? [verdict.file] : [])),
    notRead: verdicts.flatMap((verdict) => (verdict.at === 'not-read' ? [verdict.file] : [])),
    waiting: waits.length,
    waitingFor: verdicts.flatMap((verdict) => (verdict.at === 'waiting' ? verdict.points : [])),
    againInMs: waits.length === 0 ? null : Math.min(...waits),
  };
}
