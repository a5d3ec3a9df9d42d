import { resolve } from 'node:path';
import type { Site } from '../config/site.ts';
import { systemClock } from '../service/clock.ts';
import { readSiteFile, type SiteFile } from '../service/site-in-force.ts';
import type { Ledger } from '../store/ledger.ts';
import { isLedgerRefusal, LedgerError } from '../store/ledger-error.ts';
import { openLedger } from '../store/open-ledger.ts';
import type { CommandIo, ExitStatus } from './command.ts';

/** What most commands begin with: the site file, then the ledger beside the service. */

/** Runs with the site file; its problems go to the error output, a line each, and are exit status 2. */
export async function withSite(
  io: CommandIo,
  path: string,
  work: (siteFile: SiteFile) => Promise<ExitStatus>,
): Promise<ExitStatus> {
  const siteFile = readSiteFile(resolve(io.workingFolder, path));
  if ('problems' in siteFile) {
    io.err.write(`${siteFile.problems.join('\n')}\n`);
    return 2;
  }
  return work(siteFile);
}

/**
 * Runs with the ledger open as a reader, or as a guest that writes short transactions beside the service. A ledger
 * that cannot be opened or used is said in one line and is exit status 1.
 */
export async function withLedger(
  io: CommandIo,
  site: Site,
  mode: 'reader' | 'guest',
  work: (ledger: Ledger) => Promise<ExitStatus>,
): Promise<ExitStatus> {
  const ledger = await openLedger({
    folder: site.folders.data,
    mode,
    wallMs: () => wallMs(io),
    monotonicMs: () => systemClock.monotonicMs(),
  });
  if (isLedgerRefusal(ledger)) return fail(io, ledger.reason);
  try {
    return await work(ledger);
  } catch (error) {
    if (error instanceof LedgerError) return fail(io, error.message);
    throw error;
  } finally {
    await ledger.close();
  }
}

/** Something could not be done: one line, exit status 1. */
export function fail(io: CommandIo, reason: string): ExitStatus {
  io.err.write(`${reason}\n`);
  return 1;
}

/** The command line is wrong: one line, exit status 2. */
export function misused(io: CommandIo, reason: string): ExitStatus {
  io.err.write(`${reason}\n`);
  return 2;
}

/** The time of the command, whole milliseconds of the wall clock. */
export function wallMs(io: CommandIo): number {
  return Math.round((io.clock ?? systemClock).wallMs());
}
