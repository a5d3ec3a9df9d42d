import { createHash } from 'node:crypto';
import { fitName, madeUpName, markedName, nameOf, nameProblem, pathBytes } from './file-name.ts';

/**
 * Where a file goes, as a path below the data folder; pure, so that the place is decided in the same transaction as
 * everything else about the recording. Names that cannot be kept are replaced, names that are too long are cut.
 */
export function archivePlace(path: string, usedMs: number, sha256: string): string {
  const date = new Date(usedMs).toISOString();
  return `archive/${date.slice(0, 4)}/${date.slice(5, 7)}/${date.slice(8, 10)}/${filedName(path, sha256)}`;
}

export function quarantinePlace(path: string, sha256: string): string {
  return `quarantine/${filedName(path, sha256)}`;
}

export function unassignedPlace(path: string, sha256: string): string {
  return `unassigned/${filedName(path, sha256)}`;
}

/** Name under which a file from the drop folder is filed; `path` is a `pathText`. */
export function filedName(path: string, sha256: string): string {
  const bytes = pathBytes(path);
  const name = bytes.subarray(bytes.lastIndexOf(0x2f) + 1);
  const unusable = nameProblem(name) !== null || name[0] === 0x2e;
  return unusable ? madeUpName(name, sha256) : fitName(name.toString('utf8'));
}

/** The places that are tried one after another: NAME, NAME~hash, NAME~hash~2, ... */
export function placesFor(to: string, sha256: string): string[] {
  const marked = to.slice(0, to.length - nameOf(to).length) + markedName(nameOf(to), sha256);
  return [to, marked, ...[2, 3, 4, 5, 6, 7, 8, 9].map((n) => `${marked}~${n}`)];
}

/** Hidden names under which files are set aside begin like this. */
export const setAsidePrefix = '.humledger-';

/** Path below the drop folder of the hidden name, the same for the same order at every attempt. */
export function setAsidePath({ from, sha256 }: { readonly from: string; readonly sha256: string }): string {
  const mark = createHash('sha256')
    .update(JSON.stringify([from, sha256]))
    .digest('hex')
    .slice(0, 24);
  const bytes = pathBytes(from);
  return bytes.subarray(0, bytes.lastIndexOf(0x2f) + 1).toString('utf8') + setAsidePrefix + mark;
}
