import { pointPath } from '../config/site.ts';
import { followSuppressions } from '../detection/suppression.ts';
import { loadAlarmsOfMachine } from '../store/alarms.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Writer } from '../store/lent-connection.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { readSiteIds, type SiteIds } from '../store/site-ids.ts';
import {
  type OutOfService,
  placePath,
  placesOutOfService,
  putOutOfService,
  removeOutOfService,
} from '../store/suppressions.ts';
import { writeAct } from './acts-log.ts';
import type { Person } from './alarm-command.ts';
import { journalPlace, learnAgain, type Place, pathOf, siteFileUnknown } from './machine-acts.ts';
import { outOfServiceNow } from './suppressions-due.ts';

/**
 * Out of service (ANSI/ISA-18.2-2016, state I): a person takes a machine or a point out until a stated time, under a name
 * and a reason. All its limits and troubles are held back, also those that do not stand yet; what is measured is measured
 * on. One transaction each, with its row in the journal; then its line beside the ledger.
 */
export type Commented = Person & { readonly comment: string };

export interface ServiceAnswer {
  /** Alarms and troubles that stood and are held back now, or that speak again. */
  readonly alarms: number;
  /** Baselines that are learned anew. */
  readonly baselines: number;
  /** Points of the machine that stay out of service by themselves. */
  readonly staying: readonly string[];
  /** It is done, but could not be written down beside the ledger. */
  readonly note: string | null;
}

type Done = Omit<ServiceAnswer, 'note'>;

export async function takeOutOfService(
  ledger: Ledger,
  place: Place,
  untilMs: number,
  person: Commented,
): Promise<ServiceAnswer | { readonly refused: string }> {
  const { by, comment, wallMs } = person;
  const alarms = await ledger.transact(async (writer) => {
    const ids = await readSiteIds(writer);
    if (ids === null || !knows(ids, place)) return null;
    await putOutOfService(writer, { ...idsOf(ids, place), fromMs: wallMs, untilMs, by, comment });
    const entry = { event: 'out-of-service', comment, usedMs: null, reason: { untilMs, by } } as const;
    await journalPlace(writer, ids, place, person, entry);
    return await follow(writer, ids, place, person);
  });
  if (alarms === null) return { refused: siteFileUnknown };
  const command = `out-of-service ${pathOf(place)}`;
  const note = writeAct(ledger, person, { command, event: 'out-of-service', key: null, comment });
  return { alarms, baselines: 0, staying: [], note };
}

/** Before its time. With `newBaseline` all that is usual is learned anew from now on, as after an overhaul. */
export async function putInService(
  ledger: Ledger,
  place: Place,
  { newBaseline }: { readonly newBaseline: boolean },
  person: Commented,
): Promise<ServiceAnswer | { readonly refused: string }> {
  const { comment, wallMs } = person;
  const answer = await ledger.transact<Done | { readonly refused: string }>(async (writer) => {
    const ids = await readSiteIds(writer);
    if (ids === null || !knows(ids, place)) return { refused: siteFileUnknown };
    const before = await placesOutOfService(writer);
    if (!(await removeOutOfService(writer, idsOf(ids, place)))) {
      return { refused: notOut(before, place) };
    }
    const entry = { event: 'in-service', comment, usedMs: null, reason: { newBaseline } } as const;
    await journalPlace(writer, ids, place, person, entry);
    const alarms = await follow(writer, ids, place, person);
    const baselines = newBaseline ? await learnAgain(writer, ids, place, wallMs) : 0;
    if (newBaseline)
      await journalPlace(writer, ids, place, person, {
        event: 'baseline-begun-again',
        comment,
        usedMs: wallMs,
        reason: { baselines },
      });
    return { alarms, baselines, staying: place.point === null ? ownPoints(before, place.machine.id) : [] };
  });
  if ('refused' in answer) return answer;
  const command = `in-service ${pathOf(place)}${newBaseline ? ' --new-baseline' : ''}`;
  return {
    ...answer,
    note: writeAct(ledger, person, { command, event: 'in-service', key: null, comment }),
  };
}

/** Alarms of the place that stand or are held back come under what holds now; how many were touched. */
async function follow(writer: Writer, ids: SiteIds, place: Place, person: Commented): Promise<number> {
  const places = await placesOutOfService(writer);
  const { machineId, pointId: ofPoint } = idsOf(ids, place);
  const context = { ids, wallMs: person.wallMs, recordingId: null, actor: person.by, via: person.via };
  let touched = 0;
  for (const { subject, state, pointId } of await loadAlarmsOfMachine(writer, machineId)) {
    if (ofPoint !== null && pointId !== ofPoint) continue;
    if (state.highest === null && state.suppressions.length === 0) continue;
    const due = {
      outOfService: outOfServiceNow(places, subject),
      // What holds by design is the service's to say: it looks at the plant in every round.
      byDesign: state.suppressions.includes('by-design') ? { comment: null, reason: {} } : null,
    };
    const changes = followSuppressions(subject, state, due, { comment: person.comment, reason: {} });
    for (const change of changes) await saveAlarmChange(writer, change, { ...context, fromBacklog: false });
    if (changes.length > 0 && state.highest !== null) touched++;
  }
  return touched;
}

/** False where this site file was not put in force yet, and the ledger has another. */
function knows(ids: SiteIds, place: Place): boolean {
  try {
    idsOf(ids, place);
    return true;
  } catch {
    return false;
  }
}

function idsOf(
  ids: SiteIds,
  { machine, point }: Place,
): { readonly machineId: number; readonly pointId: number | null } {
  const pointId = point === null ? null : ids.pointId(machine.id, point.id);
  return { machineId: ids.machineId(machine.id), pointId };
}

function notOut(before: readonly OutOfService[], { machine, point }: Place): string {
  const ofMachine = before.some((one) => one.machine === machine.id && one.point === null);
  if (point !== null && ofMachine)
    return `${pointPath(point)} is out of service with its machine: put ${machine.id} in service`;
  const own = ownPoints(before, machine.id);
  const some = point === null && own.length > 0 ? `; of its points ${own.join(', ')}` : '';
  return `${pathOf({ machine, point })} is not out of service${some}`;
}

function ownPoints(before: readonly OutOfService[], machineId: string): string[] {
  return before.filter((one) => one.machine === machineId && one.point !== null).map(placePath);
}
