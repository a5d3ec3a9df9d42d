import { nameOf, sidecarNameOf } from '../acquisition/file-name.ts';
import type { SeenFile } from '../acquisition/sweep.ts';
import type { Point } from '../config/site.ts';
import type { SiteView } from './site-view.ts';

/** Which sidecar belongs to which recording, by their names. */
export function sidecarPairs(files: readonly SeenFile[]): Map<string, SeenFile> {
  const byPath = new Map(files.map((file) => [file.path, file]));
  const found = new Map<string, SeenFile>();
  for (const file of files) {
    if (isSidecarName(file.path)) continue;
    const sidecar = byPath.get(sidecarPathOf(file.path));
    if (sidecar !== undefined && sidecar.nameProblem === null) found.set(file.path, sidecar);
  }
  return found;
}

export function isSidecarName(path: string): boolean {
  return /\.json$/i.test(path);
}

/** Path of the sidecar of a recording. */
export function sidecarPathOf(path: string): string {
  const name = nameOf(path);
  return path.slice(0, path.length - name.length) + sidecarNameOf(name);
}

const recordingEndings = ['wav', 'csv', 'txt', 'uff', 'unv', 'npy', 'h5', 'hdf5'].flatMap((ending) => [
  `.${ending}`,
  `.${ending.toUpperCase()}`,
]);

/** The source whose recording the sidecar would belong to; null where no point would take one of that name. */
export function sourceOfSidecar(path: string, view: Pick<SiteView, 'files'>): string | null {
  const stem = path.slice(0, path.length - '.json'.length);
  for (const ending of recordingEndings) {
    const source = view.files.sourceOf(stem + ending);
    if (source !== null) return source;
  }
  return null;
}

/** How long a recording that has settled still waits for the sidecar that its points expect; 0: not at all. */
export function waitForSidecarMs(
  points: readonly Point[],
  sidecar: SeenFile | null,
  firstSeenMs: number,
  monotonicMs: number,
  incompleteAfterMs: number,
): number {
  if (sidecar !== null || !points.some(({ recordings }) => recordings.sidecar === 'expected')) return 0;
  return firstSeenMs + incompleteAfterMs - monotonicMs;
}
