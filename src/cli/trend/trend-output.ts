import type { Writable } from 'node:stream';
import { plain } from '../../advisory/escape.ts';
import { bareLevel, distanceText, levelText, unitText } from '../../advisory/level-words.ts';
import { reasonsText } from '../../advisory/limit-words.ts';
import { printFrequency, printNumber } from '../../config/print-value.ts';
import { type Band, type Point, pointPath, type Site } from '../../config/site.ts';
import { type LimitInForce, limitFactsNow } from '../../service/limits-in-force.ts';
import type { BandTrend, TrendRow } from '../../service/trend-of-band.ts';
import type { StoredNote } from '../../store/notes.ts';
import { bareUnit, levelJson } from '../level-json.ts';
import { limitFactsJson } from '../limit-json.ts';
import { csvLine, lineWidth, type Row, table } from '../output.ts';
import { timeText } from '../when.ts';
import { trendLineJson, trendLineText } from './trend-line.ts';
import { noteJson, noteText } from './trend-notes.ts';
import { type TrendZones, trendZones } from './trend-zones.ts';

/** A band's trend with what it belongs to. */
export interface ShownTrend {
  readonly site: Site;
  readonly point: Point;
  readonly band: Band;
  readonly trend: BandTrend;
}

export function trendJson(shown: ShownTrend): Record<string, unknown> {
  const { point, band, trend } = shown;
  return {
    machine: point.machineId,
    point: point.id,
    band: band.id,
    quantity: band.quantity,
    unit: bareUnit(band.display),
    detector: band.display.detector,
    limits: trend.limits.map((inForce) => ({
      limit: inForce.limit.id,
      kind: inForce.limit.kind,
      ...limitFactsJson(limitFactsNow(inForce), band.display),
    })),
    series: trend.series.map(({ id, fromHz, toHz, beganMs, fingerprint }) => ({
      series: id,
      began: new Date(beganMs).toISOString(),
      from_hz: fromHz,
      to_hz: toHz,
      fingerprint,
    })),
    trend: trendLineJson(trend.trend, band.display),
    notes: trend.notes.map(noteJson),
    levels: trend.rows.map((row) => {
      const { level, interval_low, interval_high } = levelJson(row, band.display);
      return {
        time: new Date(row.usedMs).toISOString(),
        level,
        interval_low,
        interval_high,
        confidence_percent: row.confidencePercent,
        at_least: row.atLeast,
        in_trend: row.inTrend,
        machine_state: row.machineState,
        speed_rpm: row.speedRpm,
        load_percent: row.loadPercent,
        condition: row.condition === '' ? null : row.condition,
        flags: row.flags,
        series: row.seriesId,
      };
    }),
  };
}

const csvHeading = [
  ...['time', 'machine', 'point', 'band', 'level', 'interval_low', 'interval_high', 'confidence_percent'],
  ...[
    'unit',
    'detector',
    'at_least',
    'in_trend',
    'machine_state',
    'speed_rpm',
    'load_percent',
    'flags',
    'series',
  ],
];

export function writeTrendCsv(out: Writable, { point, band, trend }: ShownTrend): void {
  out.write(csvLine(csvHeading));
  for (const row of trend.rows) {
    const { level, interval_low, interval_high, unit, detector } = levelJson(row, band.display);
    out.write(
      csvLine([
        new Date(row.usedMs).toISOString(),
        point.machineId,
        point.id,
        band.id,
        level,
        interval_low,
        interval_high,
        row.confidencePercent,
        unit,
        detector,
        row.atLeast,
        row.inTrend,
        row.machineState,
        row.speedRpm,
        row.loadPercent,
        row.flags.join(' '),
        row.seriesId,
      ]),
    );
  }
}

export function trendText(shown: ShownTrend): string {
  const { site, point, band, trend } = shown;
  const { display } = band;
  const limits = trend.limits.map((limit) => limitLine(limit, band));
  const zones = trendZones(shown);
  const head = [
    `${pointPath(point)} ${band.id}, ${unitText(display)}; times of ${site.timeZone}`,
    ...(limits.length === 0 ? ['no limit: this band can never alarm'] : limits),
    ...(zones === null ? [] : [zones.headline]),
    ...(trend.trend === null ? [] : trendLineText(trend.trend, display, site.timeZone)),
  ];
  const lines = head.map((line) => `${plain(line)}\n`);
  if (trend.rows.length === 0) return `${lines.join('')}no level in this time\n`;
  const confidence = trend.rows.at(-1)?.confidencePercent;
  const columns = [
    { title: 'time' },
    { title: 'level', right: true },
    { title: `interval${confidence == null ? '' : ` (${printNumber(confidence)} %)`}` },
    { title: 'limit' },
    ...(zones === null ? [] : [{ title: 'zone' }]),
    { title: 'remarks', wraps: true },
  ];
  return [
    ...lines,
    ...(trend.cut
      ? [`the newest ${trend.rows.length}; --since shows older ones, --csv and --json all\n`]
      : []),
    '\n',
    table(columns, rowsOf(shown, zones), lineWidth, 0),
  ].join('');
}

function limitLine(inForce: LimitInForce, band: Band): string {
  const limit = limitFactsNow(inForce);
  const parts = (['alert', 'danger'] as const).flatMap((severity) => {
    const value = limit[severity];
    return value === null
      ? []
      : [`${severity} ${limit.side === 'upper' ? 'above' : 'below'} ${levelText(value, band.display)}`];
  });
  const because = reasonsText(limit);
  if (parts.length === 0 && limit.unknown !== undefined) return `${limit.id}: ${because}`;
  return `${parts.join(', ')} (${limit.id})${because === null ? '' : `: ${because}`}`;
}

function rowsOf(shown: ShownTrend, zones: TrendZones | null): Row[] {
  const { site, band, trend } = shown;
  const notes = [...trend.notes];
  const until = (toMs: number): Row[] => {
    const rows: Row[] = [];
    while (notes[0] !== undefined && notes[0].atMs <= toMs)
      rows.push({ beneath: noteText(notes.shift() as StoredNote, site.timeZone) });
    return rows;
  };
  const rows = trend.rows.flatMap((row) => {
    const series: Row[] = row.seriesBreak ? [{ beneath: seriesText(row, trend) }] : [];
    const cells = [
      timeText(row.usedMs, site.timeZone),
      `${row.atLeast ? '>= ' : ''}${bareLevel(row.level, band.display)}`,
      `${bareLevel(row.intervalLow, band.display)} to ${bareLevel(row.intervalHigh, band.display)}`,
      passedText(row, trend.limitsAt(row)),
      ...(zones === null ? [] : [zones.letterOf(row)]),
      remarksOf(row),
    ];
    return [...until(row.usedMs), ...series, cells];
  });
  return [...rows, ...until(Number.POSITIVE_INFINITY)];
}

function seriesText(row: TrendRow, { series }: BandTrend): string {
  const own = series.find(({ id }) => id === row.seriesId);
  const edges = own === undefined ? '' : `, ${printFrequency(own.fromHz)} to ${printFrequency(own.toHz)}`;
  return `--- new series${edges}: settings differ; do not compare with levels above`;
}

/** The most severe limit that the level passes, whatever its delays. */
function passedText(row: TrendRow, limits: readonly LimitInForce[]): string {
  for (const severity of ['danger', 'alert'] as const) {
    for (const { now } of limits) {
      const value = 'unknown' in now ? null : now[severity];
      if ('unknown' in now || value === null) continue;
      if (now.side === 'upper' ? row.level > value : row.level < value)
        return `${severity}, ${distanceText(row.level, value)}`;
    }
  }
  return '';
}

function remarksOf(row: TrendRow): string {
  const state = row.machineState === 'running' ? [] : [`${row.machineState}, not in the trend`];
  const out = row.machineState === 'running' && !row.inTrend ? ['not in the trend'] : [];
  const flags = row.flags.filter((flag) => flag !== 'not-running' && flag !== 'transient');
  return [...state, ...out, ...flags].join(', ');
}
