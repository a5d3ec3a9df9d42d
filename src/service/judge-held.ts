import { type AlarmChange, type AlarmState, subjectKey } from '../detection/alarm.ts';
import { subjectsOf } from '../detection/detect.ts';
import { followSuppressions, statesUnder, withBrought } from '../detection/suppression.ts';
import { loadAlarms } from '../store/alarms.ts';
import type { Writer } from '../store/lent-connection.ts';
import { chatteringAlarms, saidAsChattering } from './chattering.ts';
import { judgePoint, type PointArrival, type PointJudged } from './judge-point.ts';
import { suppressionsDue } from './suppressions-due.ts';

/**
 * Judges a recording of one point with its alarms under the suppressions that hold at this moment: what is held back by
 * now is not told, what is not any more speaks, and a danger is not held back because its alarm chatters.
 */
export async function judgeHeld(
  writer: Writer,
  arrival: Omit<PointArrival, 'earlier'>,
): Promise<PointJudged> {
  const { view, point, late } = arrival;
  const subjects = subjectsOf(point);
  const stored = await loadAlarms(writer, subjects.map(subjectKey));
  const earlier = new Map([...stored].map(([key, { state }]) => [key, state]));
  const chattering = await chatteringAlarms(writer, late ? [] : stored.values(), 1);
  const dueNow = await suppressionsDue(writer, view, [point]);
  const dueOf = (subject: AlarmChange['subject'], state: AlarmState) =>
    dueNow(subject, state, chattering.get(subjectKey(subject)));
  const under = statesUnder(subjects, earlier, dueOf);
  const judged = await judgePoint(writer, { ...arrival, earlier: under.states });
  const [ofEnded, own] = withBrought(under, judged.ended?.changes ?? [], judged.changes).map((changes) =>
    changes.map((change) => saidAsChattering(change, chattering.get(subjectKey(change.subject)))),
  );
  const last = new Map([...ofEnded, ...own].map((change) => [subjectKey(change.subject), change]));
  const freed = [...last.values()].flatMap(({ subject, state }) =>
    state.condition === 'danger' ? followSuppressions(subject, state, dueOf(subject, state)) : [],
  );
  return {
    ...judged,
    ended: judged.ended === null ? null : { ...judged.ended, changes: ofEnded },
    changes: [...own, ...freed],
  };
}
