import { expect, test } from 'vitest';
import type { EnvelopeMeasured } from '../../src/manipulation/envelope-measured.ts';
import { envelopeChoices, saveEnvelopeChoice } from '../../src/store/envelope-choices.ts';
import { envelopeOf } from '../../src/store/envelopes.ts';
import { peaksOf } from '../../src/store/read-trends.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { newestSpectra } from '../../src/store/spectra.ts';
import { thinSpectraOfPoint } from '../../src/store/thinning.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const peak = (frequencyHz: number, names: readonly string[] = []) => ({
  frequencyHz,
  level: 1 / frequencyHz,
  aboveFloorDb: 12,
  kind: 'tone' as const,
  order: 3.57,
  names,
});
const envelope: EnvelopeMeasured = {
  fromHz: 2000,
  toHz: 8000,
  chosen: 'fixed',
  lineSpacingHz: 1.5625,
  averaging: {
    window: 'hann',
    overlapPercent: 50,
    segmentSamples: 4096,
    lineSpacingHz: 1.5625,
    averages: 30,
    effectiveAverages: 28.5,
    usedPercent: 99,
    segmentSpread: null,
  },
  peaks: [peak(89.2, ['BPFO, drive-end bearing']), peak(178.4)],
  spectrum: { lineSpacingHz: 1.5625, density: Float32Array.from([0, 1.5, 0.25, 3]) },
  candidate: null,
};

async function small() {
  const folder = temporaryFolder();
  const ledger = await opened(folder);
  const { site, text } = smallSite({ pump: { de: ['low'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  const insert = (hour: number, more: Parameters<typeof measurementOf>[3], atAlarm = false) =>
    ledger.transact(async (writer) =>
      insertMeasurement(writer, ids, {
        measurement: measurementOf('pump', 'de', { low: 1 }, more),
        recordingId: await insertRecording(writer, recordingOf({ identity: `${hour}`, usedMs: hour })),
        usedMs: hour,
        machineState: 'running',
        condition: '',
        runningHours: null,
        evaluated: true,
        inTrend: true,
        atAlarm,
      }),
    );
  return { ledger, ids, insert, folder };
}

test('an envelope is read back as it was stored, and keeps apart from the plain spectrum', async () => {
  const { ledger, insert } = await small();
  const density = new Float32Array(8).fill(2);
  const id = await insert(1, { envelope, peaks: [peak(25)], spectrum: { lineSpacingHz: 1.6, density } });
  const { averaging, candidate: _, ...plain } = envelope;
  expect(await ledger.read((reader) => envelopeOf(reader, id))).toEqual({
    ...plain,
    segmentSamples: averaging.segmentSamples,
    averages: averaging.averages,
    effectiveAverages: averaging.effectiveAverages,
    usedPercent: averaging.usedPercent,
  });
  expect(await ledger.read((reader) => peaksOf(reader, id))).toEqual([peak(25)]);
  const without = await insert(2, {});
  expect(await ledger.read((reader) => envelopeOf(reader, without))).toBeNull();
});

test('thinning takes the density of an envelope with the plain one, and leaves its peaks', async () => {
  const { ledger, ids, insert } = await small();
  const spectrum = { lineSpacingHz: 1, density: new Float32Array(8) };
  const made: number[] = [];
  for (let hour = 0; hour < 6; hour++) made.push(await insert(hour, { envelope, spectrum }, hour === 2));
  const pointId = ids.pointId('pump', 'de');
  const removed = await thinSpectraOfPoint(ledger, pointId, { newest: 2, dayOf: () => 'one day' });
  expect(removed).toBe(2);
  const kept = await Promise.all(made.map((id) => ledger.read((reader) => envelopeOf(reader, id))));
  expect(kept.map((one) => one?.spectrum != null)).toEqual([true, false, true, false, true, true]);
  expect(kept.map((one) => one?.peaks.length)).toEqual([2, 2, 2, 2, 2, 2]);
  const plain = await ledger.read((reader) => newestSpectra(reader, pointId, { limit: 9 }));
  expect(plain.map(({ usedMs }) => usedMs)).toEqual([5, 4, 2, 0]);
});

test('what is not a number is never stored', async () => {
  const { insert } = await small();
  const spectrum = { lineSpacingHz: 1, density: Float32Array.from([1, Number.NaN]) };
  await expect(insert(1, { envelope: { ...envelope, spectrum } })).rejects.toThrow(
    'density at line 1 is NaN',
  );
});

test('the choice of a band outlives the ledger being closed, one a point', async () => {
  const { ledger, ids, folder } = await small();
  const pointId = ids.pointId('pump', 'de');
  const chosen = { fromHz: 3200, toHz: 4800, kurtosis: 0.9, sinceUsedMs: 7 };
  const searching = { among: 'a', winners: [null, { fromHz: 3200, toHz: 4800 }], chosen: null };
  await ledger.transact((writer) => saveEnvelopeChoice(writer, pointId, searching));
  expect(await ledger.read((reader) => envelopeChoices(reader, [pointId, 99]))).toEqual(
    new Map([[pointId, searching]]),
  );
  await ledger.transact((writer) => saveEnvelopeChoice(writer, pointId, { among: 'a', winners: [], chosen }));
  await ledger.close();
  const again = await opened(folder);
  const found = await again.read((reader) => envelopeChoices(reader, [pointId]));
  expect(found.get(pointId)?.chosen).toEqual(chosen);
});
