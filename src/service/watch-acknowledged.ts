import { alarmStep } from '../detection/alarm-state.ts';
import { changeOf } from '../detection/trouble.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { acknowledgedLives } from '../store/tellings.ts';
import { limitOf } from './fact-names.ts';
import type { SiteView } from './site-view.ts';
import { readableLife } from './standing-facts.ts';

/**
 * Re-alarm by time (ANSI/ISA-18.2-2016): what somebody acknowledged and still stands when `say_again_after` is over waits for a
 * person again and is told anew. Each is one transaction, in which it is decided anew. Returns how many.
 */
export async function tellStanding(
  ledger: Ledger,
  view: SiteView,
  nowMs: number,
  numbers: readonly number[],
): Promise<number> {
  let again = 0;
  for (const number of numbers) {
    const done = await ledger.transact(async (writer) => {
      if (!(await standingTooLong(writer, view, nowMs)).includes(number)) return false;
      const found = await readableLife(writer, number);
      if (found === null || found.alarm.subject.kind !== 'limit') return false;
      const { subject, state } = found.alarm;
      const limit = limitOf(view.point(`${subject.machineId}/${subject.pointId}`), subject.limitId);
      if (limit === undefined) return false;
      const { acknowledgedBy, acknowledgedWallMs } = found.life;
      const reason = { acknowledgedBy, acknowledgedMs: acknowledgedWallMs, afterMs: limit.sayAgainAfterMs };
      const step = alarmStep(state, { kind: 'say-again', comment: null, reason }, limit);
      const change = changeOf(subject, state, step);
      if (change === null) return false;
      await saveAlarmChange(writer, change, {
        ids: view.ids,
        wallMs: nowMs,
        recordingId: null,
        actor: 'service',
        via: 'service',
        fromBacklog: false,
      });
      return true;
    });
    if (done) again++;
  }
  return again;
}

/** Numbers of the lives whose time is over. */
export async function standingTooLong(reader: Reader, view: SiteView, nowMs: number): Promise<number[]> {
  const due: number[] = [];
  if (!view.points.some(({ limits }) => limits.some(({ sayAgainAfterMs }) => sayAgainAfterMs != null)))
    return due;
  for (const { number, key, acknowledgedMs } of await acknowledgedLives(reader)) {
    if (!key.startsWith('limit:')) continue;
    const found = await readableLife(reader, number);
    if (found?.alarm.number !== number || found.alarm.subject.kind !== 'limit') continue;
    const { subject, state } = found.alarm;
    const afterMs = limitOf(
      view.point(`${subject.machineId}/${subject.pointId}`),
      subject.limitId,
    )?.sayAgainAfterMs;
    if (afterMs == null || nowMs - acknowledgedMs < afterMs) continue;
    if (state.acknowledged && state.condition !== 'normal' && state.suppressions.length === 0)
      due.push(number);
  }
  return due;
}
