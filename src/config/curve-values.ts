import { type Build, valueOr } from './layers.ts';
import type { CurveValue } from './limit-rules.ts';
import { type KindParts, type LimitCase, levelOf, tellLimit } from './limit-values.ts';
import type { WrittenLimit } from './schema-limits.ts';

/** Kind curve: levels over the running speed or the load; straight lines lie between the entries. */
export function curveValues(build: Build, written: WrittenLimit, limit: LimitCase): KindParts | null {
  const { keys } = written.value;
  for (const outside of [keys.alert, keys.danger]) {
    if (outside === null) continue;
    tellLimit(
      build,
      outside,
      written,
      'a limit of kind curve has its values in the entries of curve',
      'move it into an entry',
    );
    return null;
  }
  const entries = keys.curve?.value ?? [];
  if (entries.length < 2) {
    tellLimit(
      build,
      keys.curve ?? keys.kind,
      written,
      'a curve needs two values or more',
      'add: curve: with entries of speed or load, alert, danger',
    );
    return null;
  }
  const over = entries[0].value.has.has('speed') ? 'speed' : 'load';
  const upper = valueOr(keys.side, 'upper') === 'upper';
  const values: CurveValue[] = [];
  for (const entry of entries) {
    const value = curveValue(build, entry, over, values.at(-1) ?? null, { band: limit.band, upper });
    if (value === null) return null;
    values.push(value);
  }
  return { alert: null, danger: null, reasons: null, rule: { by: 'curve', over, values } };
}

type WrittenEntry = NonNullable<WrittenLimit['value']['keys']['curve']>['value'][number];

function curveValue(
  build: Build,
  { value: { keys, has }, at }: WrittenEntry,
  over: 'speed' | 'load',
  before: CurveValue | null,
  { band, upper }: { readonly band: LimitCase['band']; readonly upper: boolean },
): CurveValue | null {
  const { reading } = build;
  const other = over === 'speed' ? keys.load : keys.speed;
  if (other !== null) {
    const right = 'leave one of the two out of all entries';
    reading.problem(other.at, 'a curve lies over the speed or over the load', right, 'speed and load');
    return null;
  }
  const x = over === 'speed' ? keys.speed : keys.load;
  if (x === null || (!has.has('alert') && !has.has('danger'))) {
    const example = over === 'speed' ? '1500 rpm' : '60 %';
    const what = `an entry of curve needs ${over} and alert or danger`;
    reading.problem(at, what, `write for example: ${over}: ${example}`, 'entry of curve');
    return null;
  }
  const alert = levelOf(build, 'alert', keys.alert, band);
  const danger = levelOf(build, 'danger', keys.danger, band);
  if ((has.has('alert') && alert === null) || (has.has('danger') && danger === null)) return null;
  if (before !== null && x.value <= before.at) {
    const what = `${over} does not grow from entry to entry of curve`;
    reading.problem(x.at, what, 'put the entries in order', 'order of curve');
    return null;
  }
  if (alert !== null && danger !== null && (upper ? alert >= danger : alert <= danger)) {
    const what = `alert ${keys.alert?.value} is not ${upper ? 'below' : 'above'} danger ${keys.danger?.value}`;
    reading.problem(keys.alert?.at ?? at, what, 'give them different values', 'alert and danger');
    return null;
  }
  return { at: x.value, alert, danger };
}
