import type { AlarmChange } from '../detection/alarm.ts';
import { alarmStep } from '../detection/alarm-state.ts';
import { followSuppressions, ruleOfCommands } from '../detection/suppression.ts';
import { changeOf } from '../detection/trouble.ts';
import type { StoredAlarm } from '../store/alarms.ts';
import { appendJournal } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import {
  liveAlarms,
  nextEndMs,
  placePath,
  placesOutOfService,
  removeOutOfService,
  setShelf,
  shelvesOver,
  suppressedAlarms,
} from '../store/suppressions.ts';
import { chatteringAlarms } from './chattering.ts';
import type { SiteView } from './site-view.ts';
import { suppressionsDue } from './suppressions-due.ts';

/**
 * Suppressions end by themselves: shelves and places out of service at their time (wall clock of the person), what is
 * held back by design when its condition does not hold any more. What stands then is told. Looked at in every round,
 * so also while no recording comes and after the service was off; reads first, and only a change takes a transaction.
 *
 * Returns the wall time at which the next one ends; null: none has an end.
 */
export async function watchSuppressions(
  ledger: Ledger,
  view: SiteView,
  wallMs: number,
): Promise<number | null> {
  const { over, follows, nextMs } = await ledger.read(async (reader) => ({
    over: await isOver(reader, wallMs),
    follows: (await changesDue(reader, view)).length > 0,
    nextMs: await nextEndMs(reader),
  }));
  if (!over && !follows) return nextMs;
  return await ledger.transact(async (writer) => {
    await endShelves(writer, view, wallMs);
    await endPlaces(writer, view, wallMs);
    await followAll(writer, view, contextOf(view, wallMs));
    return await nextEndMs(writer);
  });
}

/** Every alarm that stands or is held back comes under what holds now. */
export async function followAll(writer: Writer, view: SiteView, context: ChangeContext): Promise<void> {
  for (const change of await changesDue(writer, view)) await saveAlarmChange(writer, change, context);
}

async function isOver(reader: Reader, wallMs: number): Promise<boolean> {
  const nextMs = await nextEndMs(reader);
  return nextMs !== null && nextMs <= wallMs;
}

async function changesDue(reader: Reader, view: SiteView): Promise<AlarmChange[]> {
  const alarms = await concerned(reader);
  if (alarms.length === 0) return [];
  const dueOf = await suppressionsDue(reader, view, view.points);
  const held = alarms.filter(({ state }) => state.suppressions.includes('by-design'));
  const chattering = await chatteringAlarms(reader, held);
  return alarms.flatMap(({ key, subject, state }) =>
    followSuppressions(subject, state, dueOf(subject, state, chattering.get(key))),
  );
}

async function concerned(reader: Reader): Promise<StoredAlarm[]> {
  const alarms = [...(await liveAlarms(reader)), ...(await suppressedAlarms(reader))];
  return [...new Map(alarms.map((alarm) => [alarm.key, alarm])).values()];
}

async function endShelves(writer: Writer, view: SiteView, wallMs: number): Promise<void> {
  for (const { key, subject, state, shelf } of await shelvesOver(writer, wallMs)) {
    const reason = { untilMs: shelf?.untilMs ?? null, by: shelf?.by ?? null };
    const command = { kind: 'shelf-expired', comment: shelf?.comment ?? null, reason } as const;
    const change = changeOf(subject, state, alarmStep(state, command, ruleOfCommands));
    if (change === null) await setShelf(writer, key, null);
    else await saveAlarmChange(writer, change, contextOf(view, wallMs));
  }
}

/** The place's own row in the journal; its alarms follow. */
async function endPlaces(writer: Writer, view: SiteView, wallMs: number): Promise<void> {
  for (const place of await placesOutOfService(writer)) {
    if (place.untilMs > wallMs) continue;
    await removeOutOfService(writer, place);
    await appendJournal(writer, {
      key: null,
      number: null,
      event: 'in-service',
      before: null,
      after: null,
      usedMs: null,
      wallMs,
      recordingId: null,
      configVersionId: view.ids.configVersionId,
      actor: 'service',
      via: 'service',
      comment: place.comment,
      reason: { place: placePath(place), untilMs: place.untilMs, by: place.by },
    });
  }
}

function contextOf(view: SiteView, wallMs: number): ChangeContext {
  const actor = 'service';
  return { ids: view.ids, wallMs, recordingId: null, actor, via: actor, fromBacklog: false };
}
