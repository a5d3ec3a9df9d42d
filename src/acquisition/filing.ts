/**
 * Takes a recording that is in the ledger out of the drop folder. The order (from, to, hash) was committed before
 * the first rename, so whatever stops the service in between, the next start carries the order out again:
 *
 *     1 set aside: rename to a hidden name beside it, which only this order has
 *     2 look: is it the file that was read? else put it back, it is a new arrival
 *     3 make the folder, write the reason beside the place
 *     4 force the content to the disk, rename into place; across file systems: copy to NAME.part, fsync, compare, rename, remove the original
 *     5 the same for the sidecar
 *
 * Invariants: at every moment the content exists under at least one of the names; nothing in the data folder is ever
 * overwritten; carrying out an order that was carried out, or half so, leads to the same end.
 */
import { lstat, rename, unlink, writeFile } from 'node:fs/promises';
import { dirname, join } from 'node:path';
import { nameOf, pathBytes, printableName, sidecarNameOf } from './file-name.ts';
import {
  contentSha256,
  copyInto,
  exists,
  forceToDisk,
  isSystemError,
  makeFolder,
  putBack,
  renameForGood,
} from './filing-disk.ts';
import { placesFor, setAsidePath } from './filing-place.ts';

/** A file as it was read. */
export interface FiledFile {
  /** Path below the drop folder, as `pathText` gives it. */
  readonly from: string;
  readonly sha256: string;
  /** What was read, from the same run; null after a restart: then the content is compared. */
  readonly look: {
    readonly dev: number;
    readonly ino: number;
    readonly size: number;
    readonly mtimeMs: number;
  } | null;
}

export interface FilingOrder extends FiledFile {
  readonly dropFolder: string;
  readonly dataFolder: string;
  /** Path below the data folder (`filing-place.ts`); null: the file is deleted once it is in the ledger. */
  readonly to: string | null;
  /** Written to `NAME.reason.txt` beside the filed file; null: nothing is written. */
  readonly reason: string | null;
  readonly sidecar: FiledFile | null;
}

export type FilingOutcome =
  /** Where the file lies now, below the data folder; null: deleted. */
  | {
      readonly outcome: 'filed';
      readonly to: string | null;
      readonly sidecar: 'none' | 'filed' | 'replaced' | 'gone';
    }
  /** Another file has come under the name; it is left (or put back) in the drop folder as a new arrival. */
  | { readonly outcome: 'replaced' }
  /** Neither in the drop folder nor in its place: somebody took it away. */
  | { readonly outcome: 'gone' }
  /** The disk is full, a permission is missing, ...: the order stands and is to be carried out again later. */
  | { readonly outcome: 'cannot'; readonly reason: string };

/** Places between two outside effects. */
export const filingSteps = [
  'filing: set aside under its own name',
  'filing: put back',
  'filing: folder made',
  'filing: reason written',
  'filing: copied',
  'filing: in place',
  'filing: original removed',
  'filing: sidecar set aside',
  'filing: sidecar in place',
] as const;

export type FilingStep = (typeof filingSteps)[number];

export interface FilingSteps {
  /** Called at each place; tests throw or end the process there. */
  step(name: FilingStep): void;
}

/** Carries out the order, or what is left of it. */
export async function completeFiling(order: FilingOrder, { step }: FilingSteps): Promise<FilingOutcome> {
  try {
    const main = await fileOne(order, order, order.to, order.reason, {
      step,
      setAside: 'filing: set aside under its own name',
      inPlace: 'filing: in place',
    });
    if (main.kind !== 'filed') return { outcome: main.kind };
    if (order.sidecar === null) return { outcome: 'filed', to: main.to, sidecar: 'none' };
    const sidecarTo = main.to === null ? null : join(dirname(main.to), sidecarNameOf(nameOf(main.to)));
    const beside = await fileOne(order, order.sidecar, sidecarTo, null, {
      step,
      setAside: 'filing: sidecar set aside',
      inPlace: 'filing: sidecar in place',
    });
    return { outcome: 'filed', to: main.to, sidecar: beside.kind };
  } catch (error) {
    if (!isSystemError(error)) throw error;
    return {
      outcome: 'cannot',
      reason: `${printableName(order.from)} cannot be filed: ${error.code} (${error.syscall}); it stays where it is`,
    };
  }
}

interface Stepping extends FilingSteps {
  readonly setAside: FilingStep;
  readonly inPlace: FilingStep;
}

type OneOutcome =
  | { readonly kind: 'filed'; readonly to: string | null }
  | { readonly kind: 'replaced' | 'gone' };

async function fileOne(
  folders: { readonly dropFolder: string; readonly dataFolder: string },
  file: FiledFile,
  to: string | null,
  reason: string | null,
  steps: Stepping,
): Promise<OneOutcome> {
  const from = absolute(folders.dropFolder, file.from);
  const held = absolute(folders.dropFolder, setAsidePath(file));
  if (!(await exists(held))) {
    if (!(await exists(from))) return alreadyFiled(folders.dataFolder, to, file.sha256);
    if (!(await isTheFile(from, file))) {
      const earlier = await alreadyFiled(folders.dataFolder, to, file.sha256);
      return earlier.kind === 'filed' && to !== null ? earlier : { kind: 'replaced' };
    }
    await rename(from, held);
    steps.step(steps.setAside);
  }
  // Between the look and the rename another file may have come under the name.
  if (!(await isTheFile(held, file))) {
    await putBack(held, from);
    steps.step('filing: put back');
    return { kind: 'replaced' };
  }
  if (to === null) {
    await unlink(held);
    steps.step('filing: original removed');
    return { kind: 'filed', to: null };
  }
  return { kind: 'filed', to: await place(held, folders.dataFolder, to, file.sha256, reason, steps) };
}

/** Moves a file that was set aside into its place; returns the place it got. */
async function place(
  held: Buffer,
  dataFolder: string,
  to: string,
  sha256: string,
  reason: string | null,
  steps: Stepping,
): Promise<string> {
  await makeFolder(join(dataFolder, dirname(to)));
  steps.step('filing: folder made');
  const free = await findPlace(dataFolder, to, sha256);
  const target = join(dataFolder, free.to);
  if (reason !== null) {
    await writeFile(`${target}.reason.txt`, `${reason}\n`);
    steps.step('filing: reason written');
  }
  if (!free.taken) {
    try {
      await renameForGood(held, target);
      steps.step(steps.inPlace);
      return free.to;
    } catch (error) {
      if (!isSystemError(error) || error.code !== 'EXDEV') throw error;
    }
    const part = `${target}.part`;
    await copyInto(held, part, sha256);
    steps.step('filing: copied');
    await rename(part, target);
    await forceToDisk(dirname(target));
    steps.step(steps.inPlace);
  }
  // The same content lies in its place, put there just now or by an earlier attempt.
  await unlink(held);
  steps.step('filing: original removed');
  return free.to;
}

/**
 * The first of NAME, NAME~hash, NAME~hash~2, ... that is free or holds the same content already. Content is compared
 * whole, since an earlier attempt may have got that far.
 */
async function findPlace(
  dataFolder: string,
  to: string,
  sha256: string,
): Promise<{ to: string; taken: boolean }> {
  for (const candidate of placesFor(to, sha256)) {
    const path = Buffer.from(join(dataFolder, candidate));
    if (!(await exists(path))) return { to: candidate, taken: false };
    if ((await contentSha256(path)) === sha256) return { to: candidate, taken: true };
  }
  throw new Error(`ten different files named ${to} with one content hash`);
}

async function alreadyFiled(dataFolder: string, to: string | null, sha256: string): Promise<OneOutcome> {
  // A file to be deleted that is not there any more was deleted.
  if (to === null) return { kind: 'filed', to: null };
  for (const candidate of placesFor(to, sha256)) {
    const path = Buffer.from(join(dataFolder, candidate));
    if ((await exists(path)) && (await contentSha256(path)) === sha256)
      return { kind: 'filed', to: candidate };
  }
  return { kind: 'gone' };
}

async function isTheFile(path: Buffer, { look, sha256 }: FiledFile): Promise<boolean> {
  if (look === null) return (await contentSha256(path)) === sha256;
  const now = await lstat(path);
  return (
    now.isFile() &&
    now.dev === look.dev &&
    now.ino === look.ino &&
    now.size === look.size &&
    now.mtimeMs === look.mtimeMs
  );
}

/** A file that an order had set aside and that the ledger no longer knows gets its name back; false where there is none. */
export async function putBackHeld(
  dropFolder: string,
  file: Pick<FiledFile, 'from' | 'sha256'>,
): Promise<boolean> {
  const held = absolute(dropFolder, setAsidePath(file));
  if (!(await exists(held))) return false;
  await putBack(held, absolute(dropFolder, file.from));
  return true;
}

function absolute(folder: string, path: string): Buffer {
  return Buffer.concat([Buffer.from(`${folder}/`), pathBytes(path)]);
}
