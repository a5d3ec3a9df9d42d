import type { Command } from 'commander';
import { plain } from '../../advisory/escape.ts';
import { actOnAlarm } from '../../service/acts-log.ts';
import { listStanding } from '../../service/standing-list.ts';
import { readJournal } from '../../store/journal.ts';
import { journalJson, journalText } from '../alarms/journal-output.ts';
import { standingJson, standingText, whereText } from '../alarms/standing-output.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { writeJson } from '../output.ts';
import { textsProblem } from '../person.ts';
import { parseWhen } from '../when.ts';

interface AlarmsOptions {
  readonly site: string;
  readonly json?: boolean;
  readonly journal?: boolean;
  readonly since?: string;
  readonly before?: string;
  readonly limit?: string;
}

interface PersonOptions {
  readonly by: string;
  readonly comment?: string;
}

const usualRows = 50;
const mostRows = 10_000;
/** `alarms`: what stands, the journal, and what people do to an alarm. */
export const addAlarms: AddCommand = (program, io, done) => {
  const alarms = program
    .command('alarms')
    .description('alarms and troubles that stand; their journal; acknowledge and reset')
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
  const person = (command: Command, comment: 'optional' | 'needed') => {
    command
      .argument('<number>', 'number of the alarm or trouble')
      .requiredOption('--by <name>', 'who does it');
    if (comment === 'needed') command.requiredOption('--comment <text>', 'why');
    else command.option('--comment <text>', 'a remark for the journal');
    return command;
  };
  for (const [kind, description, comment] of [
    ['acknowledge', 'somebody has seen it and takes it in hand', 'optional'],
    ['reset', 'lets go of an alarm whose limit latches, once its level has come back', 'needed'],
  ] as const) {
    person(alarms.command(kind), comment)
      .description(description)
      .option('--site <file>', 'site file')
      .addHelpText(
        'after',
        `\nExample:\n  humledger alarms ${kind} 12 --by 'A. Fitter' --comment 'bearing ordered'`,
      )
      .action(
        async (number: string, options: PersonOptions & { readonly site?: string }, command: Command) => {
          const { site } = command.optsWithGlobals<{ site: string }>();
          done(await act(kind, number, { ...options, site }, io));
        },
      );
  }
};

function standing(options: AlarmsOptions, io: CommandIo): Promise<ExitStatus> {
  for (const only of ['since', 'before', 'limit'] as const) {
    if (options[only] !== undefined)
      return Promise.resolve(misused(io, `--${only} is for the journal: give --journal too`));
  }
  return withSite(io, options.site, ({ site }) =>
    withLedger(io, site, 'reader', async (ledger) => {
      const all = await ledger.read((reader) => listStanding(reader, site));
      if (options.json === true) writeJson(io.out, all.map(standingJson));
      else io.out.write(standingText(all, site.timeZone));
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

function act(
  kind: 'acknowledge' | 'reset',
  numberText: string,
  options: PersonOptions & { readonly site: string },
  io: CommandIo,
): Promise<ExitStatus> {
  const number = wholeNumber(numberText);
  const by = plain(options.by).trim();
  const comment = options.comment === undefined ? null : plain(options.comment).trim();
  const wrong =
    number === null
      ? `'${numberText}' is no number of an alarm; humledger alarms lists them`
      : textsProblem({ by, comment });
  if (number === null || wrong !== null) return Promise.resolve(misused(io, wrong ?? ''));
  return withSite(io, options.site, ({ site }) =>
    withLedger(io, site, 'guest', async (ledger) => {
      const person = { by, via: 'command', wallMs: wallMs(io) } as const;
      const answer = await actOnAlarm(ledger, number, { kind, comment }, person);
      if ('refused' in answer) return fail(io, answer.refused);
      if (answer.note !== undefined) io.err.write(`note: ${answer.note}\n`);
      io.out.write(`number ${number}, ${whereText(answer.subject)}: ${answer.before}, now ${answer.after}\n`);
      return 0;
    }),
  );
}

/** From 1 on; null for anything else. */
function wholeNumber(text: string): number | null {
  return /^[1-9]\d{0,14}$/.test(text) ? Number(text) : null;
}
