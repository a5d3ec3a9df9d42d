import { expect, test } from 'vitest';
import type { Evidence } from '../../src/manipulation/evidence.ts';
import type { SpectralPeak } from '../../src/manipulation/measurement.ts';
import { evidenceOf } from '../../src/store/evidence.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import {
  measurementById,
  measurementsOfRecording,
  newestMeasurement,
} from '../../src/store/read-measurements.ts';
import { peaksOf, readLevels, seriesOfPoint, type TrendRange } from '../../src/store/read-trends.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { type SiteIds, syncSite } from '../../src/store/site-ids.ts';
import { densityBytes, densityOf, newestSpectra } from '../../src/store/spectra.ts';
import { insertMeasurement, type NewMeasurement } from '../../src/store/trends.ts';
import { seededRandom } from '../signal/random.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const bands = Array.from({ length: 12 }, (_, index) => `band-${index}`);

async function withSite(): Promise<{ readonly ledger: Ledger; readonly ids: SiteIds }> {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: bands, nde: ['band-0'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  return { ledger, ids };
}

let identities = 0;

async function store(
  { ledger, ids }: { readonly ledger: Ledger; readonly ids: SiteIds },
  entry: Partial<NewMeasurement> & Pick<NewMeasurement, 'measurement' | 'usedMs'>,
): Promise<number> {
  return ledger.transact(async (writer) => {
    const recordingId =
      entry.recordingId ??
      (await insertRecording(
        writer,
        recordingOf({ identity: `at ${entry.usedMs} number ${++identities}`, usedMs: entry.usedMs }),
      ));
    return insertMeasurement(writer, ids, {
      machineState: 'running',
      condition: '',
      runningHours: null,
      evaluated: true,
      inTrend: true,
      atAlarm: false,
      ...entry,
      recordingId,
    });
  });
}

const all = (ids: SiteIds, more: Partial<TrendRange> = {}): TrendRange => ({
  pointId: ids.pointId('pump', 'de'),
  fromMs: 0,
  toMs: 1e9,
  limit: 1000,
  ...more,
});

const familyOfOuterRace: Evidence = {
  partId: 'de-bearing',
  fault: 'outer race',
  frequency: 'BPFO',
  spectrum: 'envelope',
  grade: 'clear',
  expectedHz: 89.3,
  observedHz: 89.1,
  harmonics: 3,
  sidebands: 0,
  aboveFloorDb: 14,
  chance: 1e-6,
  words: 'three harmonics of BPFO of the drive-end bearing in the envelope (89.1 Hz), 14 dB over the floor',
};
const besideSecondHarmonic: Evidence = {
  partId: 'de-bearing',
  fault: 'cage',
  frequency: 'FTF',
  spectrum: 'envelope',
  grade: 'not separable',
  expectedHz: 50.1,
  neededLineSpacingHz: 0.05,
  words: 'FTF of the drive-end bearing (50.1 Hz) cannot be told from 2x',
};

test('a measurement comes back from the ledger as it went in', async () => {
  const at = await withSite();
  const random = seededRandom(20261201);
  const peaks = Array.from(
    { length: 40 },
    (_, index): SpectralPeak => ({
      frequencyHz: 25 * (index + 1),
      level: random.uniform(),
      aboveFloorDb: 20,
      kind: index % 7 === 0 ? 'hump' : 'tone',
      order: index === 3 ? null : index + 1,
      names: index === 5 ? ['6x', 'vane pass, impeller'] : [],
    }),
  );
  const density = Float32Array.from({ length: 6401 }, () => random.uniform());
  const measurement = measurementOf(
    'pump',
    'de',
    { 'band-0': 0.001, 'band-3': 0.002 },
    {
      peaks,
      spectrum: { lineSpacingHz: 1.6, density },
      quality: [{ flag: 'clipped', detail: '3 samples' }],
      runningSaid: true,
      loadPercent: 80,
      evidence: [familyOfOuterRace, besideSecondHarmonic],
    },
  );
  const id = await store(at, { measurement, usedMs: 1000 });
  const {
    levels,
    peaks: _peaks,
    spectrum: _spectrum,
    machineId: _machine,
    pointId: _point,
    evidence: _evidence,
    ...plain
  } = measurement;
  const stored = await at.ledger.read((reader) => newestMeasurement(reader, at.ids.pointId('pump', 'de')));
  expect(stored).toMatchObject({
    ...plain,
    speed: { rpm: 2970, origin: 'nominal', uncertaintyRpm: 60 },
    id,
    usedMs: 1000,
    machineState: 'running',
    condition: '',
    runningHours: null,
    evaluated: true,
    confidencePercent: 95,
  });
  expect(
    stored?.levels.map((level) => [level.bandId, level.level, level.intervalLow, level.exceededBy80Percent]),
  ).toEqual(
    levels.map((level) => [
      at.ids.bandId('pump', 'de', level.bandId),
      level.level,
      level.intervalLow,
      level.exceededBy80Percent,
    ]),
  );
  expect(await at.ledger.read((reader) => peaksOf(reader, id))).toEqual(peaks);
  expect(await at.ledger.read((reader) => evidenceOf(reader, id))).toEqual([
    familyOfOuterRace,
    besideSecondHarmonic,
  ]);
  const [spectrum] = await at.ledger.read((reader) =>
    newestSpectra(reader, at.ids.pointId('pump', 'de'), { limit: 5 }),
  );
  expect(spectrum).toEqual({ measurementId: id, usedMs: 1000, lineSpacingHz: 1.6, density });
});

test('too short for a segment, without speed and spectrum: kept with what there is', async () => {
  const at = await withSite();
  const measurement = measurementOf('pump', 'de', {}, { averaging: null, speed: null, waveform: null });
  const id = await store(at, { measurement, usedMs: 1 });
  expect(await at.ledger.read((reader) => measurementById(reader, id))).toMatchObject({
    averaging: null,
    speed: null,
    waveform: null,
    levels: [],
    confidencePercent: null,
    runningSaid: null,
  });
});

test('other settings begin a new series, the same ones go on; a run repeated stores nothing twice', async () => {
  const at = await withSite();
  const first = measurementOf('pump', 'de', { 'band-0': 1 });
  const id = await store(at, { measurement: first, usedMs: 10, recordingId: await anyRecording(at.ledger) });
  await store(at, { measurement: measurementOf('pump', 'de', { 'band-0': 2 }), usedMs: 20 });
  const other = {
    ...first,
    settingsFingerprint: 'all-2',
    levels: first.levels.map((level) => ({ ...level, fingerprint: 'settings-2', level: 9 })),
  };
  const again = await store(at, { measurement: other, usedMs: 10, recordingId: 1 });
  expect(again).not.toBe(id);
  const series = await at.ledger.read((reader) => seriesOfPoint(reader, at.ids.pointId('pump', 'de')));
  expect(series.map((row) => [row.fingerprint, row.beganMs])).toEqual([
    ['settings-1', 10],
    ['settings-2', 10],
  ]);
  const levels = async (more: Partial<TrendRange>) =>
    (await at.ledger.read((reader) => readLevels(reader, all(at.ids, more)))).map((row) => row.level);
  expect(await levels({ seriesId: series[0]?.id ?? 0 })).toEqual([1, 2]);
  expect(await levels({ seriesId: series[1]?.id ?? 0 })).toEqual([9]);
  const current = await at.ledger.read((reader) => measurementsOfRecording(reader, 1));
  expect(current.map((row) => row.id)).toEqual([again]);
  const repeated = await store(at, {
    measurement: { ...first, levels: first.levels.map((row) => ({ ...row, level: 5 })) },
    usedMs: 10,
    recordingId: 1,
  });
  expect(repeated).toBe(id);
  expect(await levels({ seriesId: series[0]?.id ?? 0 })).toEqual([5, 2]);
  expect((await at.ledger.read((reader) => measurementsOfRecording(reader, 1))).map((row) => row.id)).toEqual(
    [id],
  );
});

async function anyRecording(ledger: Ledger): Promise<number> {
  return ledger.transact((writer) => insertRecording(writer, recordingOf()));
}

test('of two recordings at one time, one out of the trend never displaces one that is in it', async () => {
  const at = await withSite();
  const level = (value: number) => measurementOf('pump', 'de', { 'band-0': value });
  const levels = async () =>
    (await at.ledger.read((reader) => readLevels(reader, all(at.ids, { outOfTrendToo: true })))).map(
      (row) => row.level,
    );
  await store(at, { measurement: level(1), usedMs: 10, inTrend: false });
  await store(at, { measurement: level(2), usedMs: 10 });
  expect(await levels()).toEqual([2]);
  await store(at, { measurement: level(3), usedMs: 10, inTrend: false });
  expect(await levels()).toEqual([2]);
  await store(at, { measurement: level(4), usedMs: 10 });
  expect(await levels()).toEqual([4]);
});

test('trends are bounded: range, band, number of rows, and what is out of the trend only on request', async () => {
  const at = await withSite();
  for (const usedMs of [30, 10, 20, 40]) {
    await store(at, {
      measurement: measurementOf('pump', 'de', { 'band-0': usedMs, 'band-1': usedMs + 0.5 }),
      usedMs,
      inTrend: usedMs !== 20,
    });
  }
  const levels = async (more: Partial<TrendRange>) =>
    (await at.ledger.read((reader) => readLevels(reader, all(at.ids, more)))).map((row) => row.level);
  expect(await levels({})).toEqual([10, 10.5, 30, 30.5, 40, 40.5]);
  expect(await levels({ bandId: at.ids.bandId('pump', 'de', 'band-1'), outOfTrendToo: true })).toEqual([
    10.5, 20.5, 30.5, 40.5,
  ]);
  expect(await levels({ fromMs: 10, toMs: 30, outOfTrendToo: true })).toEqual([10, 10.5, 20, 20.5]);
  expect(await levels({ limit: 3 })).toEqual([30.5, 40, 40.5]);
  const newest = async (only: Parameters<typeof newestMeasurement>[2]) =>
    (await at.ledger.read((reader) => newestMeasurement(reader, at.ids.pointId('pump', 'de'), only)))?.usedMs;
  expect(await newest({ beforeMs: 40 })).toBe(30);
  expect(
    await at.ledger.read((reader) => newestMeasurement(reader, at.ids.pointId('pump', 'nde'))),
  ).toBeNull();
});

test('a level that is no number is refused with everything that came with it', async () => {
  const at = await withSite();
  for (const value of [Number.NaN, Number.POSITIVE_INFINITY, -1]) {
    await expect(
      store(at, { measurement: measurementOf('pump', 'de', { 'band-0': 1, 'band-1': value }), usedMs: 10 }),
    ).rejects.toThrow();
  }
  const spectrum = { lineSpacingHz: 1, density: Float32Array.of(1, Number.NaN) };
  await expect(
    store(at, { measurement: measurementOf('pump', 'de', { 'band-0': 1 }, { spectrum }), usedMs: 10 }),
  ).rejects.toThrow('density at line 1 is NaN');
  const rows = await at.ledger.read((reader) => reader.selectFrom('recordings').select('id').execute());
  expect(rows).toEqual([]);
});

test('a density is stored little-endian, and read from any place in a buffer', () => {
  const bytes = densityBytes(Float32Array.of(1, -2.5));
  expect([...bytes]).toEqual([0, 0, 0x80, 0x3f, 0, 0, 0x20, 0xc0]);
  const shifted = new Uint8Array(9);
  shifted.set(bytes, 1);
  expect([...densityOf(shifted.subarray(1))]).toEqual([1, -2.5]);
});

test('a recording with 12 bands, 40 peaks and a spectrum costs less than 2 ms of processor besides the disk', async () => {
  const at = await withSite();
  const peaks = Array.from(
    { length: 40 },
    (_, index): SpectralPeak => ({
      frequencyHz: index,
      level: 1,
      aboveFloorDb: 20,
      kind: 'tone',
      order: null,
      names: [],
    }),
  );
  const spectrum = { lineSpacingHz: 1.6, density: new Float32Array(8001).fill(1e-6) };
  const levels = Object.fromEntries(bands.map((band) => [band, 0.001]));
  const measurement = measurementOf('pump', 'de', levels, { peaks, spectrum });
  let number = 0;
  // All in one transaction, so the disk is waited for once; processor time, since others may share the cores.
  const msARecording = async (count: number) =>
    at.ledger.transact(async (writer) => {
      const begun = process.cpuUsage();
      for (let index = 0; index < count; index++) {
        number++;
        const recordingId = await insertRecording(
          writer,
          recordingOf({ identity: `n ${number}`, usedMs: number }),
        );
        await insertMeasurement(writer, at.ids, {
          measurement,
          recordingId,
          usedMs: number,
          machineState: 'running',
          condition: '',
          runningHours: null,
          evaluated: true,
          inTrend: true,
          atAlarm: false,
        });
      }
      const used = process.cpuUsage(begun);
      return (used.user + used.system) / 1000 / count;
    });
  await msARecording(50);
  const ms = Math.min(await msARecording(50), await msARecording(50), await msARecording(50));
  expect(ms).toBeLessThan(2);
});
