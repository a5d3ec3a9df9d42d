import { readMark, writeMark } from '../store/intake-marks.ts';
import { appendJournal } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { SiteView } from './site-view.ts';

/** How the last run ended, as the ledger remembers it. */
export type LastRun = 'none' | 'clean' | 'unclean';

const runMark = 'run';

/** Notes that a run begins; answers how the one before ended. */
export async function noteStarted(ledger: Ledger, view: SiteView, wallMs: number): Promise<LastRun> {
  const last = await ledger.read((reader) => readMark(reader, runMark));
  await ledger.transact(async (writer) => {
    await writeMark(writer, runMark, 'begun');
    await appendJournal(writer, serviceEntry('started', view, wallMs, { after: last ?? 'first start' }));
  });
  if (last === null) return 'none';
  return last === 'begun' ? 'unclean' : 'clean';
}

export async function noteStopped(ledger: Ledger, view: SiteView, wallMs: number): Promise<void> {
  await ledger.transact(async (writer) => {
    await writeMark(writer, runMark, 'ended');
    await appendJournal(writer, serviceEntry('stopped', view, wallMs, {}));
  });
}

function serviceEntry(
  event: 'started' | 'stopped',
  view: SiteView,
  wallMs: number,
  reason: Record<string, unknown>,
) {
  return {
    event,
    key: null,
    number: null,
    before: null,
    after: null,
    usedMs: null,
    wallMs,
    recordingId: null,
    configVersionId: view.ids.configVersionId,
    actor: 'service',
    via: 'service',
    comment: null,
    reason,
  } as const;
}
