import { resolve } from 'node:path';
import { systemClock } from '../../service/clock.ts';
import { orDamage } from '../../service/damage.ts';
import { createLog, type Logger } from '../../service/log.ts';
import { type OnceReport, runOnce, runUntil, Waker } from '../../service/run.ts';
import { Service } from '../../service/service.ts';
import { readSiteFile, type SiteFile } from '../../service/site-in-force.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail } from '../open.ts';

/** `run`: the service in the foreground; `run --once`: the same way, ended. */
export const addRun: AddCommand = (program, io, done) => {
  program
    .command('run')
    .description('the service, in the foreground, until SIGTERM or SIGINT; SIGHUP re-reads the site file')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--once', 'take what lies in the drop folder, evaluate, send what is due, end')
    .addHelpText('after', '\nExample:\n  humledger run --site /etc/humledger/site.yaml')
    .action(async (options: { site: string; once?: boolean }) => {
      done(await run(resolve(io.workingFolder, options.site), options.once === true, io));
    });
};

async function run(path: string, once: boolean, io: CommandIo): Promise<ExitStatus> {
  const siteFile = readSiteFile(path);
  if ('problems' in siteFile) {
    io.err.write(`${siteFile.problems.join('\n')}\n`);
    return 2;
  }
  const ended = await orDamage(siteFile.site.folders.data, () => runService(siteFile, once, io));
  return typeof ended === 'number' ? ended : fail(io, ended.refused);
}

async function runService(siteFile: SiteFile, once: boolean, io: CommandIo): Promise<ExitStatus> {
  const stop = new AbortController();
  const drop = new Waker();
  let lost: string | null = null;
  const log = createLog(io.out);
  const service = await Service.start({
    siteFile,
    clock: systemClock,
    log,
    hint: () => drop.wake(),
    onLost: (reason) => {
      lost = reason;
      log.fatal({ reason }, 'the service ends itself');
      stop.abort();
    },
  });
  if ('refused' in service) return fail(io, service.refused);
  const forget = listen(service, log, stop, drop);
  try {
    if (once) return report(await runOnce(service, stop.signal), io);
    await runUntil(service, drop, stop.signal);
    return lost === null ? 0 : 1;
  } catch (error) {
    if (lost === null) throw error;
    return 1;
  } finally {
    await service.stop();
    forget();
  }
}

function report(once: OnceReport, io: CommandIo): ExitStatus {
  const { taken, setAside, left, mailsWaiting } = once;
  io.out.write(
    `${taken} recordings taken, ${setAside} files set aside, ${left} left in the drop folder, ${mailsWaiting} mails waiting\n`,
  );
  return mailsWaiting > 0 ? 1 : 0;
}

/** The first SIGTERM or SIGINT stops in order; a second one gives up waiting. SIGHUP re-reads the site file. */
function listen(service: Service, log: Logger, stop: AbortController, drop: Waker): () => void {
  const end = () => {
    if (stop.signal.aborted) process.exit(1);
    stop.abort();
  };
  const reload = () => {
    service.reload().then(
      () => drop.wake(),
      // A ledger that is locked or full for the moment; the service goes on with the site file that it has.
      (error: Error) =>
        log.error({ problem: error.message }, 'the site file could not be put in force; send SIGHUP again'),
    );
  };
  process.on('SIGTERM', end);
  process.on('SIGINT', end);
  process.on('SIGHUP', reload);
  return () => {
    process.off('SIGTERM', end);
    process.off('SIGINT', end);
    process.off('SIGHUP', reload);
  };
}
