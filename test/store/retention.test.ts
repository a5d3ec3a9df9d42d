import fc from 'fast-check';
import { expect, test } from 'vitest';
import { insertRecording } from '../../src/store/recordings.ts';
import { newestSpectraKept, type SpectrumKept, thinSpectra } from '../../src/store/retention.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { keepSpectrum } from '../../src/store/spectra.ts';
import { giveBackPages, spectraOfPoint, thinSpectraOfPoint } from '../../src/store/thinning.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const hourMs = 3_600_000;
const dayOf = (usedMs: number): string => new Date(usedMs).toISOString().slice(0, 10);

function spectrum(measurementId: number, hour: number, atAlarm = false): SpectrumKept {
  return { measurementId, usedMs: hour * hourMs, atAlarm };
}

/** Three days, a spectrum every 6 h, numbered from 1. */
const threeDays = Array.from({ length: 12 }, (_, index) => spectrum(index + 1, index * 6));

test('the newest stay, then one a day, then what an alarm or something open needs', () => {
  expect(thinSpectra(threeDays, { newest: 12, dayOf }).removed).toEqual([]);
  expect(thinSpectra(threeDays, { newest: 2, dayOf })).toEqual({
    kept: [
      { measurementId: 1, reason: 'one-a-day' },
      { measurementId: 5, reason: 'one-a-day' },
      { measurementId: 9, reason: 'one-a-day' },
      { measurementId: 11, reason: 'newest' },
      { measurementId: 12, reason: 'newest' },
    ],
    removed: [2, 3, 4, 6, 7, 8, 10],
  });
  const alarmed = threeDays.map((row) => (row.measurementId === 3 ? { ...row, atAlarm: true } : row));
  expect(thinSpectra(alarmed, { newest: 2, dayOf, needed: new Set([7, 99]) })).toMatchObject({
    kept: [
      { measurementId: 1, reason: 'one-a-day' },
      { measurementId: 3, reason: 'at-alarm' },
      { measurementId: 5, reason: 'one-a-day' },
      { measurementId: 7, reason: 'needed' },
      { measurementId: 9, reason: 'one-a-day' },
      { measurementId: 11, reason: 'newest' },
      { measurementId: 12, reason: 'newest' },
    ],
    removed: [2, 4, 6, 8, 10],
  });
});

test('days are those of the site, and an empty or short history loses nothing', () => {
  const shifted = (usedMs: number): string => dayOf(usedMs + 7 * hourMs);
  expect(thinSpectra(threeDays, { newest: 0, dayOf: shifted }).kept.map((row) => row.measurementId)).toEqual([
    1, 4, 8, 12,
  ]);
  expect(thinSpectra([], { newest: 50, dayOf })).toEqual({ kept: [], removed: [] });
  expect(newestSpectraKept).toBe(50);
});

test('whatever the history: nothing is both kept and removed, every day keeps one, thinning again removes nothing', () => {
  const history = fc.uniqueArray(
    fc.record({
      measurementId: fc.integer({ min: 1, max: 500 }),
      usedMs: fc.integer({ min: 0, max: 30 * 24 * hourMs }),
      atAlarm: fc.boolean(),
    }),
    { selector: (row) => row.measurementId, maxLength: 200 },
  );
  fc.assert(
    fc.property(history, fc.integer({ min: 0, max: 60 }), fc.func(fc.boolean()), (rows, newest, isNeeded) => {
      const needed = new Set(rows.map((row) => row.measurementId).filter((id) => isNeeded(id)));
      const rule = { newest, dayOf, needed };
      const { kept, removed } = thinSpectra(rows, rule);
      const keptIds = new Set(kept.map((row) => row.measurementId));
      expect(keptIds.size + removed.length).toBe(rows.length);
      const left = rows.filter((row) => keptIds.has(row.measurementId));
      expect(new Set(left.map((row) => dayOf(row.usedMs)))).toEqual(
        new Set(rows.map((row) => dayOf(row.usedMs))),
      );
      for (const row of rows)
        if (row.atAlarm || needed.has(row.measurementId)) expect(keptIds.has(row.measurementId)).toBe(true);
      expect(thinSpectra(left, rule).removed).toEqual([]);
      expect(left.length).toBeGreaterThanOrEqual(Math.min(newest, rows.length));
    }),
    { seed: 20261201, numRuns: 200 },
  );
});

test('thinning works in slices, respects alarms that change meanwhile, and gives the space back', async () => {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: ['low'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  const density = new Float32Array(4000).fill(1);
  const pointId = ids.pointId('pump', 'de');
  const measured = await ledger.transact(async (writer) => {
    const made: number[] = [];
    for (let hour = 0; hour < 240; hour++) {
      const recordingId = await insertRecording(
        writer,
        recordingOf({ identity: `${hour}`, usedMs: hour * hourMs }),
      );
      made.push(
        await insertMeasurement(writer, ids, {
          measurement: measurementOf('pump', 'de', { low: 1 }, { spectrum: { lineSpacingHz: 1, density } }),
          recordingId,
          usedMs: hour * hourMs,
          machineState: 'running',
          condition: '',
          runningHours: null,
          evaluated: true,
          inTrend: true,
          atAlarm: hour === 30,
        }),
      );
    }
    return made;
  });
  // Hour 150 is removed in a later slice; an alarm changes at it after the first slice.
  let slices = 0;
  const removed = await thinSpectraOfPoint(ledger, pointId, { newest: 50, dayOf }, async () => {
    slices++;
    if (slices === 1) await ledger.transact((writer) => keepSpectrum(writer, measured[150] ?? 0));
  });
  const left = (await ledger.read((reader) => spectraOfPoint(reader, pointId)))
    .map((row) => row.usedMs / hourMs)
    .reverse();
  expect(left).toEqual([
    0,
    24,
    30,
    48,
    72,
    96,
    120,
    144,
    150,
    168,
    ...Array.from({ length: 50 }, (_, index) => 190 + index),
  ]);
  expect(removed).toBe(240 - left.length);
  expect(slices).toBeGreaterThan(1);
  const before = await ledger.vacuumSlice(0);
  expect(before).toBeGreaterThan(700);
  let pauses = 0;
  await giveBackPages(ledger, 100, async () => {
    pauses++;
  });
  expect(await ledger.vacuumSlice(0)).toBe(100);
  expect(pauses).toBe(Math.ceil((before - 100) / 250));
});
