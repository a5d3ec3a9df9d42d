import type { Ledger } from './ledger.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { type SpectrumKept, type ThinningRule, thinSpectra } from './retention.ts';

/**
 * Work that must not hold up intake goes in slices. Measured with spectra of 8,000 lines (32 kB): 50 deletions, or 250
 * pages given back, take 3 to 15 ms with their wait for the disk.
 */
const spectraASlice = 50;
const pagesASlice = 250;

/** All spectra of a point, newest first, without their densities. */
export async function spectraOfPoint(reader: Reader, pointId: number): Promise<SpectrumKept[]> {
  const rows = await reader
    .selectFrom('spectra')
    .select(['measurement_id', 'used_ms', 'at_alarm'])
    .where('point_id', '=', pointId)
    .orderBy('used_ms', 'desc')
    .orderBy('measurement_id', 'desc')
    .execute();
  return rows.map((row) => ({
    measurementId: row.measurement_id,
    usedMs: row.used_ms,
    atAlarm: row.at_alarm === 1,
  }));
}

/**
 * Thins the spectra of one point. What may go is decided again inside each transaction, so a spectrum at which an alarm
 * has changed meanwhile stays. `between` is awaited between two slices. Returns how many went.
 */
export async function thinSpectraOfPoint(
  ledger: Ledger,
  pointId: number,
  rule: ThinningRule,
  between: () => Promise<void> = async () => {},
): Promise<number> {
  for (let removed = 0; ; ) {
    const gone = await ledger.transact((writer) => thinSlice(writer, pointId, rule));
    removed += gone;
    if (gone < spectraASlice) return removed;
    await between();
  }
}

async function thinSlice(writer: Writer, pointId: number, rule: ThinningRule): Promise<number> {
  const { removed } = thinSpectra(await spectraOfPoint(writer, pointId), rule);
  const slice = removed.slice(0, spectraASlice);
  if (slice.length === 0) return 0;
  await writer.deleteFrom('spectra').where('measurement_id', 'in', slice).execute();
  await writer.deleteFrom('envelope_spectra').where('measurement_id', 'in', slice).execute();
  return slice.length;
}

/** Gives unused pages back to the disk, slice by slice, down to `pagesLeft` kept for what comes next. */
export async function giveBackPages(
  ledger: Ledger,
  pagesLeft: number,
  between: () => Promise<void> = async () => {},
): Promise<void> {
  for (let unused = await ledger.vacuumSlice(0); unused > pagesLeft; ) {
    const before = unused;
    unused = await ledger.vacuumSlice(Math.min(pagesASlice, unused - pagesLeft));
    if (unused >= before) return;
    await between();
  }
}
