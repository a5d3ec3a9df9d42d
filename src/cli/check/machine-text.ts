import { plain } from '../../advisory/escape.ts';
import type { LimitFacts } from '../../advisory/facts.ts';
import { bareLevel, counted, percentText } from '../../advisory/level-words.ts';
import { reasonsText } from '../../advisory/limit-words.ts';
import { gather, shareOfAlert } from '../../advisory/ranking.ts';
import { levelEveryMs, poolSizeOf } from '../../config/meaning.ts';
import {
  inDisplayUnit,
  printDuration,
  printFrequency,
  printNumber,
  printSeconds,
  printSpeed,
} from '../../config/print-value.ts';
import type { Band, Machine, Point } from '../../config/site.ts';
import { limitFactsNow } from '../../service/limits-in-force.ts';
import { lineWidth, listing, type Row, table, wrapText } from '../output.ts';
import { timeText } from '../when.ts';
import { envelopeCheckText } from './envelope-check.ts';
import { partChecks, partTexts } from './part-check.ts';
import { type BandCheck, canAlarm, type LevelNow, type PointCheck } from './point-check.ts';
import { showsText } from './recording-advice.ts';
import { machineZoneText, pointZoneTexts, tableText, zoneCheck } from './zone-check.ts';

/**
 * A machine's points with their levels, shares of the limits, files, and what is doubtful. `averagingElsewhere`: it is
 * said once for the whole site.
 */
export function machineText(
  machine: Machine,
  points: readonly PointCheck[],
  how: { readonly timeZone: string; readonly averagingElsewhere: boolean },
): string {
  const { id, name, area, runningSpeedHz, criticality } = machine;
  const facts = [
    ...(name === id ? [] : [name]),
    ...(area === null ? [] : [area]),
    ...(runningSpeedHz === null ? [] : [printSpeed(runningSpeedHz)]),
    `criticality ${criticality}`,
  ];
  return [
    `${wrapText(plain(`${id}: ${facts.join(', ')}`), lineWidth).join('\n')}\n`,
    indented(levelTable(points)),
    indented(filesTable(points, how.timeZone)),
    notes(machine, points, how.averagingElsewhere),
  ].join('');
}

/** A longer id stands in a line of its own, so that the numbers keep their room. */
const longestIdInRow = 14;

function withId(id: string, rows: readonly (readonly string[])[]): Row[] {
  const [first = [], ...more] = rows.map((cells) => ['', ...cells]);
  if (id.length > longestIdInRow) return [{ beneath: id }, first, ...more];
  return [[id, ...first.slice(1)], ...more];
}

function levelTable(points: readonly PointCheck[]): string {
  const rows = points.flatMap(({ point, bands }) =>
    withId(point.id, bands.length === 0 ? [['no bands']] : bands.flatMap(bandRows)),
  );
  const confidence = points.flatMap(({ bands }) => bands).find(({ now }) => now !== null)
    ?.now?.confidencePercent;
  const interval = confidence === undefined ? 'interval' : `${printNumber(confidence)} % interval`;
  const titles = ['point', 'band', 'level now', interval, 'alert', 'danger'];
  return table(
    titles.map((title) => ({ title })),
    rows,
    lineWidth - 2,
    0,
  );
}

/** One row a limit; the level stands in the first. */
function bandRows({ band, now, limits, judged }: BandCheck): string[][] {
  const level =
    now === null ? 'none yet' : `${now.atLeast ? 'at least ' : ''}${levelWithUnit(now.level, band)}`;
  const interval =
    now === null
      ? ''
      : `${bareLevel(now.intervalLow, band.display)} to ${bareLevel(now.intervalHigh, band.display)}`;
  if (limits.length === 0) return [[band.id, level, interval, 'no limit', '']];
  return limits.map((inForce, n) => {
    const against = judged ? now : null;
    const limit = limitFactsNow(inForce);
    const cells = [
      limitCell(limit, limit.alert, band, against),
      limitCell(limit, limit.danger, band, against),
    ];
    return n === 0 ? [band.id, level, interval, ...cells] : ['', '', '', ...cells];
  });
}

function levelWithUnit(level: number, band: Band): string {
  return `${bareLevel(level, band.display)} ${band.display.text}`.trimEnd();
}

/** '55 % of 2.8'; beyond it '116 % of 2.8 !'. */
function limitCell(limit: LimitFacts, at: number | null, band: Band, now: LevelNow | null): string {
  if (at === null) return limit.unknown === undefined ? '-' : 'not yet';
  const value = `${limit.side === 'lower' ? 'least ' : ''}${printNumber(inDisplayUnit(at, band.display), 4)}`;
  if (now === null) return value;
  const share = shareOfAlert(now.level, { ...limit, alert: at, danger: null });
  if (share === null) return value;
  return `${percentText(share)} of ${value}${share > 1 ? ' !' : ''}`;
}

function filesTable(points: readonly PointCheck[], timeZone: string): string {
  const rows = points.flatMap(({ point, waiting, ledger, from, usedMs }) =>
    withId(point.id, [
      [
        String(waiting?.files ?? 0),
        String(ledger?.archived.count ?? 0),
        String(ledger?.recordings ?? 0),
        usedMs === null ? 'none' : `${timeText(usedMs, timeZone)}${from === 'file' ? ', analysed now' : ''}`,
      ],
    ]),
  );
  return `\n${table(
    [
      { title: 'point' },
      { title: 'in drop', right: true },
      { title: 'in archive', right: true },
      { title: 'in ledger', right: true },
      { title: 'levels are of' },
    ],
    rows,
    lineWidth - 2,
    0,
  )}`;
}

/** Averaging once for points that share it, then what is doubtful or missing, point by point. */
function notes(machine: Machine, points: readonly PointCheck[], averagingElsewhere: boolean): string {
  const averaging = [...byText('averaging', points, averagingText), ...byText('shows', points, showsOf)];
  const remarks = points.flatMap((one): Remark[] => {
    const { id } = one.point;
    return [
      ...(one.remark === null ? [] : [{ id, title: 'levels', text: one.remark }]),
      ...one.quality.map(({ flag, detail }) => ({ id, title: 'quality', text: `${flag}: ${detail}` })),
      ...zoneRemarks(machine, one),
      ...(canAlarm(one) ? [] : [{ id, title: 'limits', text: 'no limit: this point can never alarm' }]),
    ];
  });
  const told = gather(remarks, ({ title, text }) => `${title} ${text}`).map((same): [string, string] => {
    const [{ title, text }] = same as [Remark];
    return [title, `${same.map(({ id }) => id).join(', ')}: ${text}`];
  });
  const entries = [
    ...(averagingElsewhere ? [] : averaging),
    ...byText('envelope', points, envelopeCheckText),
    ...machineZones(machine, points),
    ...partEntries(machine),
    ...told,
  ];
  return entries.length === 0 ? '' : `\n${listing(entries, '  ')}`;
}

function partEntries(machine: Machine): [string, string][] {
  return partChecks(machine).flatMap((part) =>
    partTexts(part).map((text): [string, string] => ['part', plain(text)]),
  );
}

function byText(
  title: string,
  points: readonly PointCheck[],
  textOf: (one: PointCheck) => string,
): [string, string][] {
  const same = new Map<string, string[]>();
  for (const one of points) same.set(textOf(one), [...(same.get(textOf(one)) ?? []), one.point.id]);
  return [...same]
    .filter(([text]) => text !== '')
    .map(([text, ids]) => [title, same.size === 1 ? text : `${ids.join(', ')}: ${text}`]);
}

/** Empty where nothing is known of the recordings. */
export function showsOf({ advice }: PointCheck): string {
  return advice === null ? '' : showsText(advice);
}

/** The table in force, and the zone in which the machine is. */
function machineZones(machine: Machine, points: readonly PointCheck[]): [string, string][] {
  const zones = machine.zones ?? null;
  if (zones === null) return [];
  const now = machineZoneText(
    machine,
    points.flatMap((one) => zoneCheck(machine, one) ?? []),
  );
  return [
    ['zones', tableText(machine, zones)],
    ...(now === null ? [] : [['zone now', now] as [string, string]]),
  ];
}

/** Each point's zone, and where its limits come from that are not the site's own numbers, or why they judge nothing yet. */
function zoneRemarks(machine: Machine, one: PointCheck): Remark[] {
  const { id } = one.point;
  const check = zoneCheck(machine, one);
  const texts = check === null ? [] : pointZoneTexts(machine, one.point, check);
  const reasons = one.bands.flatMap(({ band, limits }) =>
    limits.flatMap((inForce) => {
      const said = reasonsText(limitFactsNow(inForce));
      return said === null ? [] : [`${band.id}, ${said}`];
    }),
  );
  return [
    ...texts.map((text) => ({ id, title: 'zone', text })),
    ...reasons.map((text) => ({ id, title: 'limits', text })),
  ];
}

interface Remark {
  readonly id: string;
  readonly title: string;
  readonly text: string;
}

export function averagingText({ averaging, point }: PointCheck): string {
  if (averaging === null) return 'not known: say sample_rate and duration, or let a recording come';
  const { window, overlapPercent, segmentSamples, lineSpacingHz, averages, usedPercent } = averaging;
  return [
    `${window}, overlap ${printNumber(overlapPercent)} %, segment ${segmentSamples} samples (${printSeconds(1 / lineSpacingHz)})`,
    `a line every ${printFrequency(lineSpacingHz)}`,
    `${counted(averages, 'average')}, worth ${printNumber(averaging.effectiveAverages)} independent`,
    `${printNumber(usedPercent)} % of the recording used`,
    ...poolText(point),
  ].join('; ');
}

function poolText(point: Point): string[] {
  const { expectedEveryMs } = point.recordings;
  const size = poolSizeOf(point.analysis, expectedEveryMs);
  if (size === 1) return [];
  const every = printDuration(levelEveryMs(point));
  return [`pooled over ${size} recordings: a level every ${every}, which on-delays count as one recording`];
}

function indented(text: string): string {
  return text.replace(/^(?=.)/gm, '  ');
}
