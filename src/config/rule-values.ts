import type { Build } from './layers.ts';
import { valueOr } from './layers.ts';
import type { Ceiling, LimitRule } from './limit-rules.ts';
import { fixedValues, type KindParts, type LimitCase, levelOf, tellLimit } from './limit-values.ts';
import { zonesName } from './machine-zones.ts';
import { printLevel } from './print-value.ts';
import { type Parsed, parsePhysical, refused, shorten, understood } from './quantity.ts';
import type { WrittenLimit } from './schema-limits.ts';
import type { Written } from './shape.ts';
import type { Limit } from './site.ts';
import { significantPart, zonesOfBand } from './zone-limits.ts';

/** Kinds of limits whose values are reckoned from the levels before: baseline, statistical, change, rate. */

/** '2.5x', or '+8 dB' over the baseline (a factor of 10^(dB/20)); '0.5x' and '-6 dB' for a lower limit. */
export function parseMultiple(text: string): Parsed<number> {
  const decibels = /^([+-]?\d+(?:\.\d+)?)\s*dB$/i.exec(text.trim());
  if (decibels !== null) return understood(10 ** (Number(decibels[1]) / 20));
  const parsed = parsePhysical(text, ['order'], 'x');
  return parsed.ok
    ? understood(parsed.value.value)
    : refused(`'${shorten(text)}' is no multiple such as 2.5x or +8 dB`);
}

/** '50 %' or '1.5x' of growth. */
function parseGrowth(text: string): Parsed<number> {
  const percent = /^\+?(\d+(?:\.\d+)?)\s*%$/.exec(text.trim());
  if (percent !== null) return understood(1 + Number(percent[1]) / 100);
  const times = parseMultiple(text);
  return times.ok ? times : refused(`'${shorten(text)}' is no growth such as 50 % or 1.5x`);
}

type WrittenText = Written<string> | null;

/** Kind baseline: multiples of what is usual. Either value may also be a level. */
export function baselineValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { keys, has } = written.value;
  if (!has.has('alert') && !has.has('danger')) return fixedValues(build, written, limit);
  const alert = multipleOrLevel(build, 'alert', keys.alert, limit, parseMultiple);
  const danger = multipleOrLevel(build, 'danger', keys.danger, limit, parseMultiple);
  if (alert === null || danger === null) return null;
  if (alert.multiple === null && danger.multiple === null) {
    tellLimit(
      build,
      keys.kind ?? keys.alert ?? keys.danger,
      written,
      'a limit of kind baseline has no multiple',
      'write for example: alert: 2.5x, or kind: fixed',
    );
    return null;
  }
  const rule: LimitRule = { by: 'baseline', alert: alert.multiple, danger: danger.multiple };
  if (!multiplesInOrder(build, written, rule)) return null;
  return { alert: alert.level, danger: danger.level, reasons: null, rule };
}

/** Kind statistical: so many spreads above the baseline's median. */
export function statisticalValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { keys, has } = written.value;
  if (has.has('alert')) {
    tellLimit(
      build,
      keys.alert,
      written,
      'the alert of a limit of kind statistical is reckoned',
      'leave alert out; k: 4.5 says how far it stands',
    );
    return null;
  }
  if (has.has('danger') && has.has('danger_k')) {
    tellLimit(
      build,
      keys.danger_k,
      written,
      'the limit has a danger and a danger_k, from which a danger would follow',
      'leave one of the two out',
    );
    return null;
  }
  const danger = levelOf(build, 'danger', keys.danger, limit.band);
  if (has.has('danger') && danger === null) return null;
  const rule: LimitRule = { by: 'spread', alert: valueOr(keys.k, 4.5), danger: valueOr(keys.danger_k, null) };
  if (rule.danger !== null && rule.danger <= rule.alert) {
    tellLimit(
      build,
      keys.danger_k,
      written,
      `danger_k ${rule.danger} is not above k ${rule.alert}`,
      'give a larger one, or danger as a level',
    );
    return null;
  }
  return { alert: null, danger, reasons: null, rule };
}

/** Kind change: away from the baseline's median, up or down, by 25 % of B/C unless the site says by what. */
export function changeValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { keys, has } = written.value;
  if (has.has('danger') || keys.side !== null) {
    const at = keys.danger ?? keys.side;
    tellLimit(
      build,
      at,
      written,
      'a limit of kind change is an alert, up and down alike',
      'leave danger and side out',
    );
    return null;
  }
  if (has.has('alert')) {
    const alert = levelOf(build, 'alert', keys.alert, limit.band);
    return alert === null
      ? null
      : { alert: null, danger: null, reasons: null, rule: { by: 'change', alert } };
  }
  const zones = zonesOfBand(limit.zoneCase, limit.band.band);
  if (!zones.ok) {
    const example = printLevel(limit.band.band.display.inSi, limit.band.band.display);
    tellLimit(
      build,
      keys.kind,
      written,
      `a limit of kind change takes 25 % of B/C, but ${zones.why}`,
      `add: alert: ${example} (the change that counts), or ${zones.right}`,
    );
    return null;
  }
  const alert = significantPart * zones.boundaries.bc;
  return { alert: null, danger: null, reasons: null, rule: { by: 'change', alert } };
}

/** Kind rate: growth of the line through the levels over a time. */
export function rateValues(build: Build, written: WrittenLimit, _limit: LimitCase): KindParts | null {
  const { keys, has } = written.value;
  if (valueOr(keys.side, 'upper') === 'lower') {
    tellLimit(
      build,
      keys.side,
      written,
      'a limit of kind rate is an upper one',
      'leave side out; kind: change tells a fall',
    );
    return null;
  }
  if (!has.has('alert') && !has.has('danger')) {
    tellLimit(build, keys.kind, written, 'the limit has neither alert nor danger', 'add: alert: 50 %');
    return null;
  }
  const alert = growthOf(build, 'alert', keys.alert);
  const danger = growthOf(build, 'danger', keys.danger);
  if (alert === null || danger === null) return null;
  const overMs = valueOr(keys.over, 7 * 86_400_000);
  const rule: LimitRule = { by: 'rate', overMs, alert: alert.value, danger: danger.value };
  if (!multiplesInOrder(build, written, rule)) return null;
  return { alert: null, danger: null, reasons: null, rule };
}

/** What learned values may not pass: the ceilings of the zones' standard, else the site's fixed limit of that band. */
export function ceilingsOf(
  limit: LimitCase,
  fixed: Pick<Limit, 'alert' | 'danger'> | null,
): Limit['ceilings'] {
  const zones = limit.zoneCase.zones === null ? null : zonesOfBand(limit.zoneCase, limit.band.band);
  if (zones?.ok === true) {
    const { alarmAtMost, tripAtMost } = zones.boundaries;
    const name = zonesName(zones.zones);
    return {
      alert: { value: alarmAtMost, why: `the most that ${name} advises (1.25 x B/C)` },
      danger: { value: tripAtMost, why: `the most that ${name} advises (1.25 x C/D)` },
    };
  }
  const own = (value: number | null): Ceiling | null =>
    value === null ? null : { value, why: "the site's fixed limit" };
  return fixed === null ? undefined : { alert: own(fixed.alert), danger: own(fixed.danger) };
}

function multipleOrLevel(
  build: Build,
  name: string,
  written: WrittenText,
  limit: LimitCase,
  parse: (text: string) => Parsed<number>,
): { readonly multiple: number | null; readonly level: number | null } | null {
  if (written === null) return { multiple: null, level: null };
  const multiple = parse(written.value);
  if (multiple.ok) return { multiple: multiple.value, level: null };
  const times = `${written.value.trim()}x`;
  if (Number.isFinite(Number(written.value)) && parse(times).ok) {
    const what = `${name}: '${shorten(written.value)}' has no unit`;
    build.reading.problem(written.at, what, build.reading.write(written.at, times), name);
    return null;
  }
  const level = levelOf(build, name, written, limit.band);
  return level === null ? null : { multiple: null, level };
}

function growthOf(
  build: Build,
  name: string,
  written: WrittenText,
): { readonly value: number | null } | null {
  if (written === null) return { value: null };
  const parsed = parseGrowth(written.value);
  if (parsed.ok && parsed.value > 1) return { value: parsed.value };
  const what = parsed.ok ? `'${shorten(written.value)}' is no growth` : parsed.what;
  build.reading.problem(written.at, `${name}: ${what}`, `write for example: ${name}: 50 %`, name);
  return null;
}

function multiplesInOrder(
  build: Build,
  written: WrittenLimit,
  { alert, danger }: Extract<LimitRule, { readonly by: 'baseline' | 'rate' }>,
): boolean {
  const { keys } = written.value;
  const upper = valueOr(keys.side, 'upper') === 'upper';
  for (const [name, value] of [
    ['alert', alert],
    ['danger', danger],
  ] as const) {
    if (value === null || (upper ? value > 1 : value < 1)) continue;
    const right = upper ? 'an upper limit stands above 1x' : 'a lower limit stands below 1x';
    tellLimit(build, keys[name], written, `${name} of ${value}x would stand at or past what is usual`, right);
    return false;
  }
  if (alert === null || danger === null || (upper ? alert < danger : alert > danger)) return true;
  tellLimit(
    build,
    keys.alert,
    written,
    `alert ${keys.alert?.value} is not before danger ${keys.danger?.value}`,
    'give them different values',
  );
  return false;
}
