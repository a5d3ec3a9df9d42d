import { expect, test } from 'vitest';
import type { AlarmChange, AlarmState, AlarmSubject } from '../../src/detection/alarm.ts';
import { normalState } from '../../src/detection/alarm.ts';
import { loadAllAlarms, standingAlarms } from '../../src/store/alarms.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { matchIds } from '../../src/store/match-ids.ts';
import { readLevels } from '../../src/store/read-trends.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { saveAlarmChange } from '../../src/store/save-alarm.ts';
import {
  plannedRetirements,
  readSiteIds,
  readSiteNames,
  type SiteSynced,
  syncSite,
} from '../../src/store/site-ids.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite, type Tree } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

function sync(ledger: Ledger, tree: Tree, wallMs = 1): Promise<SiteSynced> {
  const { site, text } = smallSite(tree);
  return ledger.transact((writer) => syncSite(writer, site, { text, wallMs }));
}

const raised: AlarmState = {
  ...normalState,
  condition: 'alert',
  highest: 'alert',
  sinceMs: 5,
  count: 1,
  usedMs: 5,
  version: 1,
};

function raise(subject: AlarmSubject): AlarmChange {
  return {
    subject,
    state: raised,
    journal: [{ event: 'raised', before: 'normal', after: 'alert', usedMs: 5, comment: null, reason: {} }],
    tell: { severity: 'alert', event: 'raised', level: 0.003 },
  };
}

function limitOf(machineId: string, pointId: string, bandId: string): AlarmSubject {
  return { kind: 'limit', machineId, pointId, bandId, limitId: `${bandId}-upper` };
}

async function standAlarm(ledger: Ledger, synced: SiteSynced, subject: AlarmSubject): Promise<void> {
  await ledger.transact((writer) =>
    saveAlarmChange(writer, raise(subject), {
      ids: synced.ids,
      wallMs: 1,
      recordingId: null,
      actor: 'service',
      via: 'service',
      fromBacklog: false,
    }),
  );
}

test('reading the same site file again changes nothing', async () => {
  const ledger = await opened(temporaryFolder());
  const tree: Tree = { pump: { 'de-h': ['low', 'high'], 'nde-h': ['low'] }, fan: { 'de-h': ['low'] } };
  const first = await sync(ledger, tree);
  const dump = () =>
    ledger.read(async (reader) => [
      await reader.selectFrom('machines').selectAll().orderBy('id').execute(),
      await reader.selectFrom('points').selectAll().orderBy('id').execute(),
      await reader.selectFrom('bands').selectAll().orderBy('id').execute(),
      await reader.selectFrom('limits').selectAll().orderBy('id').execute(),
      await reader.selectFrom('config_versions').selectAll().orderBy('id').execute(),
    ]);
  const before = await dump();
  expect(before.map((rows) => rows.length)).toEqual([2, 3, 4, 4, 1]);
  const again = await sync(ledger, tree, 99);
  expect(await dump()).toEqual(before);
  expect(again.ids.limitId('pump', 'nde-h', 'low-upper')).toBe(
    first.ids.limitId('pump', 'nde-h', 'low-upper'),
  );
  expect(again.ids.configVersionId).toBe(first.ids.configVersionId);
  expect(() => again.ids.pointId('pump', 'top')).toThrow('not in the site file: pump/top');
});

test('a renaming of machine, point and band at once carries series and standing alarm over', async () => {
  const ledger = await opened(temporaryFolder());
  const old = await sync(ledger, { pump: { de: ['low'] } });
  await ledger.transact(async (writer) => {
    const recordingId = await insertRecording(
      writer,
      recordingOf({ configVersionId: old.ids.configVersionId }),
    );
    await insertMeasurement(writer, old.ids, {
      measurement: measurementOf('pump', 'de', { low: 0.002 }),
      recordingId,
      usedMs: 5,
      machineState: 'running',
      condition: '',
      runningHours: null,
      evaluated: true,
      inTrend: true,
      atAlarm: false,
    });
  });
  await standAlarm(ledger, old, limitOf('pump', 'de', 'low'));
  await standAlarm(ledger, old, {
    kind: 'trouble',
    trouble: 'overdue',
    machineId: 'pump',
    pointId: 'de',
    source: null,
  });

  const renamed: Tree = { 'pump-1<pump': { 'de-h<de': ['overall<low'] } };
  const now = await sync(ledger, renamed, 2);
  expect(now.orphans).toEqual([]);
  expect(now.ids.pointId('pump-1', 'de-h')).toBe(old.ids.pointId('pump', 'de'));
  const levels = await ledger.read((reader) =>
    readLevels(reader, {
      pointId: now.ids.pointId('pump-1', 'de-h'),
      bandId: now.ids.bandId('pump-1', 'de-h', 'overall'),
      fromMs: 0,
      toMs: 10,
      limit: 10,
    }),
  );
  expect(levels.map((row) => row.level)).toEqual([0.002]);
  const standing = await ledger.read(standingAlarms);
  expect(
    standing.map(({ alarm, life }) => [life.number, life.key, alarm.key, alarm.subject.machineId]),
  ).toEqual([
    [1, 'limit:pump-1/de-h/overall/overall-upper', 'limit:pump-1/de-h/overall/overall-upper', 'pump-1'],
    [2, 'trouble:overdue:pump-1/de-h', 'trouble:overdue:pump-1/de-h', 'pump-1'],
  ]);
  const untold = await ledger.read((reader) =>
    reader.selectFrom('to_tell').select('key').orderBy('id').execute(),
  );
  expect(untold[0]?.key).toBe('limit:pump-1/de-h/overall/overall-upper');
  await sync(ledger, renamed, 3);
  expect((await ledger.read(standingAlarms)).length).toBe(2);
});

test('what vanishes is retired with all below it, its standing alarms are handed back, and it can return', async () => {
  const ledger = await opened(temporaryFolder());
  const tree: Tree = { pump: { de: ['low', 'high'] }, fan: { de: ['low'] } };
  const first = await sync(ledger, tree);
  await standAlarm(ledger, first, limitOf('pump', 'de', 'high'));
  await standAlarm(ledger, first, limitOf('fan', 'de', 'low'));
  await standAlarm(ledger, first, limitOf('pump', 'de', 'low'));
  const second = await sync(ledger, { pump: { de: ['low'] } }, 7);
  expect(second.orphans.map((alarm) => [alarm.key, alarm.number])).toEqual([
    ['limit:fan/de/low/low-upper', 2],
    ['limit:pump/de/high/high-upper', 1],
  ]);
  const retired = await ledger.read((reader) =>
    reader
      .selectFrom('limits')
      .select(['id_in_site', 'retired_ms'])
      .where('retired_ms', 'is not', null)
      .orderBy('id')
      .execute(),
  );
  expect(retired).toEqual([
    { id_in_site: 'high-upper', retired_ms: 7 },
    { id_in_site: 'low-upper', retired_ms: 7 },
  ]);
  const [orphan] = second.orphans;
  if (orphan === undefined) throw new Error('no orphan');
  const saved = await ledger.transact((writer) =>
    saveAlarmChange(
      writer,
      {
        subject: orphan.subject,
        state: { ...normalState, version: 2 },
        journal: [
          {
            event: 'limit-removed',
            before: 'alert',
            after: 'normal',
            usedMs: null,
            comment: null,
            reason: {},
          },
        ],
        tell: null,
      },
      { ids: second.ids, wallMs: 8, recordingId: null, actor: 'service', via: 'service', fromBacklog: false },
    ),
  );
  expect(saved.number).toBe(2);
  const third = await sync(ledger, tree, 9);
  expect(third.orphans).toEqual([]);
  expect(third.ids.limitId('fan', 'de', 'low-upper')).toBe(first.ids.limitId('fan', 'de', 'low-upper'));
  expect((await ledger.read(standingAlarms)).map(({ life }) => life.number)).toEqual([1, 3]);
});

test('a name that is given on in the same edit goes to the new owner, and the old one keeps its history', async () => {
  const ledger = await opened(temporaryFolder());
  const first = await sync(ledger, { pump: { a: ['low'], b: ['low'] } });
  await standAlarm(ledger, first, limitOf('pump', 'a', 'low'));
  await standAlarm(ledger, first, limitOf('pump', 'b', 'low'));
  const edit: Tree = { pump: { 'b<a': ['low'], 'c<b': ['low'] } };
  const second = await sync(ledger, edit, 2);
  expect(second.ids.pointId('pump', 'b')).toBe(first.ids.pointId('pump', 'a'));
  expect(second.ids.pointId('pump', 'c')).toBe(first.ids.pointId('pump', 'b'));
  const alarms = await ledger.read(loadAllAlarms);
  expect(alarms.map((alarm) => [alarm.key, alarm.number])).toEqual([
    ['limit:pump/b/low/low-upper', 1],
    ['limit:pump/c/low/low-upper', 2],
  ]);
  const third = await sync(ledger, edit, 3);
  expect(third.ids.pointId('pump', 'b')).toBe(second.ids.pointId('pump', 'b'));
});

test('whoever only reads finds the ids of what is in use, and the names of all there ever was', async () => {
  const ledger = await opened(temporaryFolder());
  expect(await ledger.read(readSiteIds)).toBeNull();
  const first = await sync(ledger, { pump: { de: ['low', 'high'] }, fan: { de: ['low'] } });
  const second = await sync(ledger, { 'pump-1<pump': { de: ['low'] } }, 2);
  const ids = await ledger.read(readSiteIds);
  expect(ids?.configVersionId).toBe(second.ids.configVersionId);
  expect(ids?.bandId('pump-1', 'de', 'low')).toBe(first.ids.bandId('pump', 'de', 'low'));
  expect(ids?.limitId('pump-1', 'de', 'low-upper')).toBe(first.ids.limitId('pump', 'de', 'low-upper'));
  expect(() => ids?.machineId('fan')).toThrow('not in the site file: fan');
  expect(() => ids?.bandId('pump-1', 'de', 'high')).toThrow();
  const names = await ledger.read(readSiteNames);
  expect(names.machine(first.ids.machineId('fan'))).toEqual(['fan']);
  expect(names.point(first.ids.pointId('pump', 'de'))).toEqual(['pump-1', 'de']);
  expect(names.band(first.ids.bandId('pump', 'de', 'high'))).toEqual(['pump-1', 'de', 'high']);
  expect(names.limit(first.ids.limitId('fan', 'de', 'low-upper'))).toEqual(['fan', 'de', 'low-upper']);
});

test('what a site file would retire can be asked before it is taken over, and nothing changes by asking', async () => {
  const ledger = await opened(temporaryFolder());
  await sync(ledger, { pump: { de: ['low', 'high'] }, fan: { de: ['low'] } });
  const { site, text } = smallSite({ 'pump-1<pump': { de: ['low'], nde: ['low'] } });
  const planned = await plannedRetirements(ledger, site, { text, wallMs: 5 });
  expect(planned).toEqual({
    machines: ['fan'],
    points: ['fan/de'],
    bands: ['pump/de/high', 'fan/de/low'],
    limits: ['pump/de/high-upper', 'fan/de/low-upper'],
  });
  const ids = await ledger.read(readSiteIds);
  expect(ids?.pointId('fan', 'de')).toBeGreaterThan(0);
  expect(() => ids?.machineId('pump-1')).toThrow();
});

test('matching rows to the site file: own name, former name, retired rows, in this order', () => {
  const row = (id: number, idInSite: string, retiredMs: number | null = null) => ({
    id,
    idInSite,
    retiredMs,
  });
  const want = (id: string, ...formerly: string[]) => ({ id, formerly });
  const match = (known: Parameters<typeof matchIds>[0], wanted: Parameters<typeof matchIds>[1]) => {
    const { rows, vanished } = matchIds(known, wanted);
    return [rows.map((found) => found?.id ?? null), vanished.map((gone) => gone.id)];
  };
  expect(match([], [want('a')])).toEqual([[null], []]);
  expect(match([row(1, 'a'), row(2, 'b')], [want('b')])).toEqual([[2], [1]]);
  expect(match([row(1, 'old')], [want('new', 'older', 'old')])).toEqual([[1], []]);
  expect(match([row(1, 'old'), row(2, 'new')], [want('new', 'old')])).toEqual([[2], [1]]);
  expect(match([row(1, 'old'), row(2, 'new', 5)], [want('new', 'old')])).toEqual([[1], []]);
  expect(match([row(1, 'a', 5), row(2, 'a', 9)], [want('a')])).toEqual([[2], []]);
  expect(match([row(1, 'a'), row(2, 'b')], [want('a', 'b'), want('b', 'a')])).toEqual([[1, 2], []]);
  expect(match([row(1, 'a')], [want('b', 'a'), want('c', 'a')])).toEqual([[1, null], []]);
  expect(match([row(1, 'a'), row(2, 'b')], [want('c', 'b'), want('b', 'a'), want('a')])).toEqual([
    [2, 1, null],
    [],
  ]);
});
