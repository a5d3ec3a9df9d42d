import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { appendLines, readLines } from '../store/line-log.ts';
import type { RecordingOutcome, StoredRecording } from '../store/recordings.ts';

/**
 * What left the drop folder, in the order of the decisions, written and forced to the disk before a file is touched:
 * `data/filings/YYYY-MM.log`. The ledger knows all of it; a ledger that was put back from a backup does not, and takes
 * from here what lies in the archive without it. `mark` names a place in the log.
 */
export interface FiledLine {
  /** Below the drop folder, as it came. */
  readonly from: string;
  /** Below the data folder; null: it was deleted. On collision it lies under the next of `placesFor`. */
  readonly to: string | null;
  readonly sha256: string;
  readonly sidecarSha256: string | null;
  readonly arrivedMs: number;
  readonly outcome: RecordingOutcome;
}

/** The mark up to which the ledger is known to hold everything. */
export const filingsMark = 'filings-in-ledger';

/** Read at most of one file of the log: some 250,000 recordings. */
const mostBytes = 64 * 1024 * 1024;
const fileName = /^\d{4}-\d{2}\.log$/;

export class FilingLog {
  readonly #folder: string;
  readonly #noted = new Set<number>();
  /** False while the ledger lacks some of it: then its mark stays where it is. */
  settled = false;
  mark: string | null = null;

  constructor(dataFolder: string) {
    this.#folder = join(dataFolder, 'filings');
  }

  /** Notes orders that are about to be carried out; those of this run once. Throws what the disk says. */
  note(orders: readonly StoredRecording[], wallMs: number): void {
    const news = orders.filter(({ id }) => !this.#noted.has(id));
    if (news.length === 0) return;
    // Never an older file than there is: the order of the log does not go by a clock that was set back.
    const month = `${new Date(wallMs).toISOString().slice(0, 7)}.log`;
    const newest = this.#files().at(-1) ?? month;
    const name = month > newest ? month : newest;
    this.mark = `${name} ${appendLines(join(this.#folder, name), news.map(lineOf))}`;
    for (const { id } of news) this.#noted.add(id);
  }

  /** Carried out: it will not be asked for again. */
  forget(ids: readonly number[]): void {
    for (const id of ids) this.#noted.delete(id);
  }

  /** Lines behind a mark, oldest first; all that there are without one. */
  after(mark: string | null): FiledLine[] {
    const [name = '', size = '0'] = (mark ?? '').split(' ');
    const lines: FiledLine[] = [];
    for (const file of this.#files().filter((one) => one >= name)) {
      const read = readLines(join(this.#folder, file), file === name ? Number(size) : 0, mostBytes);
      lines.push(...read.lines.filter(isFiledLine));
      this.mark = `${file} ${read.size}`;
    }
    return lines;
  }

  #files(): string[] {
    try {
      return readdirSync(this.#folder)
        .filter((name) => fileName.test(name))
        .sort();
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
      throw error;
    }
  }
}

function lineOf(recording: StoredRecording): FiledLine {
  const {
    filingFrom: from,
    filingTo: to,
    contentSha256: sha256,
    sidecarSha256,
    arrivedMs,
    outcome,
  } = recording;
  return { from, to, sha256, sidecarSha256, arrivedMs, outcome };
}

function isFiledLine(value: unknown): value is FiledLine {
  if (typeof value !== 'object' || value === null) return false;
  const { from, to, sha256, sidecarSha256, arrivedMs } = value as Record<string, unknown>;
  const places = [from, to ?? 'nowhere'];
  return (
    places.every(
      (path) => typeof path === 'string' && !path.startsWith('/') && !path.split('/').includes('..'),
    ) &&
    typeof sha256 === 'string' &&
    (sidecarSha256 === null || typeof sidecarSha256 === 'string') &&
    Number.isFinite(arrivedMs)
  );
}
