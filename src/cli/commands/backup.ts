import { resolve } from 'node:path';
import { printableName } from '../../acquisition/file-name.ts';
import { backupMark } from '../../service/summary-periods.ts';
import { backupLedger, unfinishedBeside } from '../../store/backup.ts';
import { writeMark } from '../../store/intake-marks.ts';
import { ledgerPath } from '../../store/open-ledger.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, wallMs, withLedger, withSite } from '../open.ts';

/** `backup`: a consistent copy of the ledger while the service runs. */
export const addBackup: AddCommand = (program, io, done) => {
  program
    .command('backup')
    .description('a consistent, checked copy of the ledger while the service runs')
    .argument('<file>', 'copy to make; never overwritten')
    .option('--site <file>', 'site file', './site.yaml')
    .addHelpText('after', '\nExample:\n  humledger backup /backup/ledger-$(date +%F).sqlite')
    .action(async (file: string, options: { site: string }) => {
      done(await backup(file, options.site, io));
    });
};

function backup(file: string, sitePath: string, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, sitePath, async ({ site }) => {
    const done = await backupLedger(ledgerPath(site.folders.data), resolve(io.workingFolder, file));
    if ('refused' in done) return fail(io, done.reason);
    io.out.write(`${done.file}: ${done.bytes} bytes, checked\n`);
    for (const name of unfinishedBeside(done.file))
      io.err.write(
        `note: ${printableName(name)} beside it is no backup: one that was broken off, to be deleted, or one still under way\n`,
      );
    // For the summary, which says when the last one was made.
    return withLedger(io, site, 'guest', async (ledger) => {
      await ledger.transact((writer) => writeMark(writer, backupMark, String(wallMs(io))));
      return 0;
    });
  });
}
