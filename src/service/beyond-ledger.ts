import { readMark, writeMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { type Act, actsMark, lostActs } from './acts-log.ts';
import { type FiledLine, FilingLog, filingsMark } from './filing-log.ts';
import type { Logger } from './log.ts';

/**
 * What the logs beside the ledger know and the ledger does not: only where an older ledger was put in its place. The
 * decision on a recording is committed before its line is written, so a kill or a power cut never leads here.
 */
export interface BeyondLedger {
  readonly filingLog: FilingLog;
  /** In the order in which they were decided on. */
  readonly recordings: readonly FiledLine[];
  readonly acts: readonly Act[];
  /** To be kept as `actsMark` once the acts are told; null: it stays. */
  readonly actsMark: string | null;
}

export type Beyond = Pick<BeyondLedger, 'recordings' | 'acts'>;

export function isOlder({ recordings, acts }: Beyond): boolean {
  return recordings.length + acts.length > 0;
}

/** Once it is announced: says in the log what the ledger lacks, each act by itself, and remembers that it did. */
export async function noteBeyond(ledger: Ledger, log: Logger, beyond: BeyondLedger): Promise<void> {
  const { recordings, acts, actsMark: mark } = beyond;
  if (recordings.length > 0)
    log.warn(
      { recordings: recordings.length },
      'the ledger is older than its log: what it lacks is taken again',
    );
  for (const { wallMs, by, command, comment } of acts) {
    const act = { by, command, at: new Date(wallMs).toISOString(), comment };
    log.warn(act, 'an act that the ledger lacks: it was put back to a time before; to be done again by hand');
  }
  if (mark !== null) await ledger.transact((writer) => writeMark(writer, actsMark, mark));
}

/** Recordings that are taken again at one start; of more, the newest. */
const mostRecordings = 100_000;
const linesAtOnce = 500;

export async function lookBeyond(ledger: Ledger): Promise<BeyondLedger> {
  const filingLog = new FilingLog(ledger.folder);
  const mark = await ledger.read((reader) => readMark(reader, filingsMark));
  const recordings = await missingOf(ledger, filingLog.after(mark));
  const lost = await lostActs(ledger);
  return { filingLog, recordings: recordings.slice(-mostRecordings), acts: lost.acts, actsMark: lost.mark };
}

/** Those of which the ledger has no row, each once. */
export async function missingOf(ledger: Ledger, lines: readonly FiledLine[]): Promise<FiledLine[]> {
  const missing = new Map<string, FiledLine>();
  for (let n = 0; n < lines.length; n += linesAtOnce) {
    const part = lines.slice(n, n + linesAtOnce);
    const known = await ledger.read((reader) => knownOf(reader, part));
    for (const line of part) if (!known.has(keyOf(line))) missing.set(keyOf(line), line);
  }
  return [...missing.values()];
}

async function knownOf(reader: Reader, lines: readonly FiledLine[]): Promise<Set<string>> {
  const rows = await reader
    .selectFrom('recordings')
    .select(['filing_from as from', 'content_sha256 as sha256', 'arrived_ms as arrivedMs'])
    .where(
      'content_sha256',
      'in',
      lines.map(({ sha256 }) => sha256),
    )
    .orderBy('id')
    .execute();
  return new Set(rows.map(keyOf));
}

export function keyOf({ from, sha256, arrivedMs }: Pick<FiledLine, 'from' | 'sha256' | 'arrivedMs'>): string {
  return `${sha256} ${arrivedMs} ${from}`;
}
