import { listStanding } from '../../service/standing-list.ts';
import { readJournal } from '../../store/journal.ts';
import { placesOutOfService } from '../../store/suppressions.ts';
import { addActs, wholeNumber } from '../alarms/act-commands.ts';
import { journalJson, journalText } from '../alarms/journal-output.ts';
import { addServiceCommands } from '../alarms/service-commands.ts';
import { placesText, standingJson, standingText } from '../alarms/standing-output.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { misused, wallMs, withLedger, withSite } from '../open.ts';
import { writeJson } from '../output.ts';
import { parseWhen } from '../when.ts';

interface AlarmsOptions {
  readonly site: string;
  readonly json?: boolean;
  readonly journal?: boolean;
  readonly since?: string;
  readonly before?: string;
  readonly limit?: string;
}

const usualRows = 50;
const mostRows = 10_000;
/** `alarms`: what stands, the journal, and what people do to an alarm. */
export const addAlarms: AddCommand = (program, io, done) => {
  const alarms = program
    .command('alarms')
    .description('alarms and troubles that stand; their journal; acknowledge, reset, shelve, out of service')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--journal', 'what happened, the newest rows')
    .option('--since <when>', "journal rows from then on: a date, a time, or a time back such as '7 d'")
    .option('--before <row>', 'journal rows older than this one: the next page')
    .option('--limit <rows>', `journal rows at most (default: ${usualRows})`)
    .option('--json', 'as JSON, levels in full precision')
    .addHelpText(
      'after',
      "\nExamples:\n  humledger alarms\n  humledger alarms acknowledge 12 --by 'A. Fitter'\n  humledger alarms --journal --since '7 d'",
    )
    .action(async (options: AlarmsOptions) => {
      done(options.journal === true ? await journal(options, io) : await standing(options, io));
    });
  addActs(alarms, io, done);
  addServiceCommands(alarms, io, done);
};

function standing(options: AlarmsOptions, io: CommandIo): Promise<ExitStatus> {
  for (const only of ['since', 'before', 'limit'] as const) {
    if (options[only] !== undefined)
      return Promise.resolve(misused(io, `--${only} is for the journal: give --journal too`));
  }
  return withSite(io, options.site, ({ site }) =>
    withLedger(io, site, 'reader', async (ledger) => {
      const nowMs = wallMs(io);
      const { all, places } = await ledger.read(async (reader) => ({
        all: await listStanding(reader, site, nowMs),
        places: await placesOutOfService(reader),
      }));
      if (options.json === true) writeJson(io.out, all.map(standingJson));
      else io.out.write(standingText(all, site.timeZone, nowMs) + placesText(places, site.timeZone));
      return 0;
    }),
  );
}

function journal(options: AlarmsOptions, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, options.site, async ({ site }) => {
    const limit = options.limit === undefined ? usualRows : wholeNumber(options.limit);
    if (limit === null || limit > mostRows)
      return misused(io, `--limit: a whole number from 1 to ${mostRows} is wanted`);
    const before = options.before === undefined ? null : wholeNumber(options.before);
    if (options.before !== undefined && before === null)
      return misused(io, '--before: the number of a row is wanted');
    const since = options.since === undefined ? null : parseWhen(options.since, wallMs(io), site.timeZone);
    if (since?.ok === false) return misused(io, `--since: ${since.what}`);
    return withLedger(io, site, 'reader', async (ledger) => {
      const newestFirst = await ledger.read((reader) =>
        readJournal(reader, {
          limit: limit + 1,
          ...(before === null ? {} : { beforeSequence: before }),
          ...(since === null ? {} : { fromWallMs: since.value }),
        }),
      );
      const rows = newestFirst.slice(0, limit).reverse();
      if (options.json === true) writeJson(io.out, rows.map(journalJson));
      else io.out.write(journalText(rows, site.timeZone));
      if (newestFirst.length > limit && options.json !== true)
        io.out.write(`older rows: --journal --before ${rows[0]?.sequence}\n`);
      return 0;
    });
  });
}
