import { trendOfBand } from '../../service/trend-of-band.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { writeJson } from '../output.ts';
import { findBand, findPoint } from '../site-names.ts';
import { type ShownTrend, trendJson, trendText, writeTrendCsv } from '../trend/trend-output.ts';
import { parseWhen } from '../when.ts';

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
      timeZone: site.timeZone,
      limit: forPeople && since === null ? usualRows : mostRows,
    };
    if (range.fromMs >= range.toMs) return misused(io, '--since does not lie before --until');
    return withLedger(io, site, 'reader', async (ledger) => {
      const answer = await ledger.read((reader) =>
        trendOfBand(reader, found.machine, found.point, band, range),
      );
      if ('unknown' in answer) return fail(io, answer.unknown);
      const shown: ShownTrend = { site, point: found.point, band, trend: answer };
      if (options.json === true) writeJson(io.out, trendJson(shown));
      else if (options.csv === true) writeTrendCsv(io.out, shown);
      else io.out.write(trendText(shown));
      if (answer.cut && !forPeople)
        io.err.write(`only the newest ${mostRows} rows; --until gives older ones\n`);
      return 0;
    });
  });
}
