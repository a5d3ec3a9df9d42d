import { type Point, pointPath } from '../config/site.ts';
import type { AlarmState, AlarmSubject } from '../detection/alarm.ts';
import { type Chatter, heldAsChattering } from '../detection/alarm-history.ts';
import type { MachineMemory } from '../detection/machine-state.ts';
import { type Because, heldByDesign, type PlantNow, type SuppressionsDue } from '../detection/suppression.ts';
import type { Reader } from '../store/lent-connection.ts';
import { loadMachine } from '../store/sources.ts';
import { type OutOfService, placeOf, placesOutOfService, standingTroubles } from '../store/suppressions.ts';
import type { SiteView } from './site-view.ts';

/** From the ledger and the site file in force to what holds alarms back at this moment. */
export type DueOf = (subject: AlarmSubject, state: AlarmState, chatter?: Chatter | null) => SuppressionsDue;

/** Of all subjects of these points. */
export async function suppressionsDue(
  reader: Reader,
  view: SiteView,
  points: readonly Point[],
): Promise<DueOf> {
  const places = await placesOutOfService(reader);
  const plant = await plantNow(reader, view, namedBy(points));
  const byLimit = new Map(
    points.flatMap((point) =>
      point.limits.flatMap(({ id, suppressedWhile = [] }) =>
        suppressedWhile.length === 0 ? [] : [[`${pointPath(point)} ${id}`, suppressedWhile] as const],
      ),
    ),
  );
  return (subject, state, chatter = null) => {
    const conditions =
      subject.kind === 'limit'
        ? byLimit.get(`${subject.machineId}/${subject.pointId} ${subject.limitId}`)
        : undefined;
    return {
      outOfService: outOfServiceNow(places, subject),
      byDesign:
        (conditions === undefined ? null : heldByDesign(conditions, plant)) ??
        (subject.kind === 'limit' ? heldAsChattering(chatter, state) : null),
    };
  };
}

/** Ids of the machines that `suppressed_while` of these points names. */
export function namedBy(points: readonly Point[]): ReadonlySet<string> {
  return new Set(
    points.flatMap(({ limits }) =>
      limits.flatMap(({ suppressedWhile = [] }) => suppressedWhile.map(({ machineId }) => machineId)),
    ),
  );
}

/** The place that holds it back, as the reason for the journal. */
export function outOfServiceNow(
  places: readonly OutOfService[],
  { machineId, pointId }: AlarmSubject,
): Because | null {
  const place = placeOf(places, machineId, pointId);
  return place === null ? null : { comment: place.comment, reason: { untilMs: place.untilMs, by: place.by } };
}

async function plantNow(reader: Reader, view: SiteView, machineIds: ReadonlySet<string>): Promise<PlantNow> {
  const memories = new Map<string, MachineMemory>();
  const troubled = new Set<string>();
  const silent = new Set<string>();
  for (const machineId of machineIds) {
    const ledgerId = view.ids.machineId(machineId);
    const stored = await loadMachine(reader, ledgerId);
    if (stored !== null) memories.set(machineId, JSON.parse(stored.state) as MachineMemory);
    for (const { subject } of await standingTroubles(reader, ledgerId)) {
      const path = `${machineId}/${subject.pointId}`;
      troubled.add(path);
      if (subject.kind === 'trouble' && subject.trouble === 'overdue') silent.add(path);
    }
  }
  const isSilent = (machineId: string) =>
    view.machine(machineId).points.every((point) => silent.has(pointPath(point)));
  return {
    // What a machine did when it was last heard of holds nothing back for ever.
    stateOf: (machineId) => (isSilent(machineId) ? null : (memories.get(machineId)?.state ?? null)),
    hasTrouble: (machineId, pointId) =>
      pointId === null
        ? view.machine(machineId).points.some((point) => troubled.has(pointPath(point)))
        : troubled.has(`${machineId}/${pointId}`),
  };
}
