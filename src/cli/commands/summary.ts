import { renameSync, rmSync, writeFileSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Site } from '../../config/site.ts';
import { readHealth } from '../../service/health.ts';
import { type SummaryNow, summaryNow } from '../../service/morning.ts';
import { readersView } from '../../service/readers-view.ts';
import { sendNow } from '../../service/send-now.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';

interface SummaryOptions {
  readonly site: string;
  readonly out?: string;
  readonly text?: boolean;
  readonly send?: boolean;
}

/** `summary`: what the morning's summary would say now. */
export const addSummary: AddCommand = (program, io, done) => {
  program
    .command('summary')
    .description('the summary as it would be now; without options its text. Nothing counts as told by it')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--out <file>', 'writes it as HTML with every table')
    .option('--text', 'prints its text')
    .option('--send', "sends it to the summary's recipients")
    .addHelpText('after', '\nExample:\n  humledger summary --out /tmp/summary.html')
    .action(async (options: SummaryOptions) => {
      done(await summary(options, io));
    });
};

function summary(options: SummaryOptions, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, options.site, async ({ site }) => {
    const { mail, summary: asked } = site;
    const to = (asked?.to ?? mail?.to ?? []).map(({ address }) => address);
    if (options.send === true && (mail === null || to.length === 0))
      return fail(io, 'the summary cannot be sent: the site file has no mail, or nobody under summary: to:');
    if (options.out === '') return misused(io, '--out: the name of a file is wanted');
    return withLedger(io, site, 'reader', async (ledger) => {
      const nowMs = wallMs(io);
      const view = await ledger.read((reader) => readersView(reader, site));
      if (view === null) {
        return fail(
          io,
          'the ledger does not know all of this site file yet; the service takes it over when it starts or is told to re-read it (SIGHUP)',
        );
      }
      const upSinceMs = readHealth(site.folders.data)?.startedMs ?? nowMs;
      const now = await summaryNow({ ledger, view, nowMs, upSinceMs });
      return tell(now, site, to, options, io);
    });
  });
}

async function tell(
  now: SummaryNow,
  site: Site,
  to: readonly string[],
  options: SummaryOptions,
  io: CommandIo,
): Promise<ExitStatus> {
  let status: ExitStatus = 0;
  if (options.text === true || (options.out === undefined && options.send !== true))
    io.out.write(now.mail.text);
  if (options.out !== undefined) {
    const file = resolve(io.workingFolder, options.out);
    const problem = writeWhole(file, now.html);
    if (problem !== null) status = fail(io, problem);
    else io.out.write(`${file}\n`);
  }
  if (options.send === true && site.mail !== null) {
    const sent = await sendNow(now.mail, {
      settings: site.mail,
      recipients: to,
      about: 'summary',
      nowMs: now.facts.writtenMs,
    });
    for (const { recipient, answer } of sent) {
      const line = `${recipient}: ${answer.kind === 'accepted' ? 'accepted' : 'not accepted'}: ${answer.answer}`;
      if (answer.kind === 'accepted') io.out.write(`${line}\n`);
      else status = fail(io, line);
    }
  }
  return status;
}

/** Whole or not at all; in words what stands in the way. */
function writeWhole(file: string, text: string): string | null {
  const part = `${file}.part`;
  try {
    writeFileSync(part, text);
    renameSync(part, file);
    return null;
  } catch (error) {
    rmSync(part, { force: true });
    return `${file} cannot be written: ${(error as NodeJS.ErrnoException).code ?? (error as Error).message}`;
  }
}
