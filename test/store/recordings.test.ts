import { expect, test } from 'vitest';
import {
  beginAttempt,
  endAttempt,
  forgetSeen,
  noteSeen,
  readMark,
  seenFile,
  tellOnce,
  unfinishedAttempts,
  writeMark,
} from '../../src/store/intake-marks.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import {
  countByOutcome,
  findTaken,
  findTakenByContent,
  insertRecording,
  latestTaken,
  markFiled,
  type NewRecording,
  pendingFilings,
  recentByOutcome,
  recordingById,
  takenBetween,
} from '../../src/store/recordings.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import {
  allSources,
  arrivalsOf,
  getSource,
  loadMachine,
  noteArrival,
  saveMachine,
  saveSource,
} from '../../src/store/sources.ts';
import { recordingOf } from './new-recording.ts';
import { smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

async function withSite(): Promise<Ledger> {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: ['low'], nde: ['low'] } });
  await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  return ledger;
}

const insert = (ledger: Ledger, more: Partial<NewRecording>) =>
  ledger.transact((writer) => insertRecording(writer, recordingOf(more)));

test('a recording is taken once; repeats and refused files of the same identity are kept beside it', async () => {
  const ledger = await withSite();
  const sourceOf = (name: string) => ledger.transact(async (writer) => (await getSource(writer, name)).id);
  const [sourceId, other] = [await sourceOf('pump_<any>'), await sourceOf('press_<any>')];
  const id = await insert(ledger, { sourceId });
  await insert(ledger, { sourceId: other, identity: 'identity-3' });
  await insert(ledger, { outcome: 'repeat' });
  await insert(ledger, { outcome: 'quarantined', reason: 'empty', identity: 'identity-2', arrivedMs: 900 });
  await expect(insert(ledger, {})).rejects.toThrow('UNIQUE');
  expect(await ledger.read((reader) => findTaken(reader, 'identity-1'))).toEqual({
    ...recordingOf({ sourceId }),
    id,
  });
  expect(await ledger.read((reader) => findTaken(reader, 'identity-2'))).toBeNull();
  expect((await ledger.read((reader) => findTakenByContent(reader, sourceId, 'content-1')))?.id).toBe(id);
  expect(await ledger.read((reader) => countByOutcome(reader, 1000))).toEqual({
    taken: 2,
    repeat: 1,
    quarantined: 0,
    unassigned: 0,
  });
  const quarantined = await ledger.read((reader) => recentByOutcome(reader, 'quarantined', 5));
  expect(quarantined.map((row) => row.reason)).toEqual(['empty']);
});

test('recordings of a source are found by used time; only taken ones count', async () => {
  const ledger = await withSite();
  const source = await ledger.transact((writer) => getSource(writer, 'pump_<any>.wav'));
  expect((await ledger.transact((writer) => getSource(writer, 'pump_<any>.wav'))).id).toBe(source.id);
  for (const usedMs of [300, 100, 200]) {
    await insert(ledger, { identity: `at ${usedMs}`, sourceId: source.id, usedMs });
  }
  await insert(ledger, { sourceId: source.id, usedMs: 900, outcome: 'unassigned' });
  const found = await ledger.read(async (reader) => ({
    latest: await latestTaken(reader, source.id),
    between: await takenBetween(reader, source.id, { fromMs: 100, toMs: 200, limit: 10 }),
  }));
  expect(found.latest?.usedMs).toBe(300);
  expect(found.between.map((row) => row.usedMs)).toEqual([100, 200]);
  await ledger.transact((writer) =>
    saveSource(writer, { ...source, clockOffsetMs: -5000, repeatsInARow: 2, newestUsedMs: 300 }),
  );
  expect(await ledger.read(allSources)).toEqual([
    { ...source, clockOffsetMs: -5000, repeatsInARow: 2, newestUsedMs: 300 },
  ]);
});

test('files decided on and not yet moved are found again in their order, until they are filed', async () => {
  const ledger = await withSite();
  const first = await insert(ledger, {});
  const second = await insert(ledger, { identity: 'identity-2' });
  expect((await ledger.read((reader) => pendingFilings(reader, 10))).map((row) => row.id)).toEqual([
    first,
    second,
  ]);
  await ledger.transact((writer) => markFiled(writer, first, 'archive/x~01234567.wav'));
  await ledger.transact((writer) => markFiled(writer, first, 'archive/x~01234567.wav'));
  expect((await ledger.read((reader) => pendingFilings(reader, 10))).map((row) => row.id)).toEqual([second]);
  expect(await ledger.read((reader) => recordingById(reader, first))).toMatchObject({
    filingState: 'filed',
    filingTo: 'archive/x~01234567.wav',
  });
});

test('an attempt that did not end is known at the next start, and how often', async () => {
  const ledger = await withSite();
  const begin = (fileKey: string, begunMs: number) =>
    ledger.transact((writer) => beginAttempt(writer, { fileKey, fileName: `${fileKey}.wav`, begunMs }));
  expect(await begin('a', 1)).toBe(1);
  expect(await begin('b', 2)).toBe(1);
  await ledger.transact((writer) => endAttempt(writer, 'a'));
  expect(await begin('b', 3)).toBe(2);
  expect(await begin('a', 4)).toBe(1);
  expect(await ledger.read(unfinishedAttempts)).toEqual([
    { fileKey: 'b', fileName: 'b.wav', begunMs: 3, unfinished: 2 },
    { fileKey: 'a', fileName: 'a.wav', begunMs: 4, unfinished: 1 },
  ]);
});

test('files left in place are remembered by path, things told once by key, marks by name', async () => {
  const ledger = await withSite();
  await ledger.transact(async (writer) => {
    const file = { path: 'a.wav', sizeBytes: 1, mtimeMs: 5.75, ctimeMs: 6.25, recordingId: null };
    await noteSeen(writer, file);
    expect(await seenFile(writer, 'a.wav')).toEqual({ ...file, mtimeMs: 5, ctimeMs: 6 });
    await noteSeen(writer, { ...file, sizeBytes: 2 });
    expect((await seenFile(writer, 'a.wav'))?.sizeBytes).toBe(2);
    await forgetSeen(writer, 'a.wav');
    expect(await seenFile(writer, 'a.wav')).toBeNull();
    expect([
      await tellOnce(writer, 'k', 1),
      await tellOnce(writer, 'k', 2),
      await tellOnce(writer, 'l', 3),
    ]).toEqual([true, false, true]);
    await writeMark(writer, 'last-start', '5');
    await writeMark(writer, 'last-start', '6');
    expect(await readMark(writer, 'last-start')).toBe('6');
    await expect(writeMark(writer, 'ledger-id', 'other')).rejects.toThrow('never changes');
  });
});

test('what a point has sent never goes back in time', async () => {
  const ledger = await withSite();
  await ledger.transact(async (writer) => {
    await noteArrival(writer, 1, { arrivedMs: 100, usedMs: 50, evaluated: true });
    await noteArrival(writer, 1, { arrivedMs: 90, usedMs: 70, evaluated: false });
    await noteArrival(writer, 1, { arrivedMs: 110, usedMs: null, evaluated: false });
    await noteArrival(writer, 1, { arrivedMs: 120, usedMs: 20, evaluated: true });
  });
  const arrivals = await ledger.read((reader) => arrivalsOf(reader, [1, 2]));
  expect([...arrivals.values()]).toEqual([
    { pointId: 1, lastArrivedMs: 120, newestUsedMs: 70, newestEvaluatedUsedMs: 50, recordings: 4 },
  ]);
});

test("a machine's record is stored version by version", async () => {
  const ledger = await withSite();
  const save = (version: number, state: string) =>
    ledger.transact((writer) => saveMachine(writer, { machineId: 1, state, usedMs: version, version }));
  await save(1, 'running');
  await save(2, 'stopped');
  await expect(save(2, 'running')).rejects.toThrow('version 2 does not follow');
  expect(await ledger.read((reader) => loadMachine(reader, 1))).toEqual({
    machineId: 1,
    state: 'stopped',
    usedMs: 2,
    version: 2,
  });
});
