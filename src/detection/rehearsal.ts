import type { DisplayUnit, Limit, Severity } from '../config/site.ts';
import { AlarmCourse } from './alarm-course.ts';
import { higher } from './alarm-event.ts';
import type { LearnedChange } from './learned-over-time.ts';
import { judgeAt } from './limits.ts';
import { levelMarks, type PastLevels, type PastRecordings, recordingMarks } from './past-levels.ts';
import { StandingLimit } from './standing-limit.ts';

/**
 * One limit over the levels of its band as the ledger has them: the same comparison, delays, deadband and state machine
 * as in the service, recording by recording. Nobody acknowledges, shelves or takes out of service; an alarm that
 * comes and goes is held back as chattering, as in the service.
 */
export interface RehearsalQuestion {
  readonly limit: Limit;
  /** Of the limit's band. */
  readonly band: { readonly display: DisplayUnit; readonly inOrders: boolean };
  readonly recordings: PastRecordings;
  readonly levels: PastLevels;
  /** Baselines of the band's series; empty where the limit asks for none. */
  readonly learned: readonly LearnedChange[];
  /** Used times from which levels are another machine's, oldest first. */
  readonly breaksMs: readonly number[];
  /** It need not be gone through to its end once it is known to be worse than this; left out: it is. */
  readonly unless?: WorseThan;
}

/** More than `most` alarms from `fromMs` on, or one that stands in that time for more than `longestMs`. */
export interface WorseThan {
  readonly fromMs: number;
  /** A whole number. */
  readonly most: number;
  readonly longestMs: number;
}

export interface Rehearsal {
  /** Oldest first. */
  readonly alarms: readonly RehearsedAlarm[];
  /** Recordings that were held against the limit. */
  readonly compared: number;
  /** Recordings for which it was not known where the limit stands (no baseline yet). */
  readonly unknown: number;
}

export interface RehearsedAlarm {
  /** Used time of the recording that raised it. */
  readonly raisedMs: number;
  /** Null: it still stood at the end. */
  readonly returnedMs: number | null;
  /** The highest it had. */
  readonly severity: Severity;
  /** It had come and gone three times within 24 recordings when it was raised. */
  readonly chattering: boolean;
  /** When people would have been told, and of what. */
  readonly told: readonly { readonly usedMs: number; readonly severity: Severity }[];
}

export function rehearse(question: RehearsalQuestion): Rehearsal {
  const { limit, band, recordings, levels, unless } = question;
  const standing = new StandingLimit(question);
  const course = new AlarmCourse(limit, recordings);
  const holdsIn = conditionsOf(limit, recordings.conditions);
  const flagBit = band.inOrders ? recordingMarks.flaggedInOrders : recordingMarks.flagged;
  let compared = 0;
  let unknown = 0;
  for (let n = 0; n < levels.at.length; n++) {
    const at = levels.at[n];
    const marks = recordings.marks[at];
    const level = levels.level[n];
    const now = standing.at(n);
    if ((marks & recordingMarks.judged) === 0 || !holdsIn(recordings.condition[at])) continue;
    if (now === null) {
      unknown++;
      continue;
    }
    compared++;
    if (course.isQuiet && now.isQuiet(level)) continue;
    const exceeded = levels.exceeded[n];
    const atLeast = (levels.marks[n] & levelMarks.atLeast) !== 0;
    const judgement = judgeAt(
      limit,
      now.thresholds(level),
      {
        level: {
          intervalLow: levels.intervalLow[n],
          intervalHigh: levels.intervalHigh[n],
          exceededBy80Percent: Number.isNaN(exceeded) ? null : exceeded,
          atLeast,
        },
        averages: recordings.averages[at],
      },
      course.condition,
    );
    if (judgement === null || ((marks & recordingMarks.onlyAtOnce) !== 0 && !judgement.dangerAtOnce))
      continue;
    course.judge(at, judgement, (marks & flagBit) !== 0 || atLeast);
    if (unless !== undefined && isWorse(course.alarms, recordings.usedMs[at], unless)) break;
  }
  return { alarms: course.alarms, compared, unknown };
}

function isWorse(alarms: readonly RehearsedAlarm[], nowMs: number, than: WorseThan): boolean {
  const tooMany = alarms[alarms.length - 1 - than.most];
  if (tooMany !== undefined && tooMany.raisedMs >= than.fromMs) return true;
  const newest = alarms.at(-1);
  if (newest === undefined || newest.returnedMs !== null) return false;
  return nowMs - Math.max(newest.raisedMs, than.fromMs) > than.longestMs;
}

/** A limit without a list holds in every running recording. */
function conditionsOf({ conditions }: Limit, names: readonly string[]): (condition: number) => boolean {
  if (conditions == null) return () => true;
  const places = new Set(conditions.map((name) => names.indexOf(name)));
  return (condition) => condition >= 0 && places.has(condition);
}

/** Alarms of limits in [fromMs, toMs) of used time, and how long they stood in it. */
export interface InTime {
  /** Raised within. */
  readonly count: number;
  readonly dangers: number;
  readonly chattering: number;
  readonly lastRaisedMs: number | null;
  readonly inAlarmMs: number;
  readonly longestMs: number;
  /** One stands at the end. */
  readonly stands: boolean;
}

export function alarmsInTime(
  alarms: readonly Omit<RehearsedAlarm, 'told'>[],
  { fromMs, toMs }: { readonly fromMs: number; readonly toMs: number },
): InTime {
  const raised = alarms.filter(({ raisedMs }) => raisedMs >= fromMs && raisedMs < toMs);
  const lengths = alarms.map(({ raisedMs, returnedMs }) =>
    Math.max(0, Math.min(returnedMs ?? toMs, toMs) - Math.max(raisedMs, fromMs)),
  );
  return {
    count: raised.length,
    dangers: raised.filter(({ severity }) => higher(severity, 'alert') === 'danger').length,
    chattering: raised.filter(({ chattering }) => chattering).length,
    lastRaisedMs: raised.at(-1)?.raisedMs ?? null,
    inAlarmMs: lengths.reduce((sum, length) => sum + length, 0),
    longestMs: Math.max(0, ...lengths),
    stands: alarms.some(({ returnedMs }) => returnedMs === null),
  };
}
