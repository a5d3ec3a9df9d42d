import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { readLoggerClock, type SourceClock } from '../../src/acquisition/logger-clock.ts';

const hour = 3_600_000;
const minute = 60_000;
const day = 24 * hour;
const settings = { intervalMs: hour, overdueAfterMs: 2 * hour, toleranceMs: 5 * minute };
const now = Date.UTC(2026, 2, 2);

interface Arrival {
  readonly statedMs: number;
  readonly arrivedMs: number;
}

/** A source as the service keeps it: batches of files that arrive together, read in order of their stated start. */
function live(batches: readonly (readonly Arrival[])[]) {
  let clock: SourceClock = { offsetMs: 0, newestUsedMs: null, lastEvaluatedArrivedMs: null };
  const used: number[] = [];
  const answers: { statedMs: number; arrivedMs: number; usedMs: number; late: boolean; trouble: string }[] =
    [];
  for (const batch of batches) {
    const sorted = [...batch].sort((a, b) => a.statedMs - b.statedMs);
    const batchNewestStatedMs = Math.max(...batch.map(({ statedMs }) => statedMs));
    for (const { statedMs, arrivedMs } of sorted) {
      const wanted = statedMs + clock.offsetMs;
      const nearestUsedMs =
        used.length === 0
          ? null
          : used.reduce((a, b) => (Math.abs(b - wanted) < Math.abs(a - wanted) ? b : a));
      const answer = readLoggerClock(clock, {
        ...settings,
        statedMs,
        arrivedMs,
        batchNewestStatedMs,
        nearestUsedMs,
      });
      used.push(answer.usedMs);
      answers.push({
        statedMs,
        arrivedMs,
        usedMs: answer.usedMs,
        late: answer.late,
        trouble: answer.trouble,
      });
      clock = answer.late
        ? clock
        : { offsetMs: answer.offsetMs, newestUsedMs: answer.usedMs, lastEvaluatedArrivedMs: arrivedMs };
    }
  }
  return answers;
}

const hourly = (count: number, from: number, statedOffset: number, delay = minute): Arrival[][] =>
  Array.from({ length: count }, (_, i) => [
    { statedMs: from + i * hour + statedOffset, arrivedMs: from + i * hour + delay },
  ]);

describe("a logger's clock", () => {
  it('that is right is taken as it is', () => {
    const answers = live(hourly(48, now, 0));
    expect(answers.every((a) => a.usedMs === a.statedMs && !a.late && a.trouble === 'none')).toBe(true);
  });

  it('three minutes ahead is within the tolerance', () => {
    expect(live(hourly(48, now, 4 * minute)).every((a) => a.trouble === 'none' && !a.late)).toBe(true);
  });

  it('a day ahead is trouble at once, and the recordings count from their arrival', () => {
    const answers = live(hourly(10, now, day));
    expect(answers[0]).toMatchObject({ trouble: 'begins', late: false, usedMs: now + minute });
    expect(answers.slice(1).every((a) => a.trouble === 'stands' && !a.late)).toBe(true);
    expect(answers[9]?.usedMs).toBe(now + 9 * hour + minute);
  });

  it('set back 30 days with daily batches of 24 loses no batch', () => {
    const batch = (d: number, offset: number): Arrival[] =>
      Array.from({ length: 24 }, (_, i) => ({
        statedMs: now + (d - 1) * day + i * hour + offset,
        arrivedMs: now + d * day,
      }));
    const answers = live([1, 2, 3, 4, 5, 6].map((d) => batch(d, d >= 3 ? -30 * day : 0)));
    for (let d = 3; d <= 6; d++) {
      const ofBatch = answers.slice((d - 1) * 24, d * 24);
      expect(ofBatch.some((a) => !a.late)).toBe(true);
      expect(ofBatch.filter((a) => a.late).length).toBeLessThanOrEqual(1);
    }
  });

  it('set back 30 days while two files come an hour is told within the overdue span', () => {
    const before: Arrival[][] = hourly(24 * 40, now - 40 * day, 0);
    const after = Array.from({ length: 20 }, (_, i) => [
      { statedMs: now + i * (hour / 2) - 30 * day, arrivedMs: now + i * (hour / 2) + minute },
    ]);
    const answers = live([...before, ...after]).slice(before.length);
    const first = answers.findIndex((a) => !a.late);
    expect(first).toBeLessThanOrEqual(5);
    expect(answers.slice(first).every((a) => !a.late)).toBe(true);
  });

  it('year 2000 at each power cycle is judged again within the overdue span', () => {
    const y2000 = Date.UTC(2000, 0, 1) - now;
    const answers = live([
      ...hourly(24, now, 0),
      ...hourly(24, now + day, y2000 - day),
      ...hourly(24, now + 2 * day, y2000 - 2 * day),
    ]);
    for (let i = 24; i < answers.length; i++) {
      const span = answers.slice(Math.max(24, i - 3), i + 1);
      if (i >= 27) expect(span.some((a) => !a.late)).toBe(true);
    }
  });

  it('that is set right ends the trouble, and used time never goes back', () => {
    const wrong = hourly(10, now, -5 * day);
    const right = hourly(10, now + 10 * hour, 0);
    const answers = live([...hourly(5, now - 5 * hour, 0), ...wrong, ...right]);
    expect(answers.some((a) => a.trouble === 'ends')).toBe(true);
    expect(answers.at(-1)).toMatchObject({ trouble: 'none', late: false });
  });

  it('while files arrive, one is judged in every overdue span, and what is judged never goes back in time', () => {
    const seed = 20261201;
    fc.assert(
      fc.property(
        fc.array(fc.integer({ min: -3000, max: 3000 }), { minLength: 10, maxLength: 120 }),
        (offsetsH) => {
          // Each recording states its arrival plus an arbitrary error that changes at random.
          const arrivals = offsetsH.map((offset, i) => [
            {
              statedMs:
                now + i * hour + (offset % 7 === 0 ? offset * hour : 0) + (offset > 0 ? offset * 1000 : 0),
              arrivedMs: now + i * hour + minute,
            },
          ]);
          const answers = live(arrivals);
          let lastJudged = Number.NEGATIVE_INFINITY;
          let newestUsed = Number.NEGATIVE_INFINITY;
          for (const answer of answers) {
            if (!answer.late) {
              expect(answer.usedMs).toBeGreaterThan(newestUsed);
              newestUsed = answer.usedMs;
              lastJudged = answer.arrivedMs;
            }
            expect(answer.arrivedMs - lastJudged).toBeLessThanOrEqual(settings.overdueAfterMs);
            expect(answer.usedMs).toBeLessThanOrEqual(
              answer.arrivedMs + Math.max(settings.toleranceMs, newestUsed - answer.arrivedMs),
            );
          }
        },
      ),
      { seed, numRuns: 300 },
    );
  });
});
