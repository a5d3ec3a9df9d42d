import { type Point, pointPath } from '../config/site.ts';
import { type AlarmChange, type AlarmState, subjectKey } from './alarm.ts';
import { type TroubleSubject, troubleStep } from './trouble.ts';

/**
 * Points that should have sent by now. Overdue lives in arrival time, not in the recordings' own: a logger with a
 * wrong clock is not silent. It is judged for standing machines too, because their loggers go on sending.
 */
export interface OverdueLook {
  readonly points: readonly Point[];
  /** Wall time of the newest file of each point that arrived and was taken, by `pointPath`; none: never seen. */
  readonly lastArrivedMs: ReadonlyMap<string, number>;
  readonly nowMs: number;
  /** Wall time at which this run of the service began: what never came is waited for from here. */
  readonly startedMs: number;
  /**
   * Points (`pointPath`) for which files wait to be settled, read or committed; null: it may be any. What waits for one
   * point says nothing of another: in a busy drop folder something always waits.
   */
  readonly waitingFor: ReadonlySet<string> | null;
  readonly dropFolderReadable: boolean;
  /** By `subjectKey`. */
  readonly earlier: ReadonlyMap<string, AlarmState>;
}

export const dropFolderSubject: TroubleSubject = {
  kind: 'trouble',
  trouble: 'drop-folder',
  machineId: null,
  pointId: null,
  source: null,
};

export function overdueSubject(point: Point): TroubleSubject {
  return { kind: 'trouble', trouble: 'overdue', machineId: point.machineId, pointId: point.id, source: null };
}

/**
 * One look at all points, in their order. With an unreadable drop folder there is one trouble of the site and no
 * point is judged: its silence says nothing. A point is overdue when `now - last arrival` is more than `overdueAfter`
 * + `settle`, from one expected interval after the start on. What has arrived returns at any look.
 */
export function overdue(look: OverdueLook): AlarmChange[] {
  const { earlier, nowMs: usedMs, dropFolderReadable } = look;
  const folder = troubleStep(dropFolderSubject, earlier.get(subjectKey(dropFolderSubject)), {
    present: !dropFolderReadable,
    usedMs,
    reason: {},
  });
  const points = dropFolderReadable ? look.points.map((point) => overduePoint(point, look)) : [];
  return [folder, ...points].filter((change) => change !== null);
}

function overduePoint(point: Point, look: OverdueLook): AlarmChange | null {
  const { overdueAfterMs, settleMs, expectedEveryMs } = point.recordings;
  const arrivedMs = look.lastArrivedMs.get(pointPath(point)) ?? null;
  const silentMs = look.nowMs - (arrivedMs ?? look.startedMs);
  const present = silentMs > overdueAfterMs + settleMs;
  const nothingWaits = look.waitingFor?.has(pointPath(point)) === false;
  const canBeJudged = nothingWaits && look.nowMs - look.startedMs >= expectedEveryMs;
  if (present ? !canBeJudged : arrivedMs === null) return null;
  const subject = overdueSubject(point);
  return troubleStep(subject, look.earlier.get(subjectKey(subject)), {
    present,
    usedMs: look.nowMs,
    reason: { lastArrivedMs: arrivedMs, silentMs, overdueAfterMs, expectedEveryMs },
  });
}
