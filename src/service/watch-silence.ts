import { pointPath } from '../config/site.ts';
import { subjectKey } from '../detection/alarm.ts';
import { dropFolderSubject, overdue, overdueSubject } from '../detection/overdue.ts';
import { statesUnder, withBrought } from '../detection/suppression.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { arrivalsOf } from '../store/sources.ts';
import { statesOf } from './evaluate.ts';
import type { SiteView } from './site-view.ts';
import { suppressionsDue } from './suppressions-due.ts';

export interface SilenceLook {
  readonly wallMs: number;
  /** Wall time at which this run of the service began. */
  readonly startedMs: number;
  /** Points for which files wait to be settled, read or committed; null: it may be any. */
  readonly waitingFor: ReadonlySet<string> | null;
  readonly dropFolderReadable: boolean;
}

/**
 * Looks for points that should have sent by now, and for a drop folder that cannot be read. Reads first; only a change
 * takes a transaction, and there it is decided anew. Returns how many alarms changed.
 */
export async function watchSilence(ledger: Ledger, view: SiteView, look: SilenceLook): Promise<number> {
  const foreseen = await ledger.read((reader) => changesOf(reader, view, look));
  if (foreseen.length === 0) return 0;
  return ledger.transact(async (writer) => {
    const changes = await changesOf(writer, view, look);
    for (const change of changes) {
      await saveAlarmChange(writer, change, {
        ids: view.ids,
        wallMs: look.wallMs,
        recordingId: null,
        actor: 'service',
        via: 'service',
        fromBacklog: false,
      });
    }
    return changes.length;
  });
}

async function changesOf(reader: Reader, view: SiteView, look: SilenceLook) {
  const arrivals = await arrivalsOf(reader);
  const lastArrivedMs = new Map<string, number>();
  for (const point of view.points) {
    const arrival = arrivals.get(view.ids.pointId(point.machineId, point.id));
    if (arrival !== undefined) lastArrivedMs.set(pointPath(point), arrival.lastArrivedMs);
  }
  const subjects = [dropFolderSubject, ...view.points.map(overdueSubject)];
  const earlier = await statesOf(reader, subjects);
  const under = statesUnder(subjects, earlier, await suppressionsDue(reader, view, []));
  const changes = overdue({
    points: view.points,
    lastArrivedMs,
    nowMs: look.wallMs,
    startedMs: look.startedMs,
    waitingFor: look.waitingFor,
    dropFolderReadable: look.dropFolderReadable,
    earlier: under.states,
  });
  // A look that finds the same standing trouble again only counts it; that is not worth a write every few seconds.
  const news = changes.filter(({ subject, state, journal }) => {
    const before = earlier.get(subjectKey(subject));
    return journal.length > 0 || before === undefined || before.condition !== state.condition;
  });
  return withBrought(under, news).flat();
}
