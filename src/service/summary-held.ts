import type { ChatteringFacts, OutOfServiceFacts } from '../advisory/summary-held.ts';
import { livesRaised, loadAlarms } from '../store/alarms.ts';
import type { Reader } from '../store/lent-connection.ts';
import { type OutOfService, placeOf } from '../store/suppressions.ts';
import { chatteringAlarms } from './chattering.ts';
import { machineFacts, pointFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** What is out of service, and which alarms come and go, for the summary. */
export interface HeldNow {
  readonly outOfService: readonly OutOfServiceFacts[];
  readonly chattering: readonly ChatteringFacts[];
}

const monthMs = 30 * 86_400_000;
const mostLives = 5000;

export async function heldNow(
  reader: Reader,
  view: SiteView,
  places: readonly OutOfService[],
  nowMs: number,
): Promise<HeldNow> {
  const range = { fromMs: nowMs - monthMs, toMs: nowMs + 1, limit: mostLives };
  const keys = new Set((await livesRaised(reader, range)).map(({ key }) => key));
  const alarms = await loadAlarms(
    reader,
    [...keys].filter((key) => key.startsWith('limit:')),
  );
  const chattering = await chatteringAlarms(reader, alarms.values());
  return {
    outOfService: places.map(({ machine, point, untilMs, by, comment }) => ({
      machine: machineFacts(view, machine),
      point: point === null ? null : pointFacts(view, machine, point),
      untilMs,
      by,
      comment,
    })),
    chattering: [...chattering].flatMap(([key, { returns }]) => {
      const { subject, number = null } = alarms.get(key) ?? {};
      if (subject?.kind !== 'limit' || number === null) return [];
      const { machineId, pointId, bandId } = subject;
      const place = { machine: machineFacts(view, machineId), point: pointFacts(view, machineId, pointId) };
      return [{ number, ...place, bandId, returns }];
    }),
  };
}

export function isOutOfService(places: readonly OutOfService[], machineId: string, pointId: string): boolean {
  return placeOf(places, machineId, pointId) !== null;
}
