import type { Command } from 'commander';
import { parseDuration } from '../../config/quantity.ts';
import type { Site } from '../../config/site.ts';
import { actOnAlarm } from '../../service/acts-log.ts';
import type { AlarmOrder } from '../../service/alarm-command.ts';
import type { CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { ownText, textsProblem } from '../person.ts';
import { timeText } from '../when.ts';
import { whereText } from './standing-output.ts';

/** What people do to one alarm by its number: acknowledge, reset, shelve, unshelve. */
interface ActOptions {
  readonly site: string;
  readonly by: string;
  readonly comment?: string;
  readonly for?: string;
}

const acts: readonly {
  readonly kind: AlarmOrder['kind'];
  readonly description: string;
  readonly comment: 'optional' | 'needed';
  readonly example: string;
}[] = [
  {
    kind: 'acknowledge',
    description: 'somebody has seen it and takes it in hand',
    comment: 'optional',
    example: "acknowledge 12 --by 'A. Fitter' --comment 'bearing ordered'",
  },
  {
    kind: 'reset',
    description: 'lets go of an alarm whose limit latches, once its level has come back',
    comment: 'needed',
    example: "reset 12 --by 'A. Fitter' --comment 'bearing replaced'",
  },
  {
    kind: 'shelve',
    description: 'holds an alarm back for a time, at most shelve_at_most; then it speaks again by itself',
    comment: 'needed',
    example: "shelve 12 --for 8h --by 'A. Fitter' --comment 'tank cleaning beside it until tonight'",
  },
  {
    kind: 'unshelve',
    description: 'lets a shelved alarm speak again before its time',
    comment: 'needed',
    example: "unshelve 12 --by 'A. Fitter' --comment 'cleaning is over'",
  },
];

export function addActs(alarms: Command, io: CommandIo, done: (status: ExitStatus) => void): void {
  for (const { kind, description, comment, example } of acts) {
    const command = alarms
      .command(kind)
      .description(description)
      .argument('<number>', 'number of the alarm or trouble')
      .requiredOption('--by <name>', 'who does it');
    if (kind === 'shelve') command.requiredOption('--for <duration>', "how long: '8h', '3 d'");
    if (comment === 'needed') command.requiredOption('--comment <text>', 'why');
    else command.option('--comment <text>', 'a remark for the journal');
    command
      .option('--site <file>', 'site file')
      .addHelpText('after', `\nExample:\n  humledger alarms ${example}`)
      .action(async (number: string, options: Omit<ActOptions, 'site'>, self: Command) => {
        const { site } = self.optsWithGlobals<{ site: string }>();
        done(await act(kind, number, { ...options, site }, io));
      });
  }
}

function act(
  kind: AlarmOrder['kind'],
  numberText: string,
  options: ActOptions,
  io: CommandIo,
): Promise<ExitStatus> {
  const number = wholeNumber(numberText);
  const by = ownText(options.by) ?? '';
  const comment = ownText(options.comment);
  if (number === null)
    return Promise.resolve(
      misused(io, `'${numberText}' is no number of an alarm; humledger alarms lists them`),
    );
  const wrong = textsProblem({ by, comment });
  if (wrong !== null) return Promise.resolve(misused(io, wrong));
  return withSite(io, options.site, ({ site }) => {
    const order = orderOf(kind, comment, options, site);
    if ('wrong' in order) return Promise.resolve(misused(io, order.wrong));
    return withLedger(io, site, 'guest', async (ledger) => {
      const person = { by, via: 'command', wallMs: wallMs(io) } as const;
      const answer = await actOnAlarm(ledger, number, order, person);
      if ('refused' in answer) return fail(io, answer.refused);
      if (answer.note !== undefined) io.err.write(`note: ${answer.note}\n`);
      const until = answer.untilMs === undefined ? '' : ` until ${timeText(answer.untilMs, site.timeZone)}`;
      io.out.write(
        `number ${number}, ${whereText(answer.subject)}: ${answer.before}, now ${answer.after}${until}\n`,
      );
      return 0;
    });
  });
}

function orderOf(
  kind: AlarmOrder['kind'],
  comment: string | null,
  options: ActOptions,
  { shelveAtMostMs }: Site,
): AlarmOrder | { readonly wrong: string } {
  if (kind !== 'shelve') return { kind, comment };
  const time = parseDuration(options.for ?? '', 'h');
  if (!time.ok) return { wrong: `--for: ${time.what}; write: --for '${time.instead ?? '8 h'}'` };
  if (time.value < 60_000) return { wrong: "--for: shorter than a minute; write: --for '8 h'" };
  return { kind, comment: comment ?? '', forMs: time.value, atMostMs: shelveAtMostMs };
}

/** From 1 on; null for anything else. */
export function wholeNumber(text: string): number | null {
  return /^[1-9]\d{0,14}$/.test(text) ? Number(text) : null;
}
