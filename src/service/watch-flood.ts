import { floodKey, floodRule, floodStep } from '../advisory/flood.ts';
import { alarmsArrived, beginFlood, endFlood, standingFlood } from '../store/floods.ts';
import { appendJournal, appendTelling, tellingIdentity } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { SiteView } from './site-view.ts';

/** Whether a flood of alarms begins or ends now. */
export async function floodTurns(reader: Reader, nowMs: number): Promise<boolean> {
  return (await lookAt(reader, nowMs)).step !== null;
}

/** Its beginning or end, where one is still due: one transaction, in which it is decided anew. */
export async function turnFlood(ledger: Ledger, view: SiteView, nowMs: number): Promise<boolean> {
  return ledger.transact(async (writer) => {
    const { step, flood, count, firstMs } = await lookAt(writer, nowMs);
    if (step === null) return false;
    if (step === 'begins') {
      const fromMs = Math.min(firstMs ?? nowMs, nowMs);
      const id = await beginFlood(writer, { fromMs, begunMs: nowMs });
      await journal(writer, view, { id, nowMs, event: 'flood-begun', alarms: count });
      return true;
    }
    if (flood === null) return false;
    await endFlood(writer, flood.id, Math.max(nowMs, flood.begunMs));
    const sequence = await journal(writer, view, {
      id: flood.id,
      nowMs,
      event: 'flood-ended',
      alarms: count,
    });
    await appendTelling(writer, {
      journalSequence: sequence,
      key: floodKey(flood.id),
      number: null,
      machineId: null,
      severity: 'trouble',
      event: 'flood-ended',
      level: null,
      identity: tellingIdentity([floodKey(flood.id), 'flood-ended', flood.begunMs]),
      wallMs: nowMs,
      fromBacklog: false,
    });
    return true;
  });
}

async function lookAt(reader: Reader, nowMs: number) {
  const flood = await standingFlood(reader);
  const { count, firstMs } = await alarmsArrived(reader, {
    afterMs: nowMs - floodRule.windowMs,
    toMs: nowMs,
  });
  return { flood, count, firstMs, step: floodStep(flood !== null, count) };
}

function journal(
  writer: Parameters<typeof appendJournal>[0],
  view: SiteView,
  about: {
    readonly id: number;
    readonly nowMs: number;
    readonly event: 'flood-begun' | 'flood-ended';
    readonly alarms: number;
  },
): Promise<number> {
  return appendJournal(writer, {
    key: floodKey(about.id),
    number: null,
    event: about.event,
    before: null,
    after: null,
    usedMs: null,
    wallMs: about.nowMs,
    recordingId: null,
    configVersionId: view.ids.configVersionId,
    actor: 'service',
    via: 'service',
    comment: null,
    reason: { alarmsInTenMinutes: about.alarms },
  });
}
