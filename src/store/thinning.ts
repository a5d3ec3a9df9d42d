import type { Ledger } from './ledger.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { type SpectrumKept, type ThinningRule, thinSpectra } from './retention.ts';

/**
 * Work on the ledger that must not hold up intake goes in slices. Measured: a spectrum of 8,000 lines (32 kB) takes
 * about 0.05 ms to delete, an unused page about 0.01 ms to give back; so a slice stays well below 20 ms.
 */
const spectraASlice = 100;
const pagesASlice = 500;

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
