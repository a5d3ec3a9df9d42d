import { timesWithin } from '../../config/how-often.ts';
import { inDisplayUnit } from '../../config/print-value.ts';
import type { WantedLimit } from '../../detection/wanted-limit.ts';
import type { RehearsedLimit } from '../../service/rehearse.ts';
import { bareUnit } from '../level-json.ts';
import { budgetOf, type ShownRehearsal } from './rehearsal-text.ts';

/** A rehearsal for programs: every limit with every alarm. Levels in the band's unit. */
export function rehearsalJson(shown: ShownRehearsal): Record<string, unknown> {
  const { site, rehearsal } = shown;
  const { fromMs, toMs } = rehearsal;
  return {
    from: iso(fromMs),
    to: iso(toMs),
    limits: rehearsal.limits.map(limitJson),
    cannot_be_rehearsed: rehearsal.cannot.map(({ point, band, why }) => ({
      machine: point.machineId,
      point: point.id,
      band: band.id,
      why,
    })),
    came_of_other_limits: [...rehearsal.gone].map(([key, alarms]) => ({
      limit: key.replace(/^limit:/, ''),
      alarms: alarms.length,
    })),
    alarm_budget: { a_week: timesWithin(budgetOf(site), 7 * 86_400_000) },
    people: rehearsal.people.map(({ address, told, busiest }) => ({
      address,
      told,
      busiest_week: busiest === null ? null : { from: iso(busiest.fromMs), told: busiest.told },
    })),
    remarks: rehearsal.remarks,
  };
}

function limitJson({ point, band, limit, rehearsal, inTime, came, wanted }: RehearsedLimit) {
  return {
    machine: point.machineId,
    point: point.id,
    band: band.id,
    limit: limit.id,
    alarms: inTime.count,
    dangers: inTime.dangers,
    chattering: inTime.chattering,
    in_alarm_s: inTime.inAlarmMs / 1000,
    longest_s: inTime.longestMs / 1000,
    compared: rehearsal.compared,
    not_known_where_it_stands: rehearsal.unknown,
    would_have_come: rehearsal.alarms.map((alarm) => ({
      ...alarmJson(alarm),
      told: alarm.told.map(({ usedMs, severity }) => ({ time: iso(usedMs), severity })),
    })),
    came: came.map(alarmJson),
    wanted: wanted === null ? null : wantedJson(wanted, band),
  };
}

function alarmJson(alarm: {
  readonly raisedMs: number;
  readonly returnedMs: number | null;
  readonly severity: string;
  readonly chattering: boolean;
}) {
  return {
    raised: iso(alarm.raisedMs),
    returned: alarm.returnedMs === null ? null : iso(alarm.returnedMs),
    severity: alarm.severity,
    chattering: alarm.chattering,
  };
}

function wantedJson({ moves, now, value, count }: WantedLimit, { display }: RehearsedLimit['band']) {
  const isLevel = moves === 'alert' || moves === 'danger';
  const shown = (one: number) => (isLevel ? inDisplayUnit(one, display) : one);
  const unit = isLevel ? { unit: bareUnit(display), detector: display.detector } : {};
  return { moves, ...unit, now: shown(now), value: value === null ? null : shown(value), alarms: count };
}

function iso(ms: number): string {
  return new Date(ms).toISOString();
}
