import { type Baseline, baselineRules, GrowingBaseline, isOpen, noBaseline } from './baseline.ts';
import {
  learnedKey,
  levelMarks,
  type PastLevels,
  type PastRecordings,
  recordingMarks,
} from './past-levels.ts';

/**
 * Baselines of one band as they grew: once a day, with the first recording of a later local day, from all good levels
 * so far; begun anew at repairs and changed sensors. What people ordered holds for the whole of a baseline's time: one
 * that is confirmed now was never refused, one that is frozen learned until its last reading.
 */
export interface LearnedChange {
  /** It holds for recordings after this place. */
  readonly after: number;
  readonly key: number;
  readonly baseline: Baseline;
}

/** A baseline as the ledger has it now. */
export interface KeptBaseline {
  readonly key: number;
  readonly baseline: Baseline;
  readonly learnFromMs: number;
}

export interface LearningQuestion {
  readonly recordings: PastRecordings;
  readonly levels: PastLevels;
  /** Recordings expected on a full day. */
  readonly expectedADay: number;
  /** Where zone C begins, SI r.m.s.; null: no zone. */
  readonly zoneC: number | null;
  /** Used times from which levels are another machine's, oldest first. */
  readonly breaksMs: readonly number[];
  readonly kept: readonly KeptBaseline[];
}

/** More days than this are not looked at: a baseline is refined long before. */
const mostDays = 2 * baselineRules.refinedDays;

/** All changes in the order of `after`. */
export function learnedOverTime(question: LearningQuestion): LearnedChange[] {
  const { recordings, levels } = question;
  const changes: LearnedChange[] = [];
  const tracks = new Map<number, Track>();
  for (const kept of question.kept) tracks.set(kept.key, new Track(question, kept.key, kept));
  for (const track of tracks.values()) track.tell(changes, -1);
  let next = 0;
  const addUntil = (end: number) => {
    for (; next < levels.at.length && levels.at[next] < end; next++) {
      const at = levels.at[next];
      if ((levels.marks[next] & levelMarks.inTrend) === 0) continue;
      const key = learnedKey(levels.series[next], recordings.condition[at]);
      let track = tracks.get(key);
      if (track === undefined) {
        track = new Track(question, key, null);
        tracks.set(key, track);
      }
      track.pass(changes, at);
      track.add(next, at);
    }
  };
  let day: number | null = null;
  for (let at = 0; at < recordings.day.length; at++) {
    const own = recordings.day[at];
    if (day !== null && own <= day) continue;
    const ended = day;
    day = own;
    addUntil(at);
    for (const track of tracks.values()) track.pass(changes, at);
    const due = [...tracks.values()].filter(({ lastDay }) => lastDay === ended);
    addUntil(at + 1);
    for (const track of due) track.learn(changes, at);
  }
  return changes;
}

/** One series in one condition. */
class Track {
  lastDay: number | null = null;
  readonly #question: LearningQuestion;
  readonly #key: number;
  readonly #kept: KeptBaseline | null;
  readonly #breaksMs: readonly number[];
  #passed = 0;
  #learnFromMs = Number.NEGATIVE_INFINITY;
  #growing: GrowingBaseline;
  #newestDay: number | null = null;
  #days = 0;
  #baseline: Baseline = noBaseline;

  constructor(question: LearningQuestion, key: number, kept: KeptBaseline | null) {
    this.#question = question;
    this.#key = key;
    this.#kept = kept;
    const { breaksMs, recordings } = question;
    const firstMs = recordings.usedMs.at(0) ?? Number.POSITIVE_INFINITY;
    this.#breaksMs = [...new Set([...breaksMs, ...(kept === null ? [] : [kept.learnFromMs])])].sort(
      (a, b) => a - b,
    );
    while ((this.#breaksMs[this.#passed] ?? Number.POSITIVE_INFINITY) <= firstMs)
      this.#learnFromMs = this.#breaksMs[this.#passed++];
    // Learned before these recordings, and nothing of them was in it.
    const { fromMs = null, state = 'learning' } = kept?.baseline ?? {};
    if (kept !== null && this.#isOfKept() && fromMs !== null && fromMs < firstMs && !isOpen(state))
      this.#baseline = kept.baseline;
    this.#growing = this.#begin();
  }

  #begin(): GrowingBaseline {
    const { expectedADay, zoneC } = this.#question;
    const confirmed = this.#isOfKept() ? (this.#kept?.baseline.confirmed ?? null) : null;
    this.#newestDay = null;
    this.#days = 0;
    return new GrowingBaseline({ expectedADay, zoneC, confirmed });
  }

  tell(changes: LearnedChange[], after: number): void {
    changes.push({ after, key: this.#key, baseline: this.#baseline });
  }

  /** Begins anew where a break lies before this recording. */
  pass(changes: LearnedChange[], at: number): void {
    const usedMs = this.#question.recordings.usedMs[at];
    let broken = false;
    for (; (this.#breaksMs[this.#passed] ?? Number.POSITIVE_INFINITY) <= usedMs; this.#passed++) {
      this.#learnFromMs = this.#breaksMs[this.#passed];
      broken = true;
    }
    if (!broken) return;
    this.#growing = this.#begin();
    this.#baseline = noBaseline;
    this.tell(changes, at - 1);
  }

  add(level: number, at: number): void {
    const { recordings, levels } = this.#question;
    const day = recordings.day[at];
    this.lastDay = day;
    const good =
      (recordings.marks[at] & recordingMarks.good) !== 0 && (levels.marks[level] & levelMarks.atLeast) === 0;
    if (!good || !isOpen(this.#baseline.state)) return;
    if (this.#newestDay !== day) {
      this.#newestDay = day;
      this.#days++;
    }
    if (this.#days > mostDays) return;
    const usedMs = recordings.usedMs[at];
    this.#growing.add({ usedMs, day, level: levels.level[level] });
  }

  learn(changes: LearnedChange[], at: number): void {
    if (!isOpen(this.#baseline.state)) return;
    const kept = this.#isOfKept() ? this.#kept : null;
    const usedMs = this.#question.recordings.usedMs[at];
    const isFrozen = kept?.baseline.state === 'frozen' && usedMs > (kept.baseline.toMs ?? usedMs);
    this.#baseline = isFrozen ? kept.baseline : this.#growing.now();
    this.tell(changes, at);
  }

  /** What is learned now is what the ledger has, not one that was begun anew since. */
  #isOfKept(): boolean {
    return this.#kept !== null && this.#learnFromMs <= this.#kept.learnFromMs && this.#passedAll();
  }

  #passedAll(): boolean {
    const kept = this.#kept?.learnFromMs ?? 0;
    return this.#breaksMs.slice(this.#passed).every((ms) => ms > kept);
  }
}
