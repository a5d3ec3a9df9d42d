import { chatterAdvice, chatterText, longStandingText } from '../../advisory/history-words.ts';
import { bareLevel, distanceText, levelText } from '../../advisory/level-words.ts';
import { reasonsText } from '../../advisory/limit-words.ts';
import { comparedWith, firstLimit } from '../../advisory/ranking.ts';
import { acknowledgeCommand, shortAdvice, troubleName } from '../../advisory/wording.ts';
import { inDisplayUnit } from '../../config/print-value.ts';
import type { Severity } from '../../config/site.ts';
import type { AlarmSubject } from '../../detection/alarm.ts';
import { type StandingNow, severityNow } from '../../service/standing-list.ts';
import type { SuppressionNow } from '../../service/suppression-now.ts';
import { type OutOfService, placePath } from '../../store/suppressions.ts';
import { bareUnit } from '../level-json.ts';
import { limitFactsJson } from '../limit-json.ts';
import { type Row, table } from '../output.ts';
import { timeText } from '../when.ts';

/** What stands, as JSON and as a table. */
export function standingJson(now: StandingNow): Record<string, unknown> {
  const { alarm, life, limit, band, newest } = now;
  const { subject, state } = alarm;
  const inUnit = (level: number | null | undefined) =>
    level == null || band === null ? null : inDisplayUnit(level, band.display);
  return {
    number: life.number,
    kind: subject.kind === 'limit' ? 'alarm' : 'trouble',
    severity: severityNow(now),
    condition: state.condition,
    standing: now.standing,
    suppressions: state.suppressions,
    suppressed_until: isoOrNull(now.suppression?.untilMs ?? null),
    suppressed_by: now.suppression?.by ?? null,
    suppressed_why: now.suppression?.while ?? now.suppression?.comment ?? null,
    chattering: now.chattering !== null,
    long_standing: now.longStanding,
    machine: subject.machineId,
    point: subject.pointId,
    band: subject.kind === 'limit' ? subject.bandId : null,
    limit: subject.kind === 'limit' ? subject.limitId : null,
    trouble: subject.kind === 'trouble' ? subject.trouble : null,
    source: subject.kind === 'trouble' ? subject.source : null,
    detail: now.detail,
    unit: band === null ? null : bareUnit(band.display),
    detector: band?.display.detector ?? null,
    level: inUnit(newest?.level),
    level_time: newest === null ? null : new Date(newest.usedMs).toISOString(),
    at_least: newest?.atLeast ?? null,
    ...limitFactsJson(limit, band?.display ?? null),
    since: isoOrNull(state.sinceMs ?? life.raisedUsedMs),
    raised: isoOrNull(life.raisedWallMs),
    recordings: state.count,
    acknowledged_by: life.acknowledgedBy,
    acknowledged_at: isoOrNull(life.acknowledgedWallMs),
  };
}

/** Danger first, then alert, then trouble, each by number. */
export function standingText(all: readonly StandingNow[], timeZone: string, nowMs: number): string {
  if (all.length === 0) return 'nothing stands\n';
  const order: readonly Severity[] = ['danger', 'alert', 'trouble'];
  const sorted = [...all].sort(
    (a, b) => order.indexOf(severityNow(a)) - order.indexOf(severityNow(b)) || a.life.number - b.life.number,
  );
  const rows = sorted.flatMap((now): Row[] => [
    [
      String(now.life.number),
      severityNow(now),
      whereText(now.alarm.subject),
      timeText(now.alarm.state.sinceMs ?? now.life.raisedWallMs, timeZone),
      now.standing,
    ],
    ...[...beneath(now, timeZone), ...beside(now, timeZone, nowMs)].map((text) => ({ beneath: text })),
  ]);
  const columns = [
    { title: 'no', right: true },
    { title: 'severity' },
    { title: 'machine/point band', wraps: true },
    { title: 'since' },
    { title: 'standing' },
  ];
  const first = sorted.find(({ standing }) => standing.endsWith('unacknowledged'));
  const hint = first === undefined ? '' : `\n${acknowledgeCommand(first.life.number)}\n`;
  return `${table(columns, rows)}\ntimes of ${timeZone}${hint}`.trimEnd().concat('\n');
}

/** `machine/point band`, a logger's series of names, or the site. */
export function whereText(subject: AlarmSubject): string {
  if (subject.kind === 'limit') return `${subject.machineId}/${subject.pointId} ${subject.bandId}`;
  if (subject.machineId === null) return subject.source ?? 'the site';
  return subject.pointId === null ? subject.machineId : `${subject.machineId}/${subject.pointId}`;
}

function beneath(now: StandingNow, timeZone: string): string[] {
  const { alarm, life } = now;
  const acknowledged =
    life.acknowledgedBy === null
      ? []
      : [`acknowledged by ${life.acknowledgedBy}, ${timeText(life.acknowledgedWallMs ?? 0, timeZone)}`];
  if (alarm.subject.kind === 'trouble') {
    const { trouble } = alarm.subject;
    const name = troubleName[trouble];
    return [now.detail === null ? name : `${name}: ${now.detail}`, shortAdvice(trouble), ...acknowledged];
  }
  // The line of the level says it where the limit has no value at all.
  const isReckoned = now.limit !== null && firstLimit(now.limit) !== null;
  const reasons = now.limit === null || !isReckoned ? null : reasonsText(now.limit);
  return [levelLine(now, timeZone), ...(reasons === null ? [] : [`limit from: ${reasons}`]), ...acknowledged];
}

/** What holds it back, and what is wrong with it as an alarm. */
function beside(
  { alarm, suppression, chattering, longStanding }: StandingNow,
  timeZone: string,
  nowMs: number,
): string[] {
  const said: string[] = [];
  if (suppression !== null) said.push(heldLine(suppression, timeZone));
  if (chattering !== null) said.push(`${chatterText(chattering)}; ${chatterAdvice(chattering)}`);
  if (longStanding) said.push(longStandingText(alarm.state.sinceMs ?? nowMs, nowMs));
  return said;
}

function heldLine({ untilMs, by, comment, while: condition }: SuppressionNow, timeZone: string): string {
  if (condition !== null) return `held back by design: ${condition}`;
  const until = untilMs === null ? '' : ` until ${timeText(untilMs, timeZone)}`;
  return `held back${until}${by === null ? '' : ` by ${by}`}${comment === null ? '' : `: ${comment}`}`;
}

/** Machines and points that are out of service, whatever stands there. */
export function placesText(places: readonly OutOfService[], timeZone: string): string {
  if (places.length === 0) return '';
  const rows = places.map((place): Row => {
    const { untilMs, by, comment } = place;
    return [placePath(place), timeText(untilMs, timeZone), by, comment];
  });
  const columns = [
    { title: 'out of service', wraps: true },
    { title: 'until' },
    { title: 'by', wraps: true },
    { title: 'why', wraps: true },
  ];
  return `\n${table(columns, rows)}`.trimEnd().concat('\n');
}

function levelLine(now: StandingNow, timeZone: string): string {
  const { band, limit, newest, alarm } = now;
  if (band === null || limit === null) return 'its limit is not in the site file any more';
  if (newest === null) return 'no level is kept';
  const level = `${newest.atLeast ? 'at least ' : ''}${levelText(newest.level, band.display)}`;
  const severity = alarm.state.condition === 'danger' ? 'danger' : 'alert';
  const value = limit[severity] ?? firstLimit(limit);
  const against =
    value === null
      ? `, limit not reckoned now: ${limit.unknown ?? 'it has no value'}`
      : `, limit ${bareLevel(value, band.display)} (${distanceText(comparedWith(limit, newest.level), value)})`;
  const count = alarm.state.count;
  return `${level} on ${timeText(newest.usedMs, timeZone)}${against}; ${count} ${count === 1 ? 'recording' : 'recordings'}`;
}

function isoOrNull(ms: number | null): string | null {
  return ms === null ? null : new Date(ms).toISOString();
}
