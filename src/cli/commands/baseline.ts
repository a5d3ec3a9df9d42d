import { type BaselineOrder, orderBaseline } from '../../service/machine-acts.ts';
import { shownBaselines } from '../../service/shown-baselines.ts';
import { baselineJson, baselineText } from '../baseline/baseline-output.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { writeJson } from '../output.ts';
import { ownText, textsProblem } from '../person.ts';
import { findPlace } from '../site-names.ts';
import { parseWhen } from '../when.ts';

interface BaselineOptions {
  readonly site: string;
  readonly json?: boolean;
  readonly learnAgain?: boolean;
  readonly freeze?: boolean;
  readonly confirm?: boolean;
  readonly from?: string;
  readonly by?: string;
  readonly comment?: string;
}

/** `baseline`: what is usual for each band, and orders about it. */
export const addBaseline: AddCommand = (program, io, done) => {
  program
    .command('baseline')
    .description('what is usual for each band; learns it again, freezes it, confirms a refused one')
    .argument('<machine[/point]>', 'machine, or one of its measuring points')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--learn-again', 'begins anew, for example after an overhaul')
    .option('--from <when>', 'with --learn-again: readings from then on (default: now)')
    .option('--freeze', 'keeps it as it is now')
    .option('--confirm', 'lets one stand that was refused (zone C or D, or it rose while it was learned)')
    .option('--by <name>', 'who orders it')
    .option('--comment <text>', 'why')
    .option('--json', 'as JSON, levels in SI units and full precision')
    .addHelpText(
      'after',
      "\nExamples:\n  humledger baseline blower-1\n  humledger baseline blower-1/de-h --learn-again --by 'A. Fitter' --comment 'new foundation'",
    )
    .action(async (path: string, options: BaselineOptions) => {
      done(await baseline(path, options, io));
    });
};

function baseline(path: string, options: BaselineOptions, io: CommandIo): Promise<ExitStatus> {
  const asked = (['learnAgain', 'freeze', 'confirm'] as const).filter((name) => options[name] === true);
  if (asked.length > 1)
    return Promise.resolve(misused(io, 'one of --learn-again, --freeze, --confirm at a time'));
  return withSite(io, options.site, ({ site }) => {
    const place = findPlace(site, path);
    if ('unknown' in place) return Promise.resolve(fail(io, place.unknown));
    if (asked.length === 0) {
      return withLedger(io, site, 'reader', async (ledger) => {
        const shown = await ledger.read((reader) => shownBaselines(reader, place));
        if (options.json === true) writeJson(io.out, shown.map(baselineJson));
        else io.out.write(baselineText(shown, site.timeZone));
        return 0;
      });
    }
    const [by, comment] = [ownText(options.by), ownText(options.comment)];
    if (by === null || comment === null)
      return Promise.resolve(misused(io, 'give --by and --comment: who orders it, and why'));
    const wrong = textsProblem({ by, comment });
    if (wrong !== null) return Promise.resolve(misused(io, wrong));
    const order = orderOf(asked[0], options, io, site.timeZone);
    if ('wrong' in order) return Promise.resolve(misused(io, order.wrong));
    return withLedger(io, site, 'guest', async (ledger) => {
      const person = { by, comment, via: 'command', wallMs: wallMs(io) } as const;
      const answer = await orderBaseline(ledger, place, order, person);
      if ('refused' in answer) return fail(io, answer.refused);
      if (answer.note !== null) io.err.write(`note: ${answer.note}\n`);
      io.out.write(
        `${path}: ${answer.baselines === 1 ? '1 baseline' : `${answer.baselines} baselines`} ${done[order.kind]}\n`,
      );
      return 0;
    });
  });
}

const done: Readonly<Record<BaselineOrder['kind'], string>> = {
  'learn-again': 'learned again',
  freeze: 'frozen',
  confirm: 'confirmed',
};

function orderOf(
  asked: 'learnAgain' | 'freeze' | 'confirm',
  options: BaselineOptions,
  io: CommandIo,
  timeZone: string,
): BaselineOrder | { readonly wrong: string } {
  if (asked !== 'learnAgain') {
    return options.from === undefined ? { kind: asked } : { wrong: '--from goes with --learn-again' };
  }
  const nowMs = wallMs(io);
  const from = options.from === undefined ? null : parseWhen(options.from, nowMs, timeZone);
  if (from?.ok === false) return { wrong: `--from: ${from.what}` };
  return { kind: 'learn-again', fromMs: from?.value ?? nowMs };
}
