import { statSync } from 'node:fs';
import { statfs } from 'node:fs/promises';
import type { Site } from '../config/site.ts';
import { readMark, writeMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import { arrivedSince } from '../store/period-counts.ts';

/** How long the disk of the data folder lasts at the rate at which archive and ledger grew in the last week. */
export interface DiskRoom {
  readonly freeBytes: number | null;
  /** Null: not known yet. */
  readonly daysLeft: number | null;
}

/** Size of the ledger at a summary. */
interface LedgerSize {
  readonly ms: number;
  readonly bytes: number;
}

const sizesMark = 'ledger-sizes';
const dayMs = 86_400_000;
const mostSizes = 8;

/** Free bytes for this process on the disk of a folder; null where the system does not say. */
export async function freeBytes(folder: string): Promise<number | null> {
  try {
    const { bavail, bsize } = await statfs(folder);
    return bavail * bsize;
  } catch {
    return null;
  }
}

export function ledgerBytes(ledger: Pick<Ledger, 'path'>): number {
  return statSync(ledger.path, { throwIfNoEntry: false })?.size ?? 0;
}

export async function diskRoom(
  reader: Reader,
  site: Site,
  now: {
    readonly ms: number;
    readonly freeBytes: number | null;
    readonly ledgerBytes: number;
    readonly watchedFromMs: number;
  },
): Promise<DiskRoom> {
  const { freeBytes: free } = now;
  const sizes = parse(await readMark(reader, sizesMark));
  const oldest = sizes.find(({ ms }) => now.ms - ms >= dayMs / 2 && now.ms - ms <= 10 * dayMs);
  const ledgerADay =
    oldest === undefined
      ? null
      : (Math.max(0, now.ledgerBytes - oldest.bytes) * dayMs) / (now.ms - oldest.ms);
  const watchedMs = Math.min(7 * dayMs, now.ms - now.watchedFromMs);
  const archiveADay =
    site.folders.afterReading === 'archive' && watchedMs > 0
      ? ((await arrivedSince(reader, now.ms - watchedMs)).bytes * dayMs) / watchedMs
      : 0;
  const aDay = (ledgerADay ?? 0) + archiveADay;
  const known =
    free !== null && watchedMs >= dayMs / 2 && (ledgerADay !== null || archiveADay > 0) && aDay > 0;
  return { freeBytes: free, daysLeft: known ? free / aDay : null };
}

/** Part of the transaction that stores a summary. */
export async function noteLedgerSize(writer: Writer, now: LedgerSize): Promise<void> {
  const sizes = [...parse(await readMark(writer, sizesMark)), now].slice(-mostSizes);
  await writeMark(writer, sizesMark, JSON.stringify(sizes));
}

/** Oldest first. */
function parse(mark: string | null): LedgerSize[] {
  return mark === null ? [] : (JSON.parse(mark) as LedgerSize[]);
}
