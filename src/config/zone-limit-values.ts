import type { Build } from './layers.ts';
import { type KindParts, type LimitCase, levelOf, type Values, writtenValues } from './limit-values.ts';
import { zonesName } from './machine-zones.ts';
import { printLevel } from './print-value.ts';
import type { WrittenLimit } from './schema-limits.ts';
import type { DisplayUnit } from './site.ts';
import { asYaml } from './site-text.ts';
import { alertByZone, dangerByZone, type ZoneValue, zonesOfBand } from './zone-limits.ts';
import type { ZoneBoundaries } from './zone-tables.ts';

/**
 * Limit of kind zone: alert and danger from the boundaries of the machine's zones. The site may give either itself,
 * but not above the ceiling of the standard.
 */
export function zoneValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { reading } = build;
  const { keys, has } = written.value;
  const { band } = limit.band;
  if (keys.side !== null && keys.side.value === 'lower') {
    const what = 'a limit of kind zone is an upper one';
    reading.problem(keys.side.at, what, `${reading.write(keys.side.at, 'upper')}, or kind: fixed`);
    return null;
  }
  const answer = zonesOfBand(limit.zoneCase, band);
  if (!answer.ok) {
    const at = keys.kind?.at ?? written.at;
    const what = `band '${band.id}' of ${limit.shown} has no limit of kind zone: ${answer.why}`;
    reading.problem(at, what, answer.right, `zone ${limit.zoneCase.machineId}`);
    return null;
  }
  const own = writtenValues(build, written, limit.band);
  const baseline = levelOf(build, 'baseline', keys.baseline, limit.band);
  if (own === null || (has.has('baseline') && baseline === null)) return null;
  if (has.has('baseline') && has.has('alert')) {
    reading.problem(
      keys.alert?.at ?? written.at,
      'the limit has an alert and a baseline, from which an alert would follow',
      'leave one of the two out',
    );
    return null;
  }
  const { boundaries, zones } = answer;
  const name = zonesName(zones);
  const alert =
    ownValue(build, written, limit, own, 'alert', boundaries) ??
    alertByZone(name, boundaries, baseline, band.display);
  const danger = ownValue(build, written, limit, own, 'danger', boundaries) ?? dangerByZone(name, boundaries);
  if (!aboveAlert(build, written, band.display, alert, danger)) return null;
  return {
    alert: alert.value,
    danger: danger.value,
    reasons: { alert: alert.why, danger: danger.why },
  };
}

/** The site's own value under the standard's ceiling; null where it gives none. */
function ownValue(
  { reading }: Build,
  { value: { keys } }: WrittenLimit,
  { band: { band } }: LimitCase,
  own: Values,
  severity: 'alert' | 'danger',
  { alarmAtMost, tripAtMost }: ZoneBoundaries,
): ZoneValue | null {
  const value = own[severity];
  const at = keys[severity]?.at;
  if (value === null || at === undefined) return null;
  const [most, boundary] = severity === 'alert' ? [alarmAtMost, 'B/C'] : [tripAtMost, 'C/D'];
  const mostText = printLevel(most, band.display, 4);
  if (value > most * (1 + 1e-9)) {
    const what = `${severity} ${keys[severity]?.value} is above the ceiling ${mostText} (1.25 x ${boundary})`;
    reading.problem(at, what, `${reading.write(at, asYaml(mostText))} at most, or kind: fixed`, severity);
  }
  return { value, why: `the site's own, ceiling ${mostText} (1.25 x ${boundary})` };
}

function aboveAlert(
  { reading }: Build,
  written: WrittenLimit,
  display: DisplayUnit,
  alert: ZoneValue,
  danger: ZoneValue,
): boolean {
  if (alert.value < danger.value) return true;
  const { keys } = written.value;
  const at = keys.danger?.at ?? keys.alert?.at ?? keys.baseline?.at ?? written.at;
  const what = `alert ${printLevel(alert.value, display)} is not below danger ${printLevel(danger.value, display)}`;
  const right = `the alert is ${alert.why}, the danger ${danger.why}: give other values`;
  reading.problem(at, what, right, 'alert and danger');
  return false;
}
