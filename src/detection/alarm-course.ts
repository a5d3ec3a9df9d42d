import type { Limit } from '../config/site.ts';
import { type AlarmState, type JournalEvent, normalState } from './alarm.ts';
import { higher } from './alarm-event.ts';
import {
  type Chatter,
  chatteringRecordings,
  chatteringReturns,
  chatterOf,
  chatterReason,
  heldAsChattering,
  type PastEvent,
} from './alarm-history.ts';
import { alarmStep } from './alarm-state.ts';
import type { Judgement } from './limits.ts';
import { type PastRecordings, recordingMarks } from './past-levels.ts';
import type { RehearsedAlarm } from './rehearsal.ts';
import { followSuppressions } from './suppression.ts';

/** The alarm of one limit from recording to recording, with nobody at hand. */
export class AlarmCourse {
  /** Oldest first. */
  readonly alarms: RehearsedAlarm[] = [];
  readonly #limit: Limit;
  readonly #recordings: PastRecordings;
  #state: AlarmState = normalState;
  /** Raised and returned, newest first; no more than can count. */
  #events: PastEvent[] = [];

  constructor(limit: Limit, recordings: PastRecordings) {
    this.#limit = limit;
    this.#recordings = recordings;
  }

  get condition(): AlarmState['condition'] {
    return this.#state.condition;
  }

  /** Nothing stands and nothing is being counted: a level on the good side changes nothing. */
  get isQuiet(): boolean {
    return this.#state.condition === 'normal' && this.#state.pending === null;
  }

  judge(at: number, { severity, at: thresholds, dangerAtOnce }: Judgement, flagged: boolean): void {
    const usedMs = this.#recordings.usedMs[at];
    const chatter =
      this.#events.length < chatteringReturns ? null : chatterOf(this.#events, this.#countsFromMs(at));
    const brought = this.#follow(this.#state, chatter);
    const before = brought.at(-1)?.state ?? this.#state;
    const { value: level, side } = thresholds;
    const step = alarmStep(
      before,
      { kind: 'judged', severity, usedMs, level, flagged, atOnce: dangerAtOnce, reason: {} },
      { ...this.#limit, side },
    );
    // What is at rest is not written to only to say that it would be held back (suppression.ts).
    if (step.state === before) return;
    for (const entry of step.journal) this.#note(entry, usedMs, chatter);
    const freed = step.state.condition === 'danger' ? this.#follow(step.state, chatter) : [];
    for (const { tell } of [...brought, step, ...freed]) {
      if (tell !== null)
        this.#change(({ told }) => ({ told: [...told, { usedMs, severity: tell.severity }] }));
    }
    this.#state = freed.at(-1)?.state ?? step.state;
  }

  #follow(state: AlarmState, chatter: Chatter | null) {
    const byDesign = heldAsChattering(chatter, state);
    return followSuppressions(this.#subject, state, { outOfService: null, byDesign });
  }

  get #subject() {
    const { id: limitId, bandId } = this.#limit;
    return { kind: 'limit', machineId: '', pointId: '', bandId, limitId } as const;
  }

  #note({ event, after }: JournalEvent, usedMs: number, chatter: Chatter | null): void {
    const chattering = chatter !== null;
    if (event === 'raised' && after !== 'normal') {
      this.alarms.push({ raisedMs: usedMs, returnedMs: null, severity: after, chattering, told: [] });
      this.#remember({ event, usedMs, reason: chatter === null ? {} : chatterReason(chatter) });
    }
    if (event === 'rose' && after !== 'normal')
      this.#change(({ severity }) => ({ severity: higher(severity, after) }));
    if (event === 'returned') {
      this.#change(() => ({ returnedMs: usedMs }));
      this.#remember({ event, usedMs, reason: {} });
    }
  }

  #change(fields: (alarm: RehearsedAlarm) => Partial<RehearsedAlarm>): void {
    const newest = this.alarms.at(-1);
    if (newest !== undefined) this.alarms[this.alarms.length - 1] = { ...newest, ...fields(newest) };
  }

  #remember(event: PastEvent): void {
    this.#events.unshift(event);
    // A return and a raise at most with each recording that counts, and the last raise before them.
    this.#events.length = Math.min(this.#events.length, 2 * chatteringRecordings + 2);
  }

  /** Used time of the oldest of the recordings that count, of which this one is the newest. */
  #countsFromMs(at: number): number {
    const { marks, usedMs } = this.#recordings;
    let missing = chatteringRecordings - 1;
    for (let place = at - 1; place >= 0; place--) {
      if ((marks[place] & recordingMarks.judged) === 0) continue;
      missing--;
      if (missing === 0) return usedMs[place];
    }
    return Number.NEGATIVE_INFINITY;
  }
}
