/**
 * One walk through the drop folder. Nothing is opened: kinds of files are told by `lstat`, so that a FIFO cannot hold
 * the service up and a link is never followed. A folder that is missing or cannot be read is an answer, not an error.
 */
import type { Dirent, Stats } from 'node:fs';
import { lstat, readdir } from 'node:fs/promises';
import { codedPrefix, nameProblem, pathText } from './file-name.ts';
import { setAsidePrefix } from './filing-place.ts';

/** A regular file with one name, as it was seen. */
export interface SeenFile {
  /** Below the drop folder, with `/`; as `pathText` gives it. */
  readonly path: string;
  readonly dev: number;
  readonly ino: number;
  readonly size: number;
  readonly mtimeMs: number;
  readonly ctimeMs: number;
  /** What is wrong with its name; such a file is quarantined under a made-up name. */
  readonly nameProblem: string | null;
}

export interface LeftAlone {
  readonly path: string;
  readonly reason: string;
}

export type Sweep =
  | {
      readonly state: 'read';
      /** Sorted by path. */
      readonly files: readonly SeenFile[];
      /** Links, devices, files with several names, folders that cannot be read: told once, never touched. */
      readonly leftAlone: readonly LeftAlone[];
      /** Hidden names under which filing has set files aside and not come back to. */
      readonly setAside: readonly string[];
      /** True where there was more than the bounds allow; the rest is seen when these are gone. */
      readonly cut: boolean;
      readonly folderInode: string;
    }
  | { readonly state: 'missing' | 'unreadable'; readonly reason: string };

export interface SweepBounds {
  readonly mostFiles: number;
  readonly deepest: number;
}

export const usualBounds: SweepBounds = { mostFiles: 100_000, deepest: 16 };

/** Entries that are looked at together; more would not be faster, fewer would be slower on a network share. */
const lookedAtOnce = 64;

interface Found {
  readonly files: SeenFile[];
  readonly leftAlone: LeftAlone[];
  readonly setAside: string[];
  /** Files that count for the bound. */
  counted: number;
  cut: boolean;
}

/**
 * Walks the folder. `except`: absolute paths of folders inside it that are not the logger's (the data folder).
 * `isKnown`: files that were read and stay there; they do not count for the bound, or they would hide the new ones.
 */
export async function sweepFolder(
  folder: string,
  except: readonly string[] = [],
  bounds: SweepBounds = usualBounds,
  isKnown: (file: SeenFile) => boolean = () => false,
): Promise<Sweep> {
  const found: Found = { files: [], leftAlone: [], setAside: [], counted: 0, cut: false };
  let root: Stats;
  try {
    root = await lstat(`${folder}/.`);
    await walk(folder, Buffer.alloc(0), 0, { found, bounds, except, isKnown });
  } catch (error) {
    const code = codeOf(error);
    return code === 'ENOENT' || code === 'ENOTDIR'
      ? { state: 'missing', reason: `there is no drop folder ${folder}; make it, or mount it` }
      : { state: 'unreadable', reason: `the drop folder ${folder} cannot be read: ${code}` };
  }
  const byPath = (a: { path: string }, b: { path: string }) => (a.path < b.path ? -1 : 1);
  return {
    state: 'read',
    files: found.files.sort(byPath),
    leftAlone: found.leftAlone.sort(byPath),
    setAside: found.setAside.sort(),
    cut: found.cut,
    folderInode: `${root.dev}:${root.ino}`,
  };
}

interface Walk {
  readonly found: Found;
  readonly bounds: SweepBounds;
  readonly except: readonly string[];
  readonly isKnown: (file: SeenFile) => boolean;
}

/** `below`: bytes of the path below the drop folder, empty or ending in `/`. */
async function walk(folder: string, below: Buffer, depth: number, scene: Walk): Promise<void> {
  const { found, bounds, isKnown } = scene;
  const here = Buffer.concat([Buffer.from(`${folder}/`), below]);
  const entries = await readdir(here, { encoding: 'buffer', withFileTypes: true });
  entries.sort((a, b) => Buffer.compare(a.name, b.name));
  for (let n = 0; n < entries.length; n += lookedAtOnce) {
    if (found.counted >= bounds.mostFiles) {
      found.cut = true;
      return;
    }
    const part = entries.slice(n, n + lookedAtOnce);
    const stats = await Promise.all(part.map((entry) => lookAt(Buffer.concat([here, entry.name]))));
    for (const [index, entry] of part.entries()) {
      const stat = stats[index];
      const path = Buffer.concat([below, entry.name]);
      if (stat === null) continue;
      if (!stat.isDirectory()) note(path, entry, stat, found, isKnown);
      else if (await mayEnter(folder, path, entry, depth, scene)) {
        await enter(folder, path, depth, scene);
      }
    }
  }
}

async function enter(folder: string, path: Buffer, depth: number, scene: Walk): Promise<void> {
  try {
    await walk(folder, Buffer.concat([path, Buffer.from('/')]), depth + 1, scene);
  } catch (error) {
    const code = codeOf(error);
    // A subfolder that went away meanwhile is nothing to tell.
    if (code === 'ENOENT' || code === 'ENOTDIR') return;
    scene.found.leftAlone.push({ path: pathText(path), reason: `the folder cannot be read: ${code}` });
  }
}

async function mayEnter(
  folder: string,
  path: Buffer,
  entry: Dirent<Buffer>,
  depth: number,
  { found, bounds, except }: Walk,
): Promise<boolean> {
  if (entry.name[0] === 0x2e || except.includes(`${folder}/${path.toString('utf8')}`)) return false;
  const problem =
    nameProblem(entry.name) ?? (depth >= bounds.deepest ? `it lies more than ${bounds.deepest} deep` : null);
  if (problem !== null)
    found.leftAlone.push({ path: pathText(path), reason: `the folder is not entered: ${problem}` });
  return problem === null;
}

function note(
  path: Buffer,
  entry: Dirent<Buffer>,
  stat: Stats,
  found: Found,
  isKnown: (file: SeenFile) => boolean,
): void {
  const text = pathText(path);
  const name = entry.name.toString('latin1');
  if (name.startsWith(setAsidePrefix)) {
    found.setAside.push(text);
    return;
  }
  const reason = kindProblem(stat);
  if (reason !== null) {
    found.leftAlone.push({ path: text, reason });
    return;
  }
  // Hidden and unfinished files are somebody's work in progress.
  if (name.startsWith('.') || name.endsWith('.part')) return;
  const { dev, ino, size, mtimeMs, ctimeMs } = stat;
  // The spelling of names that are no text must not be mistaken for a name.
  const problem =
    nameProblem(entry.name) ?? (text.startsWith(codedPrefix) ? `its path begins with ${codedPrefix}` : null);
  const file = { path: text, dev, ino, size, mtimeMs, ctimeMs, nameProblem: problem };
  if (!isKnown(file)) found.counted++;
  found.files.push(file);
}

function kindProblem(stat: Stats): string | null {
  if (stat.isSymbolicLink()) return 'it is a link; links are not followed';
  if (stat.isFIFO()) return 'it is a pipe, not a file';
  if (stat.isSocket()) return 'it is a socket, not a file';
  if (!stat.isFile()) return 'it is a device, not a file';
  return stat.nlink > 1 ? `the file has ${stat.nlink} names (hard links); give it one` : null;
}

async function lookAt(path: Buffer): Promise<Stats | null> {
  try {
    return await lstat(path);
  } catch (error) {
    const code = codeOf(error);
    if (code === 'ENOENT' || code === 'ENOTDIR' || code === 'ENAMETOOLONG') return null;
    throw error;
  }
}

function codeOf(error: unknown): string {
  return error instanceof Error && 'code' in error ? String(error.code) : String(error);
}
