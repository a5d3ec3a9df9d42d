import type { Limit } from '../config/site.ts';
import type { Baseline } from './baseline.ts';
import { learnedKey, levelMarks } from './past-levels.ts';
import type { RehearsalQuestion } from './rehearsal.ts';
import { type LimitSituation, nothingKnown, type Thresholds, thresholdsOf } from './thresholds.ts';

/** Where a limit stands for one level. */
export interface StandingNow {
  /** No threshold is passed, whatever the deadband. */
  isQuiet(level: number): boolean;
  thresholds(level: number): Thresholds;
}

/** More levels than this are not looked at for one rate, as in the service. */
const mostPast = 5000;

/**
 * Where a limit stands from level to level. Values that stand in the site file or follow from a baseline are reckoned
 * once for as long as the baseline stays; a curve and a rate for each level.
 */
export class StandingLimit {
  readonly #question: RehearsalQuestion;
  readonly #baselines = new Map<number, Baseline>();
  readonly #known = new Map<number, StandingNow | null>();
  readonly #past = new Map<number, PastOfRate>();
  #nextChange = 0;
  #nextBreak = 0;
  #brokenMs = Number.NEGATIVE_INFINITY;

  constructor(question: RehearsalQuestion) {
    this.#question = question;
  }

  /** For each level in turn; null: it is not known where the limit stands. */
  at(n: number): StandingNow | null {
    const { limit, levels, recordings } = this.#question;
    const by = limit.rule?.by ?? 'stands';
    if (by === 'stands') return this.#once(0, nothingKnown);
    const at = levels.at[n];
    if (by === 'curve') {
      const speedHz = orNull(recordings.speedHz[at]);
      const loadPercent = orNull(recordings.loadPercent[at]);
      return standingOf(this.#question, { ...nothingKnown, speedHz, loadPercent }, levels.level[n]);
    }
    const condition = recordings.condition[at];
    if (by === 'rate') return this.#rate(n, at, condition);
    this.#learn(at);
    // Outside all conditions nothing is learned; what the site gave as a level counts there too.
    if (condition < 0) return this.#once(-1, nothingKnown);
    const key = learnedKey(levels.series[n], condition);
    return this.#once(key, { ...nothingKnown, baseline: this.#baselines.get(key) ?? null });
  }

  #once(key: number, situation: LimitSituation): StandingNow | null {
    const known = this.#known.get(key);
    if (known !== undefined) return known;
    const standing = standingOf(this.#question, situation, null);
    this.#known.set(key, standing);
    return standing;
  }

  #learn(at: number): void {
    const { learned } = this.#question;
    for (; this.#nextChange < learned.length; this.#nextChange++) {
      const change = learned[this.#nextChange];
      if (change.after >= at) return;
      this.#baselines.set(change.key, change.baseline);
      this.#known.delete(change.key);
    }
  }

  /** The level takes part in the rates of those after it, if it is in the trend. */
  #rate(n: number, at: number, condition: number): StandingNow | null {
    const { limit, levels, recordings, breaksMs } = this.#question;
    const usedMs = recordings.usedMs[at];
    while ((breaksMs[this.#nextBreak] ?? Number.POSITIVE_INFINITY) <= usedMs)
      this.#brokenMs = breaksMs[this.#nextBreak++];
    if (condition < 0 || limit.rule?.by !== 'rate') return null;
    const key = learnedKey(levels.series[n], condition);
    const past = this.#past.get(key) ?? new PastOfRate();
    this.#past.set(key, past);
    const level = levels.level[n];
    const fromMs = Math.max(Math.floor(usedMs - limit.rule.overMs), this.#brokenMs);
    const own = { usedMs, level };
    const standing = standingOf(
      this.#question,
      { ...nothingKnown, past: [...past.from(fromMs), own] },
      level,
    );
    if ((levels.marks[n] & levelMarks.inTrend) !== 0 && level > 0) past.add(own);
    return standing;
  }
}

/** Levels of the trend, oldest first, no further back than was asked for last. */
class PastOfRate {
  #levels: { readonly usedMs: number; readonly level: number }[] = [];

  from(fromMs: number) {
    const first = this.#levels.findIndex(({ usedMs }) => usedMs >= fromMs);
    this.#levels = first === -1 ? [] : this.#levels.slice(Math.max(first, this.#levels.length - mostPast));
    return this.#levels;
  }

  add(level: { readonly usedMs: number; readonly level: number }): void {
    this.#levels.push(level);
  }
}

/** `level`: the one that it is asked for; null: where the limit stands does not depend on it. */
function standingOf(
  { limit, band: { display } }: RehearsalQuestion,
  situation: LimitSituation,
  level: number | null,
): StandingNow | null {
  if (limit.rule?.by === 'change') return changeOf(limit, situation, display);
  const at = thresholdsOf(limit, level ?? 0, situation, display);
  if ('unknown' in at) return null;
  const value = level === null ? null : at.value;
  const quietTo = quietUntil(at);
  return {
    isQuiet: (own) => (at.side === 'upper' ? (value ?? own) <= quietTo : (value ?? own) >= quietTo),
    thresholds: (own) => (value === null ? { ...at, value: own } : at),
  };
}

/** Up or down from what is usual: which of the two, the level says. */
function changeOf(
  limit: Limit,
  situation: LimitSituation,
  display: RehearsalQuestion['band']['display'],
): StandingNow | null {
  const up = thresholdsOf(limit, Number.MAX_VALUE, situation, display);
  const down = thresholdsOf(limit, 0, situation, display);
  if ('unknown' in up || 'unknown' in down) return null;
  const [most, least] = [quietUntil(up), quietUntil(down)];
  const usual = Math.exp(situation.baseline?.medianLog ?? Number.NaN);
  return {
    isQuiet: (own) => own <= most && own >= least,
    thresholds: (own) => ({ ...(own >= usual ? up : down), value: own }),
  };
}

function quietUntil({ side, alert, danger }: Thresholds): number {
  return side === 'upper'
    ? Math.min(alert ?? Number.POSITIVE_INFINITY, danger ?? Number.POSITIVE_INFINITY)
    : Math.max(alert ?? Number.NEGATIVE_INFINITY, danger ?? Number.NEGATIVE_INFINITY);
}

function orNull(value: number): number | null {
  return Number.isNaN(value) ? null : value;
}
