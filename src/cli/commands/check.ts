import { plain } from '../../advisory/escape.ts';
import type { Mail } from '../../advisory/facts.ts';
import type { Site } from '../../config/site.ts';
import { systemClock } from '../../service/clock.ts';
import { sendNow } from '../../service/send-now.ts';
import type { SiteFile } from '../../service/site-in-force.ts';
import { isLedgerRefusal } from '../../store/ledger-error.ts';
import { openLedger } from '../../store/open-ledger.ts';
import { checkJson } from '../check/check-json.ts';
import { checkText } from '../check/check-text.ts';
import { recipientsOf } from '../check/retired.ts';
import { checkSite } from '../check/site-check.ts';
import { mailAsAlarm, plainTestMail } from '../check/test-mail.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withSite } from '../open.ts';
import { listing, writeJson } from '../output.ts';
import { findPoint } from '../site-names.ts';

interface CheckOptions {
  readonly site: string;
  readonly json?: boolean;
  readonly mail?: boolean;
  readonly asAlarm?: string;
}

/** `check`: what a site file means; `--mail`: whether its mail arrives. */
export const addCheck: AddCommand = (program, io, done) => {
  program
    .command('check')
    .description(
      'checks the site file and says what it means: files, levels, limits, averages, what is missing',
    )
    .option('--site <file>', 'site file', './site.yaml')
    .option('--mail', 'sends a test message to all recipients instead')
    .option(
      '--as-alarm <machine/point>',
      'with --mail: an alarm mail made from its newest recording, marked TEST',
    )
    .option('--json', 'as JSON')
    .addHelpText(
      'after',
      '\nExamples:\n  humledger check\n  humledger check --mail\n  humledger check --mail --as-alarm blower-1/de-h',
    )
    .action(async (options: CheckOptions) => {
      done(await check(options, io));
    });
};

async function check(options: CheckOptions, io: CommandIo): Promise<ExitStatus> {
  if (options.asAlarm !== undefined && options.mail !== true)
    return misused(io, '--as-alarm says which mail to send; write: check --mail --as-alarm MACHINE/POINT');
  return withSite(io, options.site, (siteFile) =>
    options.mail === true
      ? tryMail(siteFile.site, options, io)
      : explain(siteFile, options.json === true, io),
  );
}

async function explain(siteFile: SiteFile, json: boolean, io: CommandIo): Promise<ExitStatus> {
  const checked = await checkSite(siteFile, wallMs(io), () => systemClock.monotonicMs());
  if (json) writeJson(io.out, checkJson(checked));
  else io.out.write(checkText(checked));
  return checked.hindrances.length === 0 ? 0 : 1;
}

async function tryMail(site: Site, options: CheckOptions, io: CommandIo): Promise<ExitStatus> {
  const { mail: settings } = site;
  if (settings === null)
    return fail(
      io,
      `${site.file} has no mail: add mail with from, server and to; nobody is told of an alarm without it`,
    );
  const recipients = recipientsOf(site);
  const nowMs = wallMs(io);
  const made = await mailFor(site, options.asAlarm, recipients, nowMs, io);
  if ('status' in made) return made.status;
  const about = options.asAlarm ?? 'test';
  const undrawn = (name: string, reason: string) => io.err.write(`picture ${name} is left out: ${reason}\n`);
  const sent = await sendNow(made.mail, { settings, recipients, about, nowMs, undrawn });
  const accepted = sent.filter(({ answer }) => answer.kind === 'accepted').length;
  if (options.json === true) {
    writeJson(io.out, {
      subject: made.mail.subject,
      server: `${settings.server.host}:${settings.server.port}`,
      recipients: sent.map(({ recipient, answer }) => ({
        recipient,
        accepted: answer.kind === 'accepted',
        answer: answer.answer,
      })),
    });
  } else {
    io.out.write(
      `${plain(made.mail.subject)}\nby ${settings.server.host}:${settings.server.port}, from ${plain(settings.from)}\n\n`,
    );
    io.out.write(
      listing(sent.map(({ recipient, answer }) => [recipient, `${words[answer.kind]}: ${answer.answer}`])),
    );
    const rest =
      accepted === sent.length
        ? 'Look into the mailboxes: accepted is not yet arrived.'
        : 'Mend what the server says, then try again.';
    io.out.write(`\n${accepted} of ${sent.length} accepted. ${rest}\n`);
  }
  return accepted === sent.length && sent.length > 0 ? 0 : 1;
}

const words = { accepted: 'accepted', later: 'not now', never: 'refused' } as const;

async function mailFor(
  site: Site,
  asAlarm: string | undefined,
  recipients: readonly string[],
  nowMs: number,
  io: CommandIo,
): Promise<{ readonly mail: Mail } | { readonly status: ExitStatus }> {
  if (recipients.length === 0)
    return { status: fail(io, 'the site file names no recipients: add addresses under mail, to') };
  if (asAlarm === undefined) {
    if (site.mail === null) throw new Error('no mail settings, which were looked at before');
    return { mail: plainTestMail(site, site.mail, recipients, nowMs) };
  }
  const at = findPoint(site, asAlarm);
  if ('unknown' in at) return { status: misused(io, at.unknown) };
  const ledger = await openLedger({
    folder: site.folders.data,
    mode: 'reader',
    wallMs: () => nowMs,
    monotonicMs: () => systemClock.monotonicMs(),
  });
  const readable = isLedgerRefusal(ledger) ? null : ledger;
  if (isLedgerRefusal(ledger) && ledger.refused !== 'missing') return { status: fail(io, ledger.reason) };
  try {
    const made = await mailAsAlarm(site, at, readable, nowMs);
    return 'refused' in made ? { status: fail(io, made.refused) } : made;
  } finally {
    await readable?.close();
  }
}
