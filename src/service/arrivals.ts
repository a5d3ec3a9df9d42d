import { nameOf, pathBytes, printableName, sidecarNameOf } from '../acquisition/file-name.ts';
import {
  type FileObservation,
  type HeaderLook,
  headerLook,
  type Settling,
  settle,
} from '../acquisition/settling.ts';
import type { SeenFile } from '../acquisition/sweep.ts';
import type { Point } from '../config/site.ts';
import type { FileLook } from './file-source.ts';
import type { HeaderAnswer, HeaderTask } from './recording-task.ts';
import type { SiteView } from './site-view.ts';

/**
 * What lies in the drop folder, and how far each file is: settling, looked into, ready, given up. Kept in memory only:
 * after a restart every file settles again.
 *
 * A recording and its sidecar settle together: a change of either begins the wait anew.
 */
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
}

/** A file that cannot become a recording. */
export interface GivenUp {
  readonly path: string;
  readonly sidecarPath: string | null;
  readonly reason: string;
  readonly source: string | null;
  readonly points: readonly Point[];
  readonly arrivedMs: number;
  readonly kind: 'unreadable' | 'late-sidecar' | 'bad-name';
}

export interface Unassigned {
  readonly path: string;
  readonly look: FileLook;
  readonly arrivedMs: number;
}

export interface Look {
  readonly ready: readonly ReadyRecording[];
  readonly givenUp: readonly GivenUp[];
  readonly unassigned: readonly Unassigned[];
  /** Files still settling, and when the first of them is worth another look. */
  readonly waiting: number;
  readonly againInMs: number | null;
}

interface Watched {
  readonly arrivedMs: number;
  settling: Settling | null;
  looked: HeaderAnswer | null;
}

export interface ArrivalsTools {
  readonly view: () => SiteView;
  readonly wallMs: () => number;
  readonly monotonicMs: () => number;
  readonly header: (task: HeaderTask) => Promise<HeaderAnswer>;
  /** True where `after_reading: keep` left a file that is in the ledger already. */
  readonly isKept: (file: SeenFile) => boolean;
}

type Verdict =
  | { readonly at: 'waiting'; readonly againInMs: number }
  | { readonly at: 'ready'; readonly recording: ReadyRecording }
  | { readonly at: 'given-up'; readonly file: GivenUp }
  | { readonly at: 'unassigned'; readonly file: Unassigned }
  | { readonly at: 'ignored' };

/** Files that are looked into at a time; the worker pool bounds what runs at once. */
const lookedAtOnce = 64;

export class Arrivals {
  readonly #tools: ArrivalsTools;
  #watched = new Map<string, Watched>();

  constructor(tools: ArrivalsTools) {
    this.#tools = tools;
  }

  /** The file changed under the reader, or was replaced: it settles anew. */
  forget(path: string): void {
    this.#watched.delete(path);
  }

  async look(files: readonly SeenFile[]): Promise<Look> {
    const view = this.#tools.view();
    const byPath = new Map(files.map((file) => [file.path, file]));
    const sidecarOf = sidecars(files, byPath);
    const taken = new Set([...sidecarOf.values()].map(({ path }) => path));
    this.#forgetVanished(byPath);
    const verdicts: Verdict[] = [];
    const mains = files.filter((file) => !taken.has(file.path) && !this.#tools.isKept(file));
    for (let n = 0; n < mains.length; n += lookedAtOnce) {
      const part = mains.slice(n, n + lookedAtOnce);
      verdicts.push(
        ...(await Promise.all(part.map((file) => this.#one(view, file, sidecarOf.get(file.path) ?? null)))),
      );
    }
    return collect(verdicts);
  }

  #forgetVanished(byPath: ReadonlyMap<string, SeenFile>): void {
    for (const path of this.#watched.keys()) if (!byPath.has(path)) this.#watched.delete(path);
  }

  async #one(view: SiteView, file: SeenFile, sidecar: SeenFile | null): Promise<Verdict> {
    if (file.nameProblem === null && isSidecarName(file.path)) return this.#orphan(view, file);
    if (file.nameProblem === null && view.files.isIgnored(file.path)) return { at: 'ignored' };
    const points = file.nameProblem === null ? view.files.pointsFor(file.path) : [];
    const watched = this.#watch(file.path);
    const waits = waitsFor(view, points);
    for (;;) {
      const { verdict, state } = settle(watched.settling, this.#observe(file, sidecar, watched), waits);
      if (state.stillSinceMs !== watched.settling?.stillSinceMs) watched.looked = null;
      watched.settling = state;
      if (verdict.verdict === 'wait') return { at: 'waiting', againInMs: verdict.againInMs };
      if (file.nameProblem !== null)
        return givenUp(file, sidecar, watched, view, file.nameProblem, 'bad-name');
      if (points.length === 0)
        return { at: 'unassigned', file: { path: file.path, look: file, arrivedMs: watched.arrivedMs } };
      if (verdict.verdict === 'give-up')
        return givenUp(file, sidecar, watched, view, verdict.reason, 'unreadable');
      if (verdict.verdict === 'look') {
        const answer = await this.#tools.header(this.#headerTask(view, file, sidecar));
        if (answer.kind === 'gone' || answer.kind === 'left-alone') return { at: 'ignored' };
        watched.looked = answer;
        continue;
      }
      const waitMs = waitForSidecarMs(
        points,
        sidecar,
        state,
        this.#tools.monotonicMs(),
        waits.incompleteAfterMs,
      );
      if (waitMs > 0) return { at: 'waiting', againInMs: waitMs };
      return ready(file, sidecar, watched, view, verdict.zeroTail, points);
    }
  }

  #watch(path: string): Watched {
    let watched = this.#watched.get(path);
    if (watched === undefined) {
      watched = { arrivedMs: this.#tools.wallMs(), settling: null, looked: null };
      this.#watched.set(path, watched);
    }
    return watched;
  }

  #observe(file: SeenFile, sidecar: SeenFile | null, watched: Watched): FileObservation {
    return {
      sizeBytes: file.size,
      modifiedMs: Math.max(file.mtimeMs, sidecar?.mtimeMs ?? 0),
      changedMs: Math.max(file.ctimeMs, sidecar?.ctimeMs ?? 0),
      inode: `${file.dev}:${file.ino}${sidecar === null ? '' : `+${sidecar.ino}:${sidecar.size}`}`,
      monotonicMs: this.#tools.monotonicMs(),
      header: watched.looked === null ? null : lookOf(watched.looked, file.size),
    };
  }

  #headerTask(view: SiteView, file: SeenFile, sidecar: SeenFile | null): HeaderTask {
    return {
      task: 'header',
      path: `${view.site.folders.drop}/${file.path}`,
      sidecarPath: sidecar === null ? null : `${view.site.folders.drop}/${sidecar.path}`,
      largestBytes: view.site.largestFileBytes,
    };
  }

  /** A sidecar without its recording: it may come before it, and is given up when none comes. */
  #orphan(view: SiteView, file: SeenFile): Verdict {
    const watched = this.#watch(file.path);
    watched.settling ??= settle(null, this.#observe(file, null, watched), waitsFor(view, [])).state;
    const leftMs =
      watched.settling.firstSeenMs + view.site.timings.incompleteAfterMs - this.#tools.monotonicMs();
    if (leftMs > 0) return { at: 'waiting', againInMs: leftMs };
    const reason = 'no recording came with this sidecar, or it came after its recording had been read';
    return givenUp(file, null, watched, view, reason, 'late-sidecar');
  }
}

/** Absolute path of a file in the drop folder; a name that is no text keeps its bytes. */
export function absolutePath(folder: string, path: string): string | Uint8Array {
  return path.startsWith('bytes:')
    ? Buffer.concat([Buffer.from(`${folder}/`), pathBytes(path)])
    : `${folder}/${path}`;
}

function sidecars(files: readonly SeenFile[], byPath: ReadonlyMap<string, SeenFile>): Map<string, SeenFile> {
  const found = new Map<string, SeenFile>();
  for (const file of files) {
    if (isSidecarName(file.path)) continue;
    const sidecar = byPath.get(
      file.path.slice(0, file.path.length - nameOf(file.path).length) + sidecarNameOf(nameOf(file.path)),
    );
    if (sidecar !== undefined && sidecar.nameProblem === null) found.set(file.path, sidecar);
  }
  return found;
}

function isSidecarName(path: string): boolean {
  return /\.json$/i.test(path);
}

function waitsFor(view: SiteView, points: readonly Point[]) {
  const settleMs =
    points.length === 0 ? 5_000 : Math.max(...points.map(({ recordings }) => recordings.settleMs));
  return { settleMs, incompleteAfterMs: view.site.timings.incompleteAfterMs };
}

function lookOf(answer: HeaderAnswer, size: number): HeaderLook {
  if (answer.kind === 'header') return headerLook(answer.header, size, false, answer.zeroTail);
  if (answer.kind === 'refused') return headerLook(answer.refusal, size, answer.headIsZeros, false);
  return { complete: false, zeroTail: false, refused: null };
}

function waitForSidecarMs(
  points: readonly Point[],
  sidecar: SeenFile | null,
  state: Settling,
  monotonicMs: number,
  incompleteAfterMs: number,
): number {
  if (sidecar !== null || !points.some(({ recordings }) => recordings.sidecar === 'expected')) return 0;
  return state.firstSeenMs + incompleteAfterMs - monotonicMs;
}

function ready(
  file: SeenFile,
  sidecar: SeenFile | null,
  watched: Watched,
  view: SiteView,
  zeroTail: boolean,
  points: readonly Point[],
): Verdict {
  const header = watched.looked;
  if (header?.kind !== 'header') throw new Error(`${file.path} is ready without a header`);
  const source = view.files.sourceOf(file.path) ?? file.path;
  return {
    at: 'ready',
    recording: {
      path: file.path,
      sidecarPath: sidecar?.path ?? null,
      header,
      points,
      source,
      arrivedMs: watched.arrivedMs,
      zeroTail,
    },
  };
}

function givenUp(
  file: SeenFile,
  sidecar: SeenFile | null,
  watched: Watched,
  view: SiteView,
  reason: string,
  kind: GivenUp['kind'],
): Verdict {
  const named = file.nameProblem === null;
  return {
    at: 'given-up',
    file: {
      path: file.path,
      sidecarPath: sidecar?.path ?? null,
      reason: `${printableName(nameOf(file.path))}: ${reason}`,
      source: named ? view.files.sourceOf(file.path) : null,
      points: named ? view.files.pointsFor(file.path) : [],
      arrivedMs: watched.arrivedMs,
      kind,
    },
  };
}

function collect(verdicts: readonly Verdict[]): Look {
  const waits = verdicts.flatMap((verdict) => (verdict.at === 'waiting' ? [verdict.againInMs] : []));
  return {
    ready: verdicts.flatMap((verdict) => (verdict.at === 'ready' ? [verdict.recording] : [])),
    givenUp: verdicts.flatMap((verdict) => (verdict.at === 'given-up' ? [verdict.file] : [])),
    unassigned: verdicts.flatMap((verdict) => (verdict.at === 'unassigned' ? [verdict.file] : [])),
    waiting: waits.length,
    againInMs: waits.length === 0 ? null : Math.min(...waits),
  };
}
