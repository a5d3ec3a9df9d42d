import { normalState } from '../../src/detection/alarm.ts';
import { alarmStep } from '../../src/detection/alarm-state.ts';
import { type Baseline, baselineOf, type GoodLevel, isOpen } from '../../src/detection/baseline.ts';
import { judgeLevel } from '../../src/detection/limits.ts';
import { nothingKnown } from '../../src/detection/thresholds.ts';
import { plantLogLevels } from '../prognosis/plant-levels.ts';
import { seededRandom } from '../signal/random.ts';
import { levelOf, limitWith } from './site-parts.ts';

/**
 * Statistical limits on plants as plants are, with the code as shipped: baselines as they grow from day to day, limits
 * reckoned for each recording, the alarm's own delays and deadband.
 */
export const seed = 20261201;
const hour = 3_600_000;
const display = { text: 'mm/s', quantity: 'velocity', inSi: 1, detector: 'rms' } as const;

export interface Story {
  readonly bands: number;
  readonly days: number;
  readonly course?: (days: number) => number;
  /** Of the recordings, this share reads ten times too much. */
  readonly knocks?: number;
  readonly onDelay?: number;
  /** The baseline learns no longer than this; without it as it ships. */
  readonly baselineDays?: number;
  readonly k?: number;
}

/** Days at which alarms were raised, by band. */
export function alarmDays(n: number, story: Story): number[][] {
  const { bands, days, course = () => 0, knocks = 0, onDelay = 3, k = 4.5 } = story;
  const random = seededRandom(seed + 7919 * n);
  return plantLogLevels(seed + n, { bands, days, course }).map((logs) => {
    const levels = logs.map((log) => Math.exp(log) * (random.uniform() < knocks ? 10 : 1));
    return raised(levels, { onDelay, k, baselineDays: story.baselineDays ?? Number.POSITIVE_INFINITY });
  });
}

function raised(
  levels: Float64Array,
  rules: { readonly onDelay: number; readonly k: number; readonly baselineDays: number },
): number[] {
  const limit = limitWith({
    alert: null,
    danger: null,
    kind: 'statistical',
    rule: { by: 'spread', alert: rules.k, danger: null },
    onDelay: { recordings: rules.onDelay },
  });
  const days: number[] = [];
  const good: GoodLevel[] = [];
  let baseline: Baseline | null = null;
  let state = normalState;
  for (let n = 0; n < levels.length; n++) {
    const day = Math.floor(n / 24);
    if (n % 24 === 0 && day <= rules.baselineDays && (baseline === null || isOpen(baseline.state)))
      baseline = baselineOf({ levels: good, expectedADay: 24, zoneC: null, confirmed: null });
    const judged = {
      level: levelOf(levels[n]),
      averages: 31,
      display,
      situation: { ...nothingKnown, baseline },
    };
    const judgement = judgeLevel(limit, judged, state.condition);
    if (judgement !== null) {
      const step = alarmStep(
        state,
        {
          kind: 'judged',
          severity: judgement.severity,
          usedMs: n * hour,
          level: levels[n],
          flagged: false,
          atOnce: false,
          reason: {},
        },
        limit,
      );
      if (step.journal.some(({ event }) => event === 'raised')) days.push(n / 24);
      state = step.state;
      // Somebody sees to it, so that the next one counts again.
      if (state.condition !== 'normal' && !state.acknowledged)
        state = alarmStep(state, { kind: 'acknowledge', comment: null, reason: {} }, limit).state;
    }
    if (day < rules.baselineDays) good.push({ usedMs: n * hour, day, level: levels[n] });
  }
  return days;
}

/** Alarms a point a year, from the day on which the baseline is learned. */
export function alarmsAYear(points: number, story: Omit<Story, 'days'>, fromDay = 30): number {
  const days = fromDay + 365;
  let count = 0;
  for (let n = 0; n < points; n++)
    count += alarmDays(n, { ...story, days })
      .flat()
      .filter((day) => day >= fromDay).length;
  return count / points;
}

/** Share of bands with an alert within ten days of the beginning of a doubling every ten days. */
export function foundWithinTenDays(points: number, story: Omit<Story, 'days' | 'course'>): number {
  const begins = 60;
  const course = (days: number) => (Math.max(0, days - begins) * Math.LN2) / 10;
  const bands = Array.from({ length: points }, (_, n) =>
    alarmDays(n, { ...story, days: begins + 10, course }),
  ).flat();
  return bands.filter((days) => days.some((day) => day >= begins)).length / bands.length;
}
