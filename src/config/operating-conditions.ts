import { type Build, tellDoubledIds } from './layers.ts';
import { type Parsed, parseFrequency, parsePercent, refused, shorten, understood } from './quantity.ts';
import { id } from './schema-values.ts';
import { list, scalar, type Written } from './shape.ts';
import { key, map, type ReadMap } from './shape-map.ts';
import type { OperatingCondition } from './site.ts';

/** `conditions:` of a machine: classes of speed and load within which levels are compared. */

interface Range {
  readonly from: number;
  readonly to: number;
}

/** `2800 rpm..3000 rpm`: both ends with their unit, the lower first. */
function parseRange(text: string, parseEnd: (end: string) => Parsed<number>, example: string): Parsed<Range> {
  const ends = text.split('..');
  if (ends.length !== 2) return refused(`'${shorten(text)}' is no range such as ${example}`);
  const [from, to] = ends.map((end) => parseEnd(end.trim()));
  const written = (end: Parsed<number>, n: number) => (end.ok ? ends[n].trim() : end.instead);
  const [lower, upper] = [written(from, 0), written(to, 1)];
  const instead = lower === null || upper === null ? null : `${lower}..${upper}`;
  if (!from.ok) return refused(from.what, instead);
  if (!to.ok) return refused(to.what, instead);
  if (from.value > to.value)
    return refused(`'${shorten(text)}' begins above its end`, `${ends[1].trim()}..${ends[0].trim()}`);
  return from.value < to.value
    ? understood({ from: from.value, to: to.value })
    : refused(`'${shorten(text)}' begins and ends at the same value`);
}

const speedExample = '2800 rpm..3000 rpm';
const loadExample = '60 %..100 %';

export const conditionKeys = {
  id: key(id('full-load'), 'Names the operating condition.', { required: true }),
  speed: key(
    scalar((text) => parseRange(text, (end) => parseFrequency(end, 'rpm'), speedExample), {
      example: speedExample,
    }),
    'Running speed from..to; both ends belong to it.',
    { fallback: 'any' },
  ),
  load: key(
    scalar((text) => parseRange(text, parsePercent, loadExample), { example: loadExample }),
    "Load from..to, as the sidecar's load_percent gives it.",
    { fallback: 'any' },
  ),
};

export const conditions = list(map(conditionKeys), 50);

/** The first condition that fits holds; one that lies wholly within an earlier one never does. */
function tellUnreachable({ reading }: Build, entries: WrittenConditions['value']): void {
  entries.forEach(({ value: { keys }, at }, n) => {
    const before = entries.slice(0, n).find(({ value: { keys: outer } }) => {
      const isWritten = outer.speed !== null || outer.load !== null;
      return isWritten && covers(outer.speed, keys.speed) && covers(outer.load, keys.load);
    });
    if (before === undefined || keys.id === null || keys.id.value === before.value.keys.id?.value) return;
    const what = `condition '${keys.id.value}' never holds: '${before.value.keys.id?.value}' stands before it and fits all that it fits`;
    reading.warn(keys.id.at ?? at, what);
  });
}

function covers(outer: Written<Range> | null, inner: Written<Range> | null): boolean {
  if (outer === null) return true;
  return inner !== null && outer.value.from <= inner.value.from && outer.value.to >= inner.value.to;
}

type WrittenConditions = Written<readonly Written<ReadMap<typeof conditionKeys>>[]>;

export function buildConditions(
  build: Build,
  written: WrittenConditions | null,
): readonly OperatingCondition[] {
  const entries = written?.value ?? [];
  const ids = entries.flatMap(({ value: { keys } }) =>
    keys.id === null ? [] : [{ id: keys.id.value, at: keys.id.at }],
  );
  tellDoubledIds(
    build.reading,
    ids,
    (name, line) => `condition '${name}' stands twice, first in line ${line}`,
  );
  tellUnreachable(build, entries);
  return entries.flatMap(({ value: { keys, has }, at }) => {
    if (keys.id === null) return [];
    if (!has.has('speed') && !has.has('load')) {
      const right = `add: speed: ${speedExample}, or load: ${loadExample}`;
      build.reading.problem(at, `condition '${keys.id.value}' says neither speed nor load`, right);
      return [];
    }
    return [{ id: keys.id.value, speedHz: keys.speed?.value ?? null, loadPercent: keys.load?.value ?? null }];
  });
}
