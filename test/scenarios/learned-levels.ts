import type { OperatingCondition } from '../../src/config/site.ts';
import { type Baseline, baselineOf, baselineRules, type GoodLevel } from '../../src/detection/baseline.ts';
import { anyCondition } from '../../src/detection/condition.ts';
import { type LimitSituation, nothingKnown } from '../../src/detection/thresholds.ts';
import { hourMs } from '../detection/site-parts.ts';

/** What the story's machine has shown so far, by operating condition; the ledger's part in learning. */
export class LearnedLevels {
  readonly #levels = new Map<string, GoodLevel[]>();

  /**
   * '40 days at 2 in full': hourly levels, day by day 10 % about it, in a row that shows no trend. Answers what the baseline
   * is afterwards, and how long it took.
   */
  live(text: string, beginMs: number): { readonly answer: string; readonly ms: number } | null {
    const [, days, from, to, name] =
      /^(\d+) days? at ([\d.]+)(?: rising to ([\d.]+))?(?: in (\S+))?$/.exec(text) ?? [];
    if (days === undefined || from === undefined) return null;
    const condition = name ?? anyCondition;
    const levels = this.#levels.get(condition) ?? [];
    for (let day = 0; day < Number(days); day++) {
      const course = to === undefined ? 1 : (Number(to) / Number(from)) ** (day / Number(days));
      for (let hour = 0; hour < 24; hour++) {
        const usedMs = beginMs + (24 * day + hour) * hourMs;
        const spread = Math.exp(0.1 * Math.sin(2.4 * day) + 0.03 * Math.sin(1.9 * hour));
        levels.push({
          usedMs,
          day: Math.floor(usedMs / (24 * hourMs)),
          level: Number(from) * course * spread,
        });
      }
    }
    this.#levels.set(condition, levels);
    return { answer: this.#words(condition), ms: Number(days) * 24 * hourMs };
  }

  /** After it the levels are another machine's. */
  beginAnew(): void {
    this.#levels.clear();
  }

  situation(condition: string | null, speedHz: number | null): LimitSituation {
    const baseline = condition === null ? null : this.#baseline(condition);
    return { ...nothingKnown, baseline, speedHz };
  }

  #baseline(condition: string): Baseline {
    const levels = this.#levels.get(condition) ?? [];
    return baselineOf({ levels, expectedADay: 24, zoneC: null, confirmed: null });
  }

  #words(condition: string): string {
    const { state, runningDays, medianLog, refused } = this.#baseline(condition);
    const of = condition === anyCondition ? '' : ` in ${condition}`;
    if (refused !== null) return `baseline${of} refused: ${refused}`;
    const usual = medianLog === null ? '' : `, usual ${Math.exp(medianLog).toFixed(2)}`;
    return `baseline${of} ${state}, ${Math.min(runningDays, baselineRules.refinedDays)} running days${usual}`;
  }
}

/** 'conditions full 2900 to 3000 rpm, part 1400 to 1600 rpm'. */
export function conditionsOf(parts: readonly string[]): OperatingCondition[] {
  return parts.map((part) => {
    const [, id, from, to] = /^(\S+) (\d+) to (\d+) rpm$/.exec(part) ?? [];
    if (id === undefined) throw new Error(`no such operating condition: ${part}`);
    return { id, speedHz: { from: Number(from) / 60, to: Number(to) / 60 }, loadPercent: null };
  });
}
