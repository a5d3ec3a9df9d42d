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
  // Before the start: a signal that nobody listens to would end the process.
  const signals = listen(log, stop, drop);
  try {
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
    try {
      signals.started(service);
      if (once) return report(await runOnce(service, stop.signal), io);
      await runUntil(service, drop, stop.signal);
      return lost === null ? 0 : 1;
    } catch (error) {
      if (lost === null) throw error;
      return 1;
    } finally {
      await service.stop();
    }
  } finally {
    signals.forget();
  }
}

function report(once: OnceReport, io: CommandIo): ExitStatus {
  const { taken, setAside, left, mailsWaiting } = once;
  io.out.write(
    `${taken} recordings taken, ${setAside} files set aside, ${left} left in the drop folder, ${mailsWaiting} mails waiting\n`,
  );
  return mailsWaiting > 0 ? 1 : 0;
}

interface Signals {
  /** From here on SIGHUP is obeyed at once. */
  started(service: Service): void;
  forget(): void;
}

/**
 * The first SIGTERM or SIGINT stops in order; a second one gives up waiting. SIGHUP re-reads the site file; one that comes
 * during the start does so after it.
 */
function listen(log: Logger, stop: AbortController, drop: Waker): Signals {
  let running: Service | null = null;
  let askedEarly = false;
  const end = () => {
    if (stop.signal.aborted) process.exit(1);
    stop.abort();
  };
  const reload = () => {
    askedEarly ||= running === null;
    running?.reload().then(
      () => drop.wake(),
      // A ledger that is locked or full for the moment; the service goes on with the site file that it has.
      (error: Error) =>
        log.error({ problem: error.message }, 'the site file could not be put in force; send SIGHUP again'),
    );
  };
  const listeners = { SIGTERM: end, SIGINT: end, SIGHUP: reload };
  for (const [signal, listener] of Object.entries(listeners)) process.on(signal, listener);
  return {
    started(service) {
      running = service;
      if (askedEarly) reload();
    },
    forget() {
      for (const [signal, listener] of Object.entries(listeners)) process.off(signal, listener);
    },
  };
}
