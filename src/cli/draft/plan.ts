import { printDuration, printFrequency, printNumber } from '../../config/print-value.ts';
import { type DraftBand, draftBands } from './draft-bands.ts';
import {
  type DraftChannel,
  draftChannels,
  free,
  isOther,
  mostChannels,
  type Written,
} from './draft-points.ts';
import { clockOf, intervalMs } from './guess-times.ts';
import type { SeriesLook } from './look.ts';
import type { NameSeries } from './name-series.ts';
import { type SeriesIds, seriesIds } from './series-ids.ts';
import { type FilesSetting, filesSettings, type NamedSeries } from './series-pattern.ts';

/** What the site file will hold, before it is put into words. */
export interface DraftSite {
  readonly machines: readonly DraftMachine[];
  /** Series that found no room among the points of their machine. */
  readonly noRoom: readonly ReadSeries[];
}

export interface DraftMachine {
  readonly id: string;
  /** The id stands in the names; else it is made up. */
  readonly fromNames: boolean;
  readonly points: readonly DraftPoint[];
  /** Columns that are no vibration, beside others that are: not drafted as points. */
  readonly otherColumns: readonly string[];
}

/** Keys under `recordings`, in the order of the file. */
export const settingKeys = [
  'files',
  'files_regex',
  'start_in_name',
  'clock',
  'sample_rate',
  'duration',
  'expected_every',
  'sidecar',
  'samples_in',
  'full_scale',
] as const;
export type SettingKey = (typeof settingKeys)[number];
export type Settings = ReadonlyMap<SettingKey, Written>;

export interface DraftPoint extends DraftChannel {
  readonly settings: Settings;
  readonly bands: readonly DraftBand[];
  /** What could not be guessed and is left as a hint: whole lines of the site file. */
  readonly missing: readonly string[];
  readonly files: readonly string[];
}

export interface ReadSeries {
  readonly series: NameSeries;
  readonly look: SeriesLook;
  readonly sidecars: 'all' | 'some' | 'none';
}

/** As many points as the site file allows a machine. */
const mostPoints = 500;

interface Named {
  readonly read: ReadSeries;
  readonly ids: SeriesIds;
  readonly machineId: string;
  readonly channels: readonly DraftChannel[];
  readonly otherColumns: readonly string[];
}

/** From series and their headers to machines, points and settings. `others`: files that no point shall take. */
export function planSite(all: readonly ReadSeries[], others: readonly string[], timeZone: string): DraftSite {
  const { named, noRoom } = nameAll(all);
  const unwanted = [...others, ...noRoom.flatMap(({ series }) => series.files.map(({ path }) => path))];
  const files = filesSettings(named.map(idsInNames), unwanted);
  const machines = new Map<string, { fromNames: boolean; points: DraftPoint[]; otherColumns: string[] }>();
  named.forEach(({ read, ids, machineId, channels, otherColumns }, index) => {
    const machine = machines.get(machineId) ?? {
      fromNames: ids.machineId !== '',
      points: [],
      otherColumns: [],
    };
    machines.set(machineId, machine);
    machine.otherColumns.push(...otherColumns);
    const { settings, missing } = settingsOf(read, timeZone);
    const found = files[index] as FilesSetting;
    for (const channel of channels) machine.points.push(pointOf(read, channel, found, settings, missing));
  });
  return { machines: [...machines].map(([id, machine]) => ({ id, ...machine })), noRoom };
}

function nameAll(all: readonly ReadSeries[]): { readonly named: Named[]; readonly noRoom: ReadSeries[] } {
  const taken = new Map<string, Set<string>>();
  const named: Named[] = [];
  const noRoom: ReadSeries[] = [];
  for (const read of all) {
    const ids = seriesIds(read.series);
    const machineId = ids.machineId === '' ? 'machine-1' : ids.machineId;
    const inMachine = taken.get(machineId) ?? new Set<string>();
    taken.set(machineId, inMachine);
    const drafted = draftChannels(read.look, ids.pointId);
    const others = drafted.every(isOther) ? [] : drafted.filter(isOther);
    const channels = drafted.filter((channel) => !others.includes(channel));
    const otherColumns = others.map(({ channel, samplesIn }) => `${channel} [${samplesIn.text}]`);
    if (inMachine.size + channels.length > mostPoints) {
      noRoom.push(read);
      continue;
    }
    const own = channels.map((channel) => ({ ...channel, id: free(channel.id, inMachine) }));
    named.push({ read, ids, machineId, channels: own, otherColumns });
  }
  return { named, noRoom };
}

/** The stretches of the names that are the ids letter by letter. */
function idsInNames({ read, ids, machineId, channels }: Named): NamedSeries {
  const [only] = channels.length === 1 ? channels : [];
  const byName = only !== undefined && ids.point !== null && only.id === ids.point.text;
  return {
    series: read.series,
    machine: ids.machine !== null && ids.machine.text === machineId ? ids.machine : null,
    point: byName ? ids.point : null,
    machineId,
    pointId: byName ? only.id : null,
  };
}

function pointOf(
  { series, look }: ReadSeries,
  channel: DraftChannel,
  files: FilesSetting,
  settings: Settings,
  missing: readonly string[],
): DraftPoint {
  const own = new Map(settings);
  own.set(files.key, { text: files.text, guess: true, note: null });
  own.set('samples_in', channel.samplesIn);
  if (channel.fullScale !== null) own.set('full_scale', channel.fullScale);
  return {
    ...channel,
    settings: own,
    missing,
    bands: draftBands(channel.quantity, usableRate(look.sampleRateHz), usableDuration(look.durationS)),
    files: series.files.map(({ path }) => path),
  };
}

function usableRate(rateHz: number | null): number | null {
  return rateHz !== null && rateHz >= 1 && rateHz <= 1e7 ? rateHz : null;
}

function usableDuration(durationS: number | null): number | null {
  if (durationS === null) return null;
  const rounded = Math.round(durationS * 1000) / 1000;
  return rounded >= 1 && rounded <= 86_400 ? rounded : null;
}

function settingsOf(
  { series, look, sidecars }: ReadSeries,
  timeZone: string,
): { readonly settings: Settings; readonly missing: readonly string[] } {
  const settings = new Map<SettingKey, Written>();
  const missing: string[] = [];
  const { date, files } = series;
  const changed = files.map(({ mtimeMs }) => mtimeMs);
  const dated = date?.agrees === true;
  if (date !== null && dated) {
    settings.set('start_in_name', { text: date.pattern, guess: true, note: null });
    const clock = date.saysUtc ? 'UTC' : clockOf(date.readings, changed, look.durationS, timeZone);
    const note = clock === null ? 'UTC, site (its local time), or +01:00' : null;
    settings.set('clock', { text: clock ?? 'site', guess: true, note });
  } else if (date !== null) {
    missing.push(
      `start_in_name: ${date.pattern}  # please confirm # the files were changed in another order`,
    );
  }
  const rateHz = usableRate(look.sampleRateHz);
  const durationS = usableDuration(look.durationS);
  if (rateHz === null) missing.push('sample_rate: 25.6 kHz  # please confirm # the files do not say it');
  else {
    const text = printFrequency(rateHz, 9);
    const note = look.ratesDiffer ? 'the files differ' : 'as the files say';
    settings.set('sample_rate', { text, guess: look.ratesDiffer, note });
  }
  if (durationS !== null) {
    const note = look.durationsDiffer ? 'the shortest; the files differ' : 'as the files say';
    settings.set('duration', { text: secondsText(durationS), guess: look.durationsDiffer, note });
  }
  settings.set('expected_every', intervalOf(dated && date !== null ? date.readings : changed, durationS));
  if (sidecars === 'all')
    settings.set('sidecar', { text: 'expected', guess: true, note: 'NAME.json beside each file' });
  return { settings, missing };
}

function intervalOf(startsMs: readonly number[], durationS: number | null): Written {
  const found = intervalMs(startsMs);
  const leastMs = Math.ceil(durationS ?? 0) * 1000;
  if (found === null) {
    const ms = Math.max(3_600_000, leastMs);
    return { text: printDuration(ms), guess: true, note: 'one file tells no interval' };
  }
  return { text: printDuration(Math.max(found, leastMs)), guess: true, note: null };
}

function secondsText(seconds: number): string {
  return `${printNumber(seconds, 8)} s`;
}

/** Channels beyond what is drafted, by the first file of their series. */
export function channelsLeftOut(all: readonly ReadSeries[]): readonly string[] {
  return all
    .filter(({ look }) => look.header.channelNames.length > mostChannels)
    .map(
      ({ series, look }) =>
        `${series.files[0]?.path}: ${look.header.channelNames.length - mostChannels} channels`,
    );
}
