import type { Writer } from '../store/lent-connection.ts';
import { dropPool, savePool } from '../store/pooling.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import { insertMeasurement } from '../store/trends.ts';
import type { Evaluated } from './evaluate.ts';
import { learn } from './learn.ts';
import type { SiteView } from './site-view.ts';

/**
 * A pool that ended before this recording, if one did: its levels belong to its newest recording, of which the ledger
 * knew only that it waited.
 */
export async function storeEnded(
  writer: Writer,
  view: SiteView,
  { point, ended }: Evaluated,
  context: ChangeContext,
): Promise<void> {
  if (ended === null) return;
  const { measurement, condition, changes, newest } = ended;
  const usedMs = Math.round(ended.usedMs);
  await insertMeasurement(writer, view.ids, {
    measurement,
    recordingId: newest.recordingId,
    usedMs,
    machineState: 'running',
    condition,
    runningHours: newest.runningHours,
    evaluated: true,
    inTrend: condition !== null,
    atAlarm: changes.some(({ journal }) => journal.length > 0),
  });
  for (const change of changes)
    await saveAlarmChange(writer, change, { ...context, recordingId: newest.recordingId });
  await learn(writer, view, point, usedMs);
}

/** Stores what is open after the recording, if its point pools. */
export async function keepPool(
  writer: Writer,
  view: SiteView,
  { point, pooled, own, runningHours }: Evaluated,
  recordingId: number,
): Promise<void> {
  if (pooled === null) return;
  const pointId = view.ids.pointId(point.machineId, point.id);
  const { open, entered } = pooled.step;
  if (open === null) await dropPool(writer, pointId);
  else if (entered)
    await savePool(writer, pointId, { pool: open, newest: { recordingId, runningHours, measurement: own } });
}
