import { expect, test } from 'vitest';
import type { AlarmChange, AlarmState, AlarmSubject, JournalEventName } from '../../src/detection/alarm.ts';
import { normalState, subjectKey } from '../../src/detection/alarm.ts';
import {
  alarmByNumber,
  livesRaised,
  loadAlarms,
  loadAlarmsOfMachine,
  standingAlarms,
} from '../../src/store/alarms.ts';
import { appendJournal, newestSequence, readJournal } from '../../src/store/journal.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { type ChangeSaved, saveAlarmChange } from '../../src/store/save-alarm.ts';
import { type SiteIds, syncSite } from '../../src/store/site-ids.ts';
import { smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const subject: AlarmSubject = {
  kind: 'limit',
  machineId: 'pump',
  pointId: 'de',
  bandId: 'low',
  limitId: 'low-upper',
};

async function withSite(): Promise<{ readonly ledger: Ledger; readonly ids: SiteIds }> {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: ['low'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  return { ledger, ids };
}

function change(
  event: JournalEventName,
  state: Partial<AlarmState>,
  told = true,
  about = subject,
): AlarmChange {
  const whole = { ...normalState, usedMs: 5, ...state };
  return {
    subject: about,
    state: whole,
    journal: [
      {
        event,
        before: 'normal',
        after: whole.condition,
        usedMs: whole.usedMs,
        comment: null,
        reason: { level: 3 },
      },
    ],
    tell: told ? { severity: whole.highest ?? 'alert', event, level: 0.003 } : null,
  };
}

const alert = { condition: 'alert', highest: 'alert', sinceMs: 5, count: 1 } as const;

function save(
  ledger: Ledger,
  ids: SiteIds,
  what: AlarmChange,
  wallMs = 10,
  actor = 'service',
): Promise<ChangeSaved> {
  return ledger.transact((writer) =>
    saveAlarmChange(writer, what, {
      ids,
      wallMs,
      recordingId: null,
      actor,
      via: 'command',
      fromBacklog: false,
    }),
  );
}

test('an alarm has one number from raised to normal again, and the next life a new one', async () => {
  const { ledger, ids } = await withSite();
  expect(await save(ledger, ids, change('raised', { ...alert, version: 1 }))).toEqual({
    number: 1,
    sequences: [1],
    told: true,
  });
  const danger = { ...alert, condition: 'danger', highest: 'danger' } as const;
  expect((await save(ledger, ids, change('rose', { ...danger, version: 2 }), 20)).number).toBe(1);
  await save(
    ledger,
    ids,
    change('acknowledged', { ...danger, acknowledged: true, version: 3 }, false),
    30,
    'Kim',
  );
  const [standing] = await ledger.read(standingAlarms);
  expect(standing?.life).toEqual({
    number: 1,
    key: subjectKey(subject),
    severity: 'danger',
    raisedUsedMs: 5,
    raisedWallMs: 10,
    endedWallMs: null,
    acknowledgedWallMs: 30,
    acknowledgedBy: 'Kim',
  });
  expect(standing?.alarm.state).toMatchObject({ condition: 'danger', acknowledged: true, version: 3 });
  expect(await save(ledger, ids, change('returned', { version: 4 }, false), 40)).toEqual({
    number: 1,
    sequences: [4],
    told: false,
  });
  expect(await ledger.read(standingAlarms)).toEqual([]);
  expect((await ledger.read((reader) => alarmByNumber(reader, 1)))?.life).toMatchObject({
    endedWallMs: 40,
    acknowledgedBy: 'Kim',
    severity: 'danger',
  });
  expect((await save(ledger, ids, change('raised', { ...alert, version: 5 }), 50)).number).toBe(2);
  expect(
    (await ledger.read((reader) => livesRaised(reader, { fromMs: 10, toMs: 51, limit: 9 }))).map(
      (life) => life.number,
    ),
  ).toEqual([2, 1]);
  expect(await ledger.read((reader) => alarmByNumber(reader, 3))).toBeNull();
});

test('a rise that clears the acknowledgement takes the name of who gave it from the list', async () => {
  const { ledger, ids } = await withSite();
  await save(ledger, ids, change('raised', { ...alert, version: 1 }));
  await save(
    ledger,
    ids,
    change('acknowledged', { ...alert, acknowledged: true, version: 2 }, false),
    20,
    'Kim',
  );
  await save(
    ledger,
    ids,
    change('rose', { ...alert, condition: 'danger', highest: 'danger', version: 3 }),
    30,
  );
  const [standing] = await ledger.read(standingAlarms);
  expect(standing?.life).toMatchObject({
    acknowledgedBy: null,
    acknowledgedWallMs: null,
    severity: 'danger',
  });
});

test('a returned alarm that nobody acknowledged goes on standing', async () => {
  const { ledger, ids } = await withSite();
  await save(ledger, ids, change('raised', { ...alert, version: 1 }));
  await save(ledger, ids, change('returned', { ...alert, condition: 'normal', version: 2 }, false));
  expect((await ledger.read(standingAlarms)).map(({ life }) => life.number)).toEqual([1]);
  await save(ledger, ids, change('acknowledged', { version: 3 }, false), 60, 'Kim');
  expect(await ledger.read(standingAlarms)).toEqual([]);
  expect((await ledger.read((reader) => alarmByNumber(reader, 1)))?.life.acknowledgedBy).toBe('Kim');
});

test('a step that does not follow what is stored is refused and stores nothing', async () => {
  const { ledger, ids } = await withSite();
  for (const version of [2, -1]) {
    await expect(save(ledger, ids, change('raised', { ...alert, version }))).rejects.toThrow(
      'does not follow',
    );
  }
  await save(ledger, ids, change('raised', { ...alert, version: 1 }));
  await save(ledger, ids, change('rose', { ...alert, version: 2 }));
  await expect(save(ledger, ids, change('rose', { ...alert, version: 1 }))).rejects.toThrow(
    'stored in version 2',
  );
  expect(await ledger.read(newestSequence)).toBe(2);
  await expect(
    save(ledger, ids, change('rose', { ...alert, toldLevel: Number.NaN, version: 3 })),
  ).rejects.toThrow('NaN');
  expect(await ledger.read(newestSequence)).toBe(2);
});

test('something to tell without a change of state is journalled and told once', async () => {
  const { ledger, ids } = await withSite();
  const late = change('exceeded-came-late', { version: 0 });
  expect(await save(ledger, ids, late)).toEqual({ number: null, sequences: [1], told: true });
  await save(ledger, ids, late);
  await save(ledger, ids, change('exceeded-came-late', { version: 0, usedMs: 6 }));
  const untold = await ledger.read((reader) => untoldEvents(reader, 10));
  expect(untold.map((event) => event.journalSequence)).toEqual([1, 3]);
  expect((await ledger.read((reader) => loadAlarms(reader, [subjectKey(subject)]))).size).toBe(0);
});

test('events due to be told are named alike in every run', async () => {
  const identities: string[] = [];
  for (let run = 0; run < 2; run++) {
    const { ledger, ids } = await withSite();
    await save(ledger, ids, change('raised', { ...alert, version: 1 }), 10 + run);
    const [event] = await ledger.read((reader) => untoldEvents(reader, 10));
    expect(event).toMatchObject({
      machineId: 1,
      severity: 'alert',
      event: 'raised',
      level: 0.003,
      number: 1,
      fromBacklog: false,
    });
    identities.push(event?.identity ?? '');
  }
  expect(identities[0]).toMatch(/^[0-9a-f]{64}$/);
  expect(identities[1]).toBe(identities[0]);
});

test('troubles of a logger and of the site are kept without a machine', async () => {
  const { ledger, ids } = await withSite();
  const trouble = (source: string | null): AlarmSubject => ({
    kind: 'trouble',
    trouble: 'clock',
    machineId: null,
    pointId: null,
    source,
  });
  const state = { condition: 'trouble', highest: 'trouble', sinceMs: 5, count: 1, version: 1 } as const;
  await save(ledger, ids, change('raised', state, true, trouble('logger 1')));
  await save(ledger, ids, change('raised', state, true, trouble(null)));
  const stored = await ledger.read((reader) =>
    loadAlarms(reader, ['trouble:clock:logger 1', 'trouble:clock:site', 'none']),
  );
  expect([...stored.values()].map((alarm) => [alarm.key, alarm.machineId, alarm.number])).toEqual([
    ['trouble:clock:logger 1', null, 1],
    ['trouble:clock:site', null, 2],
  ]);
  expect(await ledger.read((reader) => loadAlarmsOfMachine(reader, ids.machineId('pump')))).toEqual([]);
});

test('the journal is read in pages by its sequence and can only be added to', async () => {
  const { ledger, ids } = await withSite();
  const entry = {
    key: null,
    number: null,
    event: 'note',
    before: null,
    after: null,
    usedMs: null,
    recordingId: null,
    configVersionId: ids.configVersionId,
    actor: 'Kim',
    via: 'command',
    comment: 'greased',
    reason: { kind: 'lubricated' },
  } as const;
  // The wall clock runs backwards; the sequence does not care.
  for (let row = 0; row < 5; row++)
    await ledger.transact((writer) => appendJournal(writer, { ...entry, wallMs: 100 - row }));
  const sequences = async (page: Parameters<typeof readJournal>[1]) =>
    (await ledger.read((reader) => readJournal(reader, page))).map((row) => row.sequence);
  expect(await sequences({ limit: 2 })).toEqual([5, 4]);
  expect(await sequences({ limit: 2, beforeSequence: 4 })).toEqual([3, 2]);
  expect(await sequences({ limit: 2, afterSequence: 2 })).toEqual([3, 4]);
  expect(await sequences({ limit: 9, fromWallMs: 99 })).toEqual([2, 1]);
  const [row] = await ledger.read((reader) => readJournal(reader, { limit: 1 }));
  expect(row).toEqual({ ...entry, wallMs: 96, sequence: 5 });
  await expect(
    ledger.transact((writer) => writer.updateTable('journal').set({ actor: 'x' }).execute()),
  ).rejects.toThrow('only ever added to');
  await expect(ledger.transact((writer) => writer.deleteFrom('journal').execute())).rejects.toThrow(
    'only ever added to',
  );
});
