import type { Written } from './draft-points.ts';
import { type DraftPoint, type SettingKey, type Settings, settingKeys } from './plan.ts';

/** Settings that all points of a group share, and what is left to each. */
export interface Shared {
  readonly common: Settings;
  readonly own: readonly Settings[];
}

/** Keys that stand or fall together: whichever of the two is innermost holds. */
const together: readonly SettingKey[] = ['files', 'files_regex'];

/** Harmless to a point whose files have no dates in their names. */
const mayBeMissing: readonly SettingKey[] = ['start_in_name', 'clock'];

/**
 * What more than half of a group have goes to the group, provided that all have something there (a key cannot be unset
 * further in); what differs stays with its point. `outer`: settings that hold already.
 */
export function shareSettings(settings: readonly Settings[], outer: Settings = new Map()): Shared {
  const common = new Map<SettingKey, Written>();
  const groups = [
    together,
    ...settingKeys.filter((key) => !together.includes(key)).map((key) => [key] as const),
  ];
  for (const keys of groups) {
    const values = settings.map((one) => entryOf(one, keys));
    const missing = values.includes(null) && !keys.some((key) => mayBeMissing.includes(key));
    const most = missing ? null : mostFrequent(values);
    const held = entryOf(outer, keys);
    if (most !== null && (held === null || textOf(held) !== textOf(most))) common.set(most[0], most[1]);
  }
  const all = new Map([...outer, ...common]);
  const own = settings.map((one) => {
    const left = new Map<SettingKey, Written>();
    for (const keys of groups) {
      const entry = entryOf(one, keys);
      const held = entryOf(common, keys) ?? entryOf(all, keys);
      if (entry !== null && (held === null || textOf(held) !== textOf(entry))) left.set(entry[0], entry[1]);
    }
    return left;
  });
  return { common, own };
}

type Entry = readonly [SettingKey, Written];

function entryOf(settings: Settings, keys: readonly SettingKey[]): Entry | null {
  for (const key of keys) {
    const written = settings.get(key);
    if (written !== undefined) return [key, written];
  }
  return null;
}

function textOf([key, { text }]: Entry): string {
  return `${key}: ${text}`;
}

/** What more than half of them are; null where nothing is. */
function mostFrequent(entries: readonly (Entry | null)[]): Entry | null {
  const counts = new Map<string, number>();
  for (const entry of entries) {
    if (entry === null) continue;
    const count = (counts.get(textOf(entry)) ?? 0) + 1;
    if (count > entries.length / 2) return entry;
    counts.set(textOf(entry), count);
  }
  return null;
}

/** Settings of the site, of each machine, of each point, so that no key is written twice without need. */
export function layerSettings(machines: readonly { readonly points: readonly DraftPoint[] }[]): {
  readonly site: Settings;
  readonly machines: readonly Shared[];
} {
  const points = machines.flatMap((machine) => machine.points.map(({ settings }) => settings));
  const site = shareSettings(points).common;
  return {
    site,
    machines: machines.map((machine) =>
      shareSettings(
        machine.points.map(({ settings }) => settings),
        site,
      ),
    ),
  };
}
