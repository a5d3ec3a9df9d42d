import type { Writable } from 'node:stream';
import { plain } from '../../advisory/escape.ts';
import { bareLevel, distanceText, levelText, unitText } from '../../advisory/level-words.ts';
import { printFrequency, printNumber } from '../../config/print-value.ts';
import { type Band, type Limit, type Point, pointPath, type Site } from '../../config/site.ts';
import { type BandTrend, type TrendRow, trendOfBand } from '../../service/trend-of-band.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { bareUnit, levelJson, limitJson } from '../level-json.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { csvLine, table, writeJson } from '../output.ts';
import { findBand, findPoint } from '../site-names.ts';
import { parseWhen, timeText } from '../when.ts';

interface TrendOptions {
  readonly site: string;
  readonly csv?: boolean;
  readonly json?: boolean;
  readonly since?: string;
  readonly until?: string;
}

/** Rows of a table that was not asked to reach back; programs get all there are. */
const usualRows = 200;
/** Some twenty years of hourly recordings: bounds the memory, and what is left out is said. */
const mostRows = 200_000;

/** `trend`: the levels of one band. */
export const addTrend: AddCommand = (program, io, done) => {
  program
    .command('trend')
    .description('the levels of one band over time, with their intervals, flags and limits')
    .argument('<machine/point>', 'measuring point')
    .argument('<band>', 'band of the point')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--since <when>', "date or time (of the site, or with a zone), or a time back such as '7 d'")
    .option('--until <when>', 'the same; not included')
    .option('--csv', 'all rows as CSV, full precision')
    .option('--json', 'all rows as JSON, full precision')
    .addHelpText('after', "\nExample:\n  humledger trend blower-1/de-h overall --since '14 d'")
    .action(async (path: string, band: string, options: TrendOptions) => {
      done(await trend(path, band, options, io));
    });
};

function trend(path: string, bandId: string, options: TrendOptions, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, options.site, async ({ site }) => {
    if (options.csv === true && options.json === true) return misused(io, '--csv or --json, not both');
    const found = findPoint(site, path);
    if ('unknown' in found) return fail(io, found.unknown);
    const band = findBand(found.point, bandId);
    if ('unknown' in band) return fail(io, band.unknown);
    const nowMs = wallMs(io);
    const since = options.since === undefined ? null : parseWhen(options.since, nowMs, site.timeZone);
    if (since?.ok === false) return misused(io, `--since: ${since.what}`);
    const until = options.until === undefined ? null : parseWhen(options.until, nowMs, site.timeZone);
    if (until?.ok === false) return misused(io, `--until: ${until.what}`);
    const forPeople = options.csv !== true && options.json !== true;
    const range = {
      fromMs: since?.value ?? Number.MIN_SAFE_INTEGER,
      toMs: until?.value ?? Number.MAX_SAFE_INTEGER,
      limit: forPeople && since === null ? usualRows : mostRows,
    };
    if (range.fromMs >= range.toMs) return misused(io, '--since does not lie before --until');
    return withLedger(io, site, 'reader', async (ledger) => {
      const answer = await ledger.read((reader) => trendOfBand(reader, found.point, band, range));
      if ('unknown' in answer) return fail(io, answer.unknown);
      const shown: Shown = { site, point: found.point, band, trend: answer };
      if (options.json === true) writeJson(io.out, trendJson(shown));
      else if (options.csv === true) writeCsv(io.out, shown);
      else io.out.write(trendText(shown));
      if (answer.cut && !forPeople)
        io.err.write(`only the newest ${mostRows} rows; --until gives older ones\n`);
      return 0;
    });
  });
}

interface Shown {
  readonly site: Site;
  readonly point: Point;
  readonly band: Band;
  readonly trend: BandTrend;
}

function limitsOf({ point, band }: Shown): readonly Limit[] {
  return point.limits.filter(({ bandId }) => bandId === band.id);
}

function trendJson(shown: Shown): Record<string, unknown> {
  const { point, band, trend } = shown;
  return {
    machine: point.machineId,
    point: point.id,
    band: band.id,
    quantity: band.quantity,
    unit: bareUnit(band.display),
    detector: band.display.detector,
    limits: limitsOf(shown).map(({ id, kind, side, alert, danger }) => ({
      limit: id,
      kind,
      side,
      alert: limitJson(alert, band.display),
      danger: limitJson(danger, band.display),
    })),
    series: trend.series.map(({ id, fromHz, toHz, beganMs, fingerprint }) => ({
      series: id,
      began: new Date(beganMs).toISOString(),
      from_hz: fromHz,
      to_hz: toHz,
      fingerprint,
    })),
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

function writeCsv(out: Writable, { point, band, trend }: Shown): void {
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

function trendText(shown: Shown): string {
  const { site, point, band, trend } = shown;
  const { display } = band;
  const limits = limitsOf(shown).map((limit) => limitLine(limit, band));
  const head = [
    `${pointPath(point)} ${band.id}, ${unitText(display)}; times of ${site.timeZone}`,
    ...(limits.length === 0 ? ['no limit: this band can never alarm'] : limits),
  ];
  const lines = head.map((line) => `${plain(line)}\n`);
  if (trend.rows.length === 0) return `${lines.join('')}no level in this time\n`;
  const confidence = trend.rows.at(-1)?.confidencePercent;
  const columns = [
    { title: 'time' },
    { title: 'level', right: true },
    { title: `interval${confidence == null ? '' : ` (${printNumber(confidence)} %)`}` },
    { title: 'limit' },
    { title: 'remarks', wraps: true },
  ];
  return [
    ...lines,
    ...(trend.cut
      ? [`the newest ${trend.rows.length}; --since shows older ones, --csv and --json all\n`]
      : []),
    '\n',
    table(columns, rowsOf(shown)),
  ].join('');
}

function limitLine(limit: Limit, band: Band): string {
  const parts = (['alert', 'danger'] as const).flatMap((severity) => {
    const value = limit[severity];
    return value === null
      ? []
      : [`${severity} ${limit.side === 'upper' ? 'above' : 'below'} ${levelText(value, band.display)}`];
  });
  return `${parts.join(', ')} (${limit.id})`;
}

function rowsOf(shown: Shown): string[][] {
  const { site, band, trend } = shown;
  const limits = limitsOf(shown);
  return trend.rows.flatMap((row) => {
    const series = row.seriesBreak ? [['', '', '', '', seriesText(row, trend)]] : [];
    const cells = [
      timeText(row.usedMs, site.timeZone),
      `${row.atLeast ? '>= ' : ''}${bareLevel(row.level, band.display)}`,
      `${bareLevel(row.intervalLow, band.display)} to ${bareLevel(row.intervalHigh, band.display)}`,
      passedText(row, limits),
      remarksOf(row),
    ];
    return [...series, cells];
  });
}

function seriesText(row: TrendRow, { series }: BandTrend): string {
  const own = series.find(({ id }) => id === row.seriesId);
  const edges = own === undefined ? '' : `, ${printFrequency(own.fromHz)} to ${printFrequency(own.toHz)}`;
  return `new series from here${edges}: its settings differ, so levels above and below must not be compared`;
}

/** The most severe limit that the level passes, whatever its delays. */
function passedText(row: TrendRow, limits: readonly Limit[]): string {
  for (const severity of ['danger', 'alert'] as const) {
    for (const limit of limits) {
      const value = limit[severity];
      if (value === null) continue;
      if (limit.side === 'upper' ? row.level > value : row.level < value)
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
