import type { StandingAlarm, TroubleFacts } from '../advisory/facts.ts';
import type { BandNow, PointNow } from '../advisory/summary-facts.ts';
import type { StandingLife } from '../store/alarms.ts';
import type { Reader } from '../store/lent-connection.ts';
import { askedSinceMs } from '../store/period-counts.ts';
import { newestEvidence } from './evidence-now.ts';
import { bandFacts, findMachine, limitOf, machineFacts, pointFacts } from './fact-names.ts';
import { limitOfLife } from './limit-of-journal.ts';
import type { SiteView } from './site-view.ts';
import { standingFacts } from './standing-facts.ts';
import { troubleFacts } from './trouble-facts.ts';

/** Everything that stands or waits to be acknowledged, with the newest level of its band. */
export async function standingNow(
  reader: Reader,
  view: SiteView,
  lives: readonly StandingLife[],
  points: readonly PointNow[],
): Promise<(StandingAlarm | TroubleFacts)[]> {
  const told = await askedSinceMs(
    reader,
    lives.map(({ life }) => life.number),
  );
  const byPlace = new Map(points.map((now) => [`${now.machine.id}/${now.point.id}`, now]));
  const facts: (StandingAlarm | TroubleFacts)[] = [];
  for (const one of lives) {
    const { subject } = one.alarm;
    if (subject.kind === 'trouble') {
      facts.push(await troubleFacts(reader, view, one, 'raised'));
      continue;
    }
    const now = byPlace
      .get(`${subject.machineId}/${subject.pointId}`)
      ?.bands.find(({ band }) => band.id === subject.bandId);
    facts.push(await standingAlarm(reader, view, one, told.get(one.life.number) ?? null, now));
  }
  return facts;
}

async function standingAlarm(
  reader: Reader,
  view: SiteView,
  one: StandingLife,
  askedMs: number | null,
  now: BandNow | undefined,
): Promise<StandingAlarm> {
  const { subject, state } = one.alarm;
  if (subject.kind !== 'limit') throw new Error(`${one.alarm.key} is no alarm of a limit`);
  const { machineId, pointId, bandId, limitId } = subject;
  const point = view.point(`${machineId}/${pointId}`);
  const limit = limitOf(point, limitId);
  const severity = state.condition === 'normal' ? state.highest : state.condition;
  return {
    ...(await standingFacts(reader, one, { askedMs, respondWithinMs: limit?.respondWithinMs ?? null })),
    kind: 'alarm',
    severity: severity === 'danger' ? 'danger' : 'alert',
    machine: machineFacts(view, machineId),
    point: pointFacts(view, machineId, pointId),
    band:
      now?.band ??
      bandFacts(
        bandId,
        point?.bands.find(({ id }) => id === bandId),
        undefined,
        findMachine(view, machineId),
      ),
    limit: now?.limits.find(({ id }) => id === limitId) ??
      (await limitOfLife(reader, one.life.number, limitId)) ?? {
        id: limitId,
        side: limit?.side ?? 'upper',
        alert: null,
        danger: null,
      },
    level: now?.level ?? null,
    dangerUnconfirmed: state.pending?.to === 'danger',
    evidence: one.alarm.pointId === null ? [] : await newestEvidence(reader, one.alarm.pointId),
    change: now?.change ?? null,
    action: limit?.action ?? null,
  };
}
