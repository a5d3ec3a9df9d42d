import type { Reading } from './reading.ts';
import type { Written } from './shape.ts';
import type { Keys, ReadMap } from './shape-map.ts';
import type { Span } from './site-text.ts';
import type { ZoneStandard, ZoneTable } from './zone-tables.ts';

/** What builds a Site from what was read: where to tell problems, how to make a path absolute, the zone tables. */
export interface Build {
  readonly reading: Reading;
  readonly absolute: (path: string) => string;
  readonly zoneTable: (standard: ZoneStandard) => ZoneTable;
}

/** The same group of keys at the site, the machine type, the machine and the point, outermost first. */
export type Layers<K extends Keys> = readonly (ReadMap<K> | null)[];

type ValueOf<K extends Keys, P extends keyof K> = ReadMap<K>['keys'][P];

/** The innermost layer's value of a key; null where none has it. */
export function innermost<K extends Keys, P extends keyof K & string>(
  layers: Layers<K>,
  name: P,
): ValueOf<K, P> | null {
  for (let index = layers.length - 1; index >= 0; index--) {
    const layer = layers[index];
    if (layer?.has.has(name)) return layer.keys[name];
  }
  return null;
}

/** The value itself, or what holds without it. */
export function valueOr<T>(written: Written<T> | null, fallback: T): T {
  return written === null ? fallback : written.value;
}

export function valuesOf<T>(written: Written<readonly Written<T>[]> | null): readonly T[] {
  return written === null ? [] : written.value.map(({ value }) => value);
}

/** Tells every id after its first, with the line of the first; `what` names the kind of thing. */
export function tellDoubledIds(
  reading: Reading,
  ids: readonly { readonly id: string; readonly at: Span }[],
  what: (id: string, line: number) => string,
): void {
  const lines = new Map<string, number>();
  for (const { id, at } of ids) {
    const first = lines.get(id);
    if (first === undefined) lines.set(id, reading.lineOf(at));
    else reading.problem(at, what(id, first), `${reading.write(at, `${id}-2`)}, or another id of its own`);
  }
}
