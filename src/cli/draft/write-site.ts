import { asYaml } from '../../config/site-text.ts';
import type { DraftBand } from './draft-bands.ts';
import type { DraftMachine, DraftPoint, DraftSite, SettingKey, Settings } from './plan.ts';
import { settingKeys } from './plan.ts';
import { layerSettings, type Shared } from './shared-settings.ts';
import { blank, line, type YamlLine, yamlText } from './yaml-lines.ts';
import { zonesHint } from './zones-hint.ts';

/** What the site file says beside machines and recordings. */
export interface DraftFrame {
  readonly siteName: string;
  readonly timeZone: string;
  /** As written: seen from the site file. */
  readonly drop: string;
  readonly data: string;
  readonly files: number;
  /** What was not taken in, a line each. */
  readonly leftOut: readonly string[];
}

/** A draft as the text of a site file: one key a line, every guess marked. */
export function writeSite(site: DraftSite, frame: DraftFrame): string {
  const types = bandTypes(site.machines);
  const layers = layerSettings(site.machines);
  const missing = sharedMissing(site.machines);
  const lines = [
    ...headLines(frame),
    line(0, `site: ${asYaml(frame.siteName)}`, 'its name, for people', true),
    line(0, `time_zone: ${frame.timeZone}`, null, true),
    blank,
    line(0, 'folders:'),
    line(2, `drop: ${asYaml(frame.drop)}`, 'where the logger puts its files'),
    line(2, `data: ${asYaml(frame.data)}`, 'ledger, archive, summaries; made new'),
    line(2, 'after_reading: archive', 'or keep, or delete'),
    blank,
    ...recordingLines(layers.site, missing, 0),
    ...(layers.site.size + missing.length > 0 ? [blank] : []),
    ...typeLines(types),
    line(0, 'machines:'),
    ...site.machines.flatMap((machine, index) => [
      ...(index === 0 ? [] : [blank]),
      ...machineLines(machine, layers.machines[index] as Shared, types, missing),
    ]),
    blank,
    ...mailHint,
  ];
  return yamlText(lines);
}

function headLines({ files, drop, leftOut }: DraftFrame): YamlLine[] {
  const comment = (text: string) => line(0, `# ${text}`.trimEnd());
  return [
    comment(
      `A first draft, made by humledger from ${files} ${files === 1 ? 'file' : 'files'} in ${printable(drop)}.`,
    ),
    comment('Each line marked "please confirm" is a guess: look at it, then take the mark away.'),
    comment('Lines that begin with # are hints. Then run: humledger check'),
    ...(leftOut.length === 0
      ? []
      : [comment(''), comment('Not taken in:'), ...leftOut.map((text) => comment(`  ${printable(text)}`))]),
    blank,
  ];
}

function printable(text: string): string {
  return text.replace(/[\p{Cc}\p{Zl}\p{Zp}\u202a-\u202e\u2066-\u2069]/gu, '?');
}

/** `recordings:` with these settings, or nothing. */
function recordingLines(settings: Settings, missing: readonly string[], indent: number): YamlLine[] {
  if (settings.size === 0 && missing.length === 0) return [];
  // A map with nothing but comments in it would be empty.
  if (settings.size === 0) return missing.map((hint) => line(indent, `# recordings: ${hint}`));
  return [
    line(indent, 'recordings:'),
    ...settingKeys.flatMap((key) => {
      const written = settings.get(key);
      return written === undefined
        ? []
        : [line(indent + 2, `${key}: ${settingText(key, written.text)}`, written.note, written.guess)];
    }),
    ...missing.map((hint) => line(indent + 2, `# ${hint}`)),
  ];
}

function settingText(key: SettingKey, text: string): string {
  if (key === 'files_regex') return `'${text.replaceAll("'", "''")}'`;
  return asYaml(text);
}

/** Hints that all points share stand once. */
function sharedMissing(machines: readonly DraftMachine[]): readonly string[] {
  const points = machines.flatMap((machine) => machine.points);
  const [first] = points;
  return (first?.missing ?? []).filter((hint) => points.every(({ missing }) => missing.includes(hint)));
}

/** Machines whose points all have the same bands take them from a type. */
interface BandType {
  readonly id: string;
  readonly bands: readonly DraftBand[];
}

function bandTypes(machines: readonly DraftMachine[]): ReadonlyMap<string, BandType> {
  const types = new Map<string, BandType>();
  for (const { points } of machines) {
    const key = bandsKey(points);
    const [first] = points;
    if (key === null || first === undefined || first.bands.length === 0 || types.has(key)) continue;
    types.set(key, { id: types.size === 0 ? 'usual' : `usual-${types.size + 1}`, bands: first.bands });
  }
  return types;
}

function bandsKey(points: readonly DraftPoint[]): string | null {
  const keys = new Set(points.map(({ bands }) => JSON.stringify(bands)));
  return keys.size === 1 ? ([...keys][0] ?? null) : null;
}

function typeLines(types: ReadonlyMap<string, BandType>): YamlLine[] {
  if (types.size === 0) return [];
  return [
    line(0, 'machine_types:', 'bands and limits that machines of one kind share'),
    ...[...types.values()].flatMap(({ id, bands }) => [
      line(2, `${id}:`),
      ...bandLines(bands, 4),
      ...limitHint(bands, 4),
      blank,
    ]),
  ];
}

function bandLines(bands: readonly DraftBand[], indent: number): YamlLine[] {
  return [
    line(indent, 'bands:'),
    ...bands.flatMap(({ id, quantity, from, to, unit }) => [
      line(indent + 2, `- id: ${id}`),
      line(indent + 4, `quantity: ${quantity}`),
      line(indent + 4, `from: ${from}`, null, true),
      line(indent + 4, `to: ${to}`, null, true),
      ...(unit === null ? [] : [line(indent + 4, `unit: ${unit}`)]),
    ]),
  ];
}

/** To be uncommented as it stands. */
function limitHint(bands: readonly DraftBand[], indent: number): YamlLine[] {
  const hinted = bands.filter(({ example }) => example !== null);
  if (hinted.length === 0) return [];
  const hint = (text: string, note: string | null = null) => line(indent, `# ${text}`, note);
  return [
    line(indent, '# No limit, no alarm. Put in the values that the maker of the machine or your'),
    line(indent, '# standard gives; these are examples. Then take the "# " away.'),
    hint('limits:'),
    ...hinted.flatMap(({ id, example }) => [
      hint(`  - band: ${id}`),
      hint(`    alert: ${example?.[0]}`),
      hint(`    danger: ${example?.[1]}`),
      hint('    action: What to do first, in your words'),
      hint('    respond_within: 2 d'),
    ]),
  ];
}

function machineLines(
  machine: DraftMachine,
  { common, own }: Shared,
  types: ReadonlyMap<string, BandType>,
  told: readonly string[],
): YamlLine[] {
  const type = types.get(bandsKey(machine.points) ?? '');
  const idNote = machine.fromNames ? null : 'no name of a machine in the file names';
  const left = [...new Set(machine.points.flatMap(({ missing }) => missing))].filter(
    (hint) => !told.includes(hint),
  );
  return [
    line(2, `- id: ${asYaml(machine.id)}`, idNote, true),
    line(4, '# name: As people call it'),
    line(4, '# running_speed: 1480 rpm', 'see its plate; gives orders and finer lines'),
    ...(type === undefined ? [] : [line(4, `type: ${type.id}`)]),
    ...zonesHint(machine),
    ...recordingLines(common, left, 4),
    line(4, 'points:'),
    ...machine.points.flatMap((point, index) => [
      ...pointLines(point, own[index] as Settings),
      ...(type === undefined && point.bands.length > 0 ? bandLines(point.bands, 8) : []),
      // The hint once for equal bands of a machine; the other points get theirs in the same way.
      ...(type === undefined && isFirstWithBands(machine.points, index) ? limitHint(point.bands, 8) : []),
    ]),
    ...[...new Set(machine.otherColumns)].map((column) =>
      line(6, `# Column ${printable(column)} is no vibration: no point was made of it.`),
    ),
  ];
}

function isFirstWithBands(points: readonly DraftPoint[], index: number): boolean {
  const keys = points.map(({ bands }) => JSON.stringify(bands));
  return keys.indexOf(keys[index] ?? '') === index;
}

function pointLines(point: DraftPoint, settings: Settings): YamlLine[] {
  const { quantityWritten, sensitivity, name, direction } = point;
  return [
    line(6, `- id: ${asYaml(point.id)}`, null, true),
    ...(name === null ? [] : [line(8, `name: ${asYaml(name)}`, null, true)]),
    ...(direction === null ? [] : [line(8, `direction: ${direction}`, null, true)]),
    line(8, `channel: ${asYaml(point.channel)}`),
    line(8, `quantity: ${quantityWritten.text}`, quantityWritten.note, quantityWritten.guess),
    ...(sensitivity === null
      ? []
      : [line(8, `sensitivity: ${sensitivity.text}`, sensitivity.note, sensitivity.guess)]),
    ...recordingLines(settings, [], 8),
  ];
}

const mailHint: readonly YamlLine[] = [
  line(0, '# Without mail nobody is told of an alarm. Fill in your own, then take the "# " away.'),
  line(0, '# mail:'),
  line(0, '#   from: Humledger <humledger@plant.example>'),
  line(0, '#   server:'),
  line(0, '#     host: mail.plant.example'),
  line(0, '#     port: 587'),
  line(0, '#     security: starttls', 'or tls; none only without a password'),
  line(0, '#     user: humledger', 'leave both out for a relay without login'),
  line(0, '#     password_file: ./mail-password', 'then: chmod 600 mail-password'),
  line(0, '#   to:'),
  line(0, '#     - address: maintenance@plant.example'),
  line(0, '# summary:', 'every morning, also when nothing is wrong'),
  line(0, "#   at: '06:30'"),
];
