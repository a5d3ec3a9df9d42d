import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { SteppedClock } from '../../service/clock.ts';
import type { Service } from '../../service/service.ts';
import { days, filesOfStep, stepMs, steps } from './scenario.ts';

/** The story begins on a Monday. */
export const beginMs = Date.UTC(2026, 2, 2);
export const seed = 20260302;
const minuteMs = 60_000;

/**
 * Moments after each recording at which the service is given a round: it notices the files, they have settled, a
 * danger and then the rest have been gathered, an incomplete file is given up, and the half hours at which the morning
 * comes, in winter and in summer time.
 */
const momentsMs: readonly number[] = [
  0,
  6_000,
  20_000,
  6 * minuteMs,
  11 * minuteMs,
  30 * minuteMs,
  150 * minuteMs,
];

/** What a person of the site does on a day of the story. */
export interface PersonsPart {
  readonly day: number;
  act(service: Service, nowMs: number): Promise<void>;
}

/** Runs the real service through the story; its clock steps from moment to moment. `told`: after each day. */
export async function timeLapse(
  service: Service,
  clock: SteppedClock,
  dropFolder: string,
  parts: readonly PersonsPart[],
  told: (day: number) => void,
  storyDays: number = days,
): Promise<void> {
  const stepsADay = steps / days;
  const round = async (atMs: number) => {
    clock.advance(Math.max(0, atMs - clock.wallMs()));
    await service.intakeRound();
    const summary = await service.morning();
    await service.mailRound();
    return summary;
  };
  for (let step = 0; step < storyDays * stepsADay + lastNightSteps; step++) {
    const startMs = beginMs + step * stepMs;
    for (const { name, bytes } of filesOfStep(step, startMs, seed))
      writeFileSync(join(dropFolder, name), bytes);
    for (const moment of momentsMs) {
      const summary = await round(startMs + recordedAfterMs + moment);
      if (summary !== null && step >= storyDays * stepsADay) return;
    }
    if ((step + 1) % stepsADay !== 0) continue;
    const day = (step + 1) / stepsADay;
    for (const part of parts) if (part.day === day) await part.act(service, clock.wallMs());
    told(day);
  }
  // The story ends with a morning; in winter it comes after the night's last recording.
  while ((await round(clock.wallMs() + 15 * minuteMs)) === null);
}

/** Recordings of the night before the last morning. */
const lastNightSteps = 3;

/** A recording lies in the folder ten seconds after it began. */
const recordedAfterMs = 10_000;
