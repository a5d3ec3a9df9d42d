import type { BuiltBand } from './build-bands.ts';
import { type Build, valueOr } from './layers.ts';
import { parseLevel } from './level.ts';
import { zonesName } from './machine-zones.ts';
import { printLevel } from './print-value.ts';
import type { WrittenLimit } from './schema-limits.ts';
import type { Written } from './shape.ts';
import type { Limit } from './site.ts';
import { asYaml } from './site-text.ts';
import { type ZoneCase, zonesOfBand } from './zone-limits.ts';

/** What a kind of limit adds to the keys that all kinds share; null where it was refused. */
export type KindParts = Pick<Limit, 'alert' | 'danger' | 'reasons' | 'rule'>;

/** A limit's band, and the point whose zones may speak of it. */
export interface LimitCase {
  readonly band: BuiltBand;
  readonly zoneCase: ZoneCase;
  /** 'blower-1/de-h'. */
  readonly shown: string;
}

/** Limit of kind fixed: the values as they stand. */
export function fixedValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { reading } = build;
  const { keys, has } = written.value;
  const { band } = limit;
  if (!has.has('alert') && !has.has('danger')) {
    const example = printLevel(band.band.display.inSi, band.band.display);
    reading.problem(
      written.at,
      'the limit has neither alert nor danger',
      `add: alert: ${example}`,
      'no value',
    );
    return null;
  }
  const values = writtenValues(build, written, band);
  if (values === null || !inOrder(build, written, values)) return null;
  if (valueOr(keys.side, 'upper') === 'upper') tellCeilings(build, written, values, limit);
  return { ...values, reasons: null };
}

export interface Values {
  readonly alert: number | null;
  readonly danger: number | null;
}

/** SI r.m.s. of alert and danger as written; null where one of them was refused. */
export function writtenValues(
  build: Build,
  { value: { keys, has } }: WrittenLimit,
  band: BuiltBand,
): Values | null {
  const alert = levelOf(build, 'alert', keys.alert, band);
  const danger = levelOf(build, 'danger', keys.danger, band);
  if ((has.has('alert') && alert === null) || (has.has('danger') && danger === null)) return null;
  return { alert, danger };
}

function inOrder({ reading }: Build, { value: { keys } }: WrittenLimit, { alert, danger }: Values): boolean {
  if (alert === null || danger === null || keys.alert === null || keys.danger === null) return true;
  const side = valueOr(keys.side, 'upper');
  if (side === 'upper' ? alert < danger : alert > danger) return true;
  const relation = side === 'upper' ? 'not below' : 'not above';
  const what = `alert ${keys.alert.value} is ${relation} danger ${keys.danger.value}`;
  const swapped = reading.write(keys.alert.at, asYaml(keys.danger.value));
  const right =
    alert === danger ? 'give them different values' : `${swapped} and danger: ${keys.alert.value}`;
  reading.problem(keys.alert.at, what, right, 'alert and danger');
  return false;
}

export function levelOf(
  { reading }: Build,
  name: string,
  written: Written<string> | null,
  { band }: BuiltBand,
): number | null {
  if (written === null) return null;
  const parsed = parseLevel(written.value, band.quantity, band.display.text);
  const example = `write for example: ${name}: ${printLevel(band.display.inSi, band.display)}`;
  if (!parsed.ok) {
    const right = parsed.instead === null ? example : reading.write(written.at, asYaml(parsed.instead));
    reading.problem(written.at, `${name}: ${parsed.what}`, right, name);
    return null;
  }
  if (parsed.value.value > 0) return parsed.value.value;
  reading.problem(written.at, `${name}: '${written.value}' is not above 0`, example, name);
  return null;
}

/** A fixed limit is the site's own affair; that a standard advises a lower one is worth knowing. */
function tellCeilings(
  { reading }: Build,
  { value: { keys } }: WrittenLimit,
  values: Values,
  limit: LimitCase,
): void {
  if (limit.zoneCase.zones === null) return;
  const answer = zonesOfBand(limit.zoneCase, limit.band.band);
  if (!answer.ok) return;
  const { alarmAtMost, tripAtMost } = answer.boundaries;
  const ceilings = [
    ['alert', alarmAtMost, 'B/C'],
    ['danger', tripAtMost, 'C/D'],
  ] as const;
  for (const [severity, most, boundary] of ceilings) {
    const value = values[severity];
    const at = keys[severity]?.at;
    if (value === null || at === undefined || value <= most * (1 + 1e-9)) continue;
    reading.warn(
      at,
      `${severity} ${keys[severity]?.value} of ${limit.shown} stands above ${printLevel(most, limit.band.band.display, 4)}, the most that ${zonesName(answer.zones)} advises (1.25 x ${boundary})`,
      `ceiling of ${severity}, ${limit.zoneCase.machineId}`,
    );
  }
}

/** A problem of one of the limit's values. */
export function tellLimit(
  build: Build,
  at: Written<unknown> | null,
  written: WrittenLimit,
  what: string,
  right: string,
): void {
  build.reading.problem(at?.at ?? written.at, what, right, 'values of the limit');
}
