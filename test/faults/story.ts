import { createHash } from 'node:crypto';
import { existsSync, readFileSync, renameSync, utimesSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setAsidePath } from '../../src/acquisition/filing-place.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import type { ServiceOptions } from '../../src/service/service.ts';
import type { Step, StepName } from '../../src/service/steps.ts';
import { beginMs, hourMs, siteAt, stamp, TrialService, wav } from '../service/site-on-disk.ts';

/**
 * Five hours of a small site, the same whenever they are told: a sidecar, a corrupt file, an alarm that is raised after
 * its on-delay, a repeat, a stranger, and a file that its logger writes on while it is set aside. What the loggers do is
 * done once, however often the service is started over; the service takes up again at the hour in which it was ended.
 */
export interface StoryFile {
  readonly hour: number;
  readonly name: string;
  readonly bytes: Uint8Array;
}

const name = (machine: string, hour: number, more = '') =>
  `${machine}_${stamp(beginMs + hour * hourMs)}${more}.wav`;
const text = (words: string) => new TextEncoder().encode(words);
const firstPress = wav([1, 1], 1);
/** Its logger still has it open when it is filed, and writes other samples into it. */
const rewritten = { path: name('pump-2', 3), first: wav([1], 35), later: wav([1.2], 36) };

export const storyFiles: readonly StoryFile[] = [
  { hour: 0, name: name('press-1', 0), bytes: firstPress },
  { hour: 0, name: name('pump-2', 0), bytes: wav([1], 5) },
  { hour: 0, name: name('pump-2', 0).replace('.wav', '.json'), bytes: text('{"speed_rpm": 1480}') },
  { hour: 1, name: name('press-1', 1), bytes: wav([5, 1], 11) },
  { hour: 1, name: name('pump-2', 1), bytes: text('transfer aborted') },
  { hour: 2, name: name('press-1', 2), bytes: wav([5, 1], 21) },
  { hour: 2, name: name('press-1', 0, '-again'), bytes: firstPress },
  { hour: 2, name: name('chiller-9', 2), bytes: wav([1], 25) },
  { hour: 3, name: rewritten.path, bytes: rewritten.first },
  { hour: 4, name: name('press-1', 4), bytes: wav([9, 1], 41) },
];
const hours = 5;

/** Seconds after the hour at which the service is given a round: noticed, settled, gathered, the morning's half hour. */
const momentsS = [10, 16, 90, 420, 2100];

/** Plays what is left of the story to its end (or the beginning of the hour `until`), or to where `step` ends it. */
export async function playStory(
  folder: string,
  step: Step,
  { until = hours, ...options }: Partial<ServiceOptions> & { readonly until?: number } = {},
): Promise<void> {
  const site = siteAt(folder);
  const place = join(folder, 'story-hour');
  const from = existsSync(place) ? Number(readFileSync(place, 'utf8')) : 0;
  const clock = new SteppedClock(beginMs + from * hourMs);
  const trial = await TrialService.start(site, {
    ...options,
    clock,
    step: (reached) => {
      if (reached === 'filing: set aside under its own name') writeOn(folder, site.drop);
      step(reached);
    },
  });
  try {
    for (let hour = from; hour < until; hour++) {
      clock.advance(Math.max(0, beginMs + hour * hourMs - clock.wallMs()));
      once(folder, `hour-${hour}`, () => dropFiles(site.drop, hour));
      replaceFile(place, String(hour));
      for (const second of momentsS) {
        clock.advance(beginMs + hour * hourMs + second * 1000 - clock.wallMs());
        await trial.service.intakeRound();
        await trial.service.morning();
        await trial.service.mailRound();
      }
    }
  } finally {
    await trial.stop();
  }
}

function dropFiles(drop: string, hour: number): void {
  for (const file of storyFiles.filter((one) => one.hour === hour)) {
    const path = join(drop, file.name);
    writeFileSync(path, file.bytes);
    const at = new Date(beginMs + hour * hourMs);
    utimesSync(path, at, at);
  }
}

/** The logger goes on writing into the file that it has open, wherever it is called by then. */
function writeOn(folder: string, drop: string): void {
  const sha256 = createHash('sha256').update(rewritten.first).digest('hex');
  const held = join(drop, setAsidePath({ from: rewritten.path, sha256 }));
  if (existsSync(held)) once(folder, 'rewritten', () => writeFileSync(held, rewritten.later));
}

function once(folder: string, deed: string, act: () => void): void {
  const mark = join(folder, `done-${deed}`);
  if (existsSync(mark)) return;
  act();
  writeFileSync(mark, '');
}

function replaceFile(path: string, content: string): void {
  writeFileSync(`${path}.part`, content);
  renameSync(`${path}.part`, path);
}

/** A step function that counts, and acts at the n-th time that a step of that name is reached. */
export function at(name: StepName, n: number, act: () => void): Step {
  let reached = 0;
  return (step) => {
    if (step === name && ++reached === n) act();
  };
}
