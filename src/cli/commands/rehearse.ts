import { parseHowOften } from '../../config/how-often.ts';
import { rehearseSite } from '../../service/rehearse.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { writeJson } from '../output.ts';
import { rehearsalJson } from '../rehearse/rehearsal-json.ts';
import { rehearsalText, type ShownRehearsal } from '../rehearse/rehearsal-text.ts';
import { findPlace } from '../site-names.ts';

interface RehearseOptions {
  readonly site: string;
  readonly days: string;
  readonly machine?: string;
  readonly wanted?: string;
  readonly json?: boolean;
}

const dayMs = 86_400_000;
const mostDays = 3660;

/** `rehearse`: a site file over the stored levels. */
export const addRehearse: AddCommand = (program, io, done) => {
  program
    .command('rehearse')
    .description('which alarms a site file would have given on the stored levels, beside those that came')
    .option('--site <file>', 'the site file to try; its data folder has the ledger', './site.yaml')
    .option('--days <days>', 'how far back', '365')
    .option('--machine <machine>', 'one machine only, with each of its alarms')
    .option('--wanted <rate>', "what each limit would need to come no more often, such as '1 a month'")
    .option('--json', 'everything as JSON, full precision')
    .addHelpText(
      'after',
      "\nNothing is changed, and the service may run: copy site.yaml, edit the copy, try it.\n\nExample:\n  humledger rehearse --site ./site-new.yaml --days 90 --wanted '1 a month'",
    )
    .action(async (options: RehearseOptions) => {
      done(await rehearse(options, io));
    });
};

async function rehearse(options: RehearseOptions, io: CommandIo): Promise<ExitStatus> {
  const days = Number(options.days);
  if (!Number.isInteger(days) || days < 1 || days > mostDays)
    return misused(io, `--days ${options.days}: a whole number from 1 to ${mostDays} is wanted`);
  const wanted = options.wanted === undefined ? null : parseHowOften(options.wanted);
  if (wanted?.ok === false) return misused(io, `--wanted: ${wanted.what}`);
  return withSite(io, options.site, ({ site }) => {
    const place = options.machine === undefined ? null : findPlace(site, options.machine);
    if (place !== null && 'unknown' in place) return Promise.resolve(fail(io, place.unknown));
    if (place?.point) return Promise.resolve(misused(io, '--machine takes a machine, not a point'));
    return withLedger(io, site, 'reader', async (ledger) => {
      const toMs = wallMs(io);
      const question = {
        site,
        fromMs: toMs - days * dayMs,
        toMs,
        machineId: place?.machine.id ?? null,
        wanted: wanted?.value ?? null,
      };
      const rehearsal = await rehearseSite(ledger, { ...question, progress: progress(io) });
      if (rehearsal === null) return fail(io, `the ledger has no levels of the last ${days} days`);
      const shown: ShownRehearsal = { ...question, rehearsal };
      if (options.json === true) writeJson(io.out, rehearsalJson(shown));
      else io.out.write(rehearsalText(shown));
      return 0;
    });
  });
}

/** On a terminal a line that counts up; elsewhere nothing, as it is done within a minute. */
function progress(io: CommandIo): (done: number, points: number) => void {
  const terminal = 'isTTY' in io.err && io.err.isTTY === true;
  return (done, points) => {
    if (!terminal) return;
    const text = done === points ? ' '.repeat(40) : `${done} of ${points} points`;
    io.err.write(`\r${text}${done === points ? '\r' : ''}`);
  };
}
