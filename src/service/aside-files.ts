import { readFileSync } from 'node:fs';
import { lstat, open, realpath, rename, unlink } from 'node:fs/promises';
import { basename, dirname, isAbsolute, join, relative, resolve, sep } from 'node:path';
import { nameOf, printableName, sidecarNameOf } from '../acquisition/file-name.ts';
import { contentSha256, copyInto, exists, forceToDisk, isSystemError } from '../acquisition/filing-disk.ts';
import { sweepFolder } from '../acquisition/sweep.ts';
import type { Site } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';

/**
 * Files that were set aside: `quarantine/` and `unassigned/` of the data folder. They may be moved back into the drop
 * folder, where the service takes them for new arrivals.
 */
export const asideFolders = ['quarantine', 'unassigned'] as const;
export type AsideFolder = (typeof asideFolders)[number];

export interface AsideFile {
  readonly folder: AsideFolder;
  /** Below that folder. */
  readonly name: string;
  readonly sizeBytes: number;
  readonly modifiedMs: number;
  /** As it was written beside the file, but for the file's name; null where nothing was. */
  readonly reason: string | null;
}

const reasonEnding = '.reason.txt';
const longestReasonBytes = 4096;

/** The files of one folder, by name; reasons and sidecars go with their recordings and are not listed. */
export async function listAside(dataFolder: string, folder: AsideFolder): Promise<AsideFile[]> {
  const sweep = await sweepFolder(join(dataFolder, folder));
  if (sweep.state !== 'read') return [];
  const names = new Set(sweep.files.map(({ path }) => path));
  const sidecars = new Set([...names].filter((name) => !name.endsWith('.json')).map(beside));
  return sweep.files
    .filter(({ path }) => !path.endsWith(reasonEnding) && !sidecars.has(path))
    .map(({ path, size, mtimeMs }) => ({
      folder,
      name: path,
      sizeBytes: size,
      modifiedMs: Math.round(mtimeMs),
      reason: names.has(`${path}${reasonEnding}`) ? reasonOf(join(dataFolder, folder, path)) : null,
    }));
}

function beside(path: string): string {
  return path.slice(0, path.length - nameOf(path).length) + sidecarNameOf(nameOf(path));
}

function reasonOf(path: string): string | null {
  try {
    const text = readFileSync(`${path}${reasonEnding}`).subarray(0, longestReasonBytes).toString('utf8');
    return withoutOwnName(text.trim(), nameOf(path)) || null;
  } catch {
    return null;
  }
}

/** A reason that was written beside a file begins with the file's name; under that name it would stand twice. */
function withoutOwnName(reason: string, name: string): string {
  const unmarked = name.replace(/~[0-9a-f]{8}(~[2-9])?$/, '');
  const own = [name, unmarked].find((one) => reason.startsWith(`${printableName(one)}: `));
  return own === undefined ? reason : reason.slice(printableName(own).length + 2);
}

/** A file of quarantine or unassigned, found by what a person wrote. */
export interface FoundAside {
  readonly folder: AsideFolder;
  readonly name: string;
}

/**
 * The file that is meant by its name, `quarantine/NAME`, or a path. Only regular files below the two folders: a link,
 * a path that leads out of them, or a name that lies in both is refused.
 */
export async function findAside(
  site: Site,
  written: string,
  workingFolder: string,
): Promise<FoundAside | { readonly reason: string }> {
  const data = await realFolder(site.folders.data);
  if (data === null) return { reason: `there is no data folder ${site.folders.data}` };
  const candidates = isAbsolute(written)
    ? [written]
    : [
        resolve(data, written),
        resolve(workingFolder, written),
        ...asideFolders.map((folder) => resolve(data, folder, written)),
      ];
  const found = new Map<string, FoundAside>();
  for (const candidate of candidates) {
    const one = await asideAt(data, candidate);
    if (one !== null) found.set(`${one.folder}/${one.name}`, one);
  }
  const [first, second] = found.values();
  if (first === undefined) {
    return {
      reason: `${printableName(written)} is no file in quarantine or unassigned of ${site.folders.data}; humledger files lists them`,
    };
  }
  if (second !== undefined)
    return {
      reason: `there are ${[...found.keys()].map(printableName).join(' and ')}; name the one that is meant`,
    };
  return first;
}

async function asideAt(data: string, path: string): Promise<FoundAside | null> {
  const folder = await realFolder(dirname(path));
  if (folder === null) return null;
  const below = relative(data, join(folder, basename(path))).split(sep);
  const aside = asideFolders.find((one) => one === below[0]);
  const name = below.slice(1).join('/');
  if (aside === undefined || name === '' || name.endsWith(reasonEnding)) return null;
  try {
    return (await lstat(join(data, aside, name))).isFile() ? { folder: aside, name } : null;
  } catch (error) {
    if (isSystemError(error)) return null;
    throw error;
  }
}

async function realFolder(path: string): Promise<string | null> {
  try {
    return await realpath(path);
  } catch (error) {
    if (isSystemError(error)) return null;
    throw error;
  }
}

/**
 * The path below the drop folder under which a file came, as the ledger has it; without the ledger's word, its name
 * without the mark of a second file. A name that could not be kept stays the made-up one.
 */
export async function pathItCameBy(reader: Reader, { folder, name }: FoundAside): Promise<string> {
  const row = await reader
    .selectFrom('recordings')
    .select('filing_from')
    .where('filing_to', '=', `${folder}/${name}`)
    .orderBy('id', 'desc')
    .limit(1)
    .executeTakeFirst();
  const from = row?.filing_from ?? nameOf(name).replace(/~[0-9a-f]{8}(~[2-9])?$/, '');
  const parts = from.split('/');
  const plain = !from.startsWith('bytes:') && parts.every((part) => part !== '' && !part.startsWith('.'));
  return plain ? from : nameOf(name);
}

/**
 * Moves the file, its sidecar first, into the drop folder under that path and drops its reason. Nothing is overwritten:
 * the name is claimed by an empty file made only where there is none, which the rename then replaces.
 */
export async function takeAgain(
  site: Site,
  { folder, name }: FoundAside,
  to: string,
): Promise<{ readonly moved: readonly string[] } | { readonly reason: string }> {
  const { data, drop } = site.folders;
  const from = join(data, folder, name);
  const sidecarFrom = join(data, folder, beside(name));
  const moves = [{ from, to: join(drop, to), shown: to }];
  const hasSidecar = beside(name) !== name && (await exists(Buffer.from(sidecarFrom)));
  if (hasSidecar) moves.unshift({ from: sidecarFrom, to: join(drop, beside(to)), shown: beside(to) });
  const claimed: string[] = [];
  try {
    if ((await realFolder(dirname(join(drop, to)))) === null)
      return { reason: `there is no folder ${dirname(join(drop, to))} to move it to; make it first` };
    for (const move of moves) {
      await (await open(move.to, 'wx')).close();
      claimed.push(move.to);
    }
    for (const move of moves) {
      await moveOver(move.from, move.to);
      claimed.shift();
    }
  } catch (error) {
    for (const path of claimed) await unlink(path).catch(() => {});
    if (!isSystemError(error)) throw error;
    if (error.code === 'EEXIST')
      return {
        reason: `${printableName(error.path ?? to)} is there already; nothing is overwritten. Move or rename it first`,
      };
    return {
      reason: `${printableName(name)} could not be moved: ${error.code} (${error.syscall})`,
    };
  }
  await unlink(`${from}${reasonEnding}`).catch(() => {});
  return { moved: moves.map(({ shown }) => shown) };
}

/** Renames onto the empty file that claims the name; across file systems by a checked copy under a hidden name. */
async function moveOver(from: string, to: string): Promise<void> {
  try {
    await rename(from, to);
    return;
  } catch (error) {
    if (!isSystemError(error) || error.code !== 'EXDEV') throw error;
  }
  const sha256 = await contentSha256(Buffer.from(from));
  if (sha256 === null) throw new Error(`${from} is no regular file any more`);
  const part = join(dirname(to), `.${basename(to).slice(0, 200)}.part`);
  try {
    await copyInto(Buffer.from(from), part, sha256);
    await rename(part, to);
  } catch (error) {
    await unlink(part).catch(() => {});
    throw error;
  }
  await forceToDisk(dirname(to));
  await unlink(from);
}
