import { usualLineSpacingHz } from '../../src/config/meaning.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { findSpeed, type SpeedSpectrum } from '../../src/signal/spectrum-speed.ts';
import { type SeededRandom, seededRandom } from './random.ts';

/** Invented machines whose speed is to be found. 6.4 kHz for 10 s, Hann, 50 %, the line spacing usual for the speed. */
const sampleRateHz = 6400;
const seconds = 10;

export interface Tone {
  readonly hz: number;
  readonly amplitude: number;
}

export interface SpeedTrial {
  readonly speedHz: number;
  readonly nominalHz: number;
  readonly tones: readonly Tone[];
}

/** White noise of deviation 1: on a line of 1.56 Hz and 30 averages a tone of amplitude 0.1 stands 10 dB over the floor. */
export function speedSpectrum({ nominalHz, tones }: SpeedTrial, random: SeededRandom): SpeedSpectrum {
  const samples = Float64Array.from({ length: seconds * sampleRateHz }, () => random.gaussian());
  for (const { hz, amplitude } of tones) {
    const phase = 2 * Math.PI * random.uniform();
    const step = (2 * Math.PI * hz) / sampleRateHz;
    for (let n = 0; n < samples.length; n++) samples[n] += amplitude * Math.sin(step * n + phase);
  }
  let segmentSamples = 8;
  while (sampleRateHz / segmentSamples > usualLineSpacingHz(nominalHz)) segmentSamples *= 2;
  const averaging = { window: 'hann', segmentSamples, overlapPercent: 50, sampleRateHz } as const;
  const { density, averages, hopSamples } = averageDensity(samples, averaging);
  const settings = { window: 'hann', segmentSamples, hopSamples, averages, sampleRateHz } as const;
  return { averages, settings, search: findPeaks(density, settings) };
}

/**
 * A machine within the stated range: shaft of 10 to 50 Hz, up to 5 % off its nominal speed; at least four of its first
 * ten harmonics 10 to 45 dB over the floor of a line, one of the first three among them; up to six tones of other
 * origin as strong as that; mains hum on two of three.
 */
export function usualMachine(seed: number): { readonly trial: SpeedTrial; readonly random: SeededRandom } {
  const random = seededRandom(seed);
  const nominalHz = 10 + 40 * random.uniform();
  const speedHz = nominalHz * (1 + 0.048 * (2 * random.uniform() - 1));
  const amplitude = () => 0.1 * 10 ** ((35 * random.uniform()) / 20) * (nominalHz < 20 ? 1 : 1.4);
  const harmonics = new Set([1 + Math.floor(3 * random.uniform())]);
  const wanted = 4 + Math.floor(5 * random.uniform());
  while (
    harmonics.size < wanted ||
    [...harmonics].every((n) => n % 2 === 0) ||
    [...harmonics].every((n) => n % 3 === 0)
  )
    harmonics.add(1 + Math.floor(10 * random.uniform()));
  const tones: Tone[] = [...harmonics].map((n) => ({ hz: n * speedHz, amplitude: amplitude() }));
  const others = Math.floor(7 * random.uniform());
  for (let n = 0; n < others; n++)
    tones.push({ hz: 15 + 1500 * random.uniform() ** 2, amplitude: amplitude() });
  const mains = [0, 50, 60][Math.floor(3 * random.uniform())] * (1 + 0.001 * (2 * random.uniform() - 1));
  if (mains > 0)
    for (const n of [1, 2, 3, 4, 6])
      if (random.uniform() < 0.6) tones.push({ hz: n * mains, amplitude: amplitude() });
  return { trial: { speedHz, nominalHz, tones }, random };
}

export const within = 0.05;

export function speedOf(trial: SpeedTrial, random: SeededRandom) {
  return findSpeed([speedSpectrum(trial, random)], trial.nominalHz, within);
}

/** How many of the machines are found to 0.1 %, refused, found wrong, and found within their own uncertainty. */
export function countFound(seeds: number, first = 1) {
  const counts = { seeds, right: 0, refused: 0, wrong: 0, inside: 0 };
  const missed: string[] = [];
  for (let seed = first; seed < first + seeds; seed++) {
    const { trial, random } = usualMachine(seed);
    const found = speedOf(trial, random);
    if ('refused' in found) {
      counts.refused++;
      missed.push(`seed ${seed}: ${found.refused}`);
      continue;
    }
    const off = Math.abs(found.speedHz - trial.speedHz);
    if (off <= 0.001 * trial.speedHz) counts.right++;
    else {
      counts.wrong++;
      missed.push(
        `seed ${seed}: ${found.speedHz} Hz in place of ${trial.speedHz} Hz; next ${found.nextScore}`,
      );
    }
    if (off <= found.uncertaintyHz) counts.inside++;
  }
  return { counts, missed };
}

/** What must be refused: `nominalHz` 24.7, the lines those of something else, or of two shafts that cannot be told apart. */
export const ambiguousMachines: Readonly<Record<string, (random: SeededRandom) => readonly Tone[]>> = {
  'only every second harmonic stands: a shaft twice as fast': (random) =>
    family(random, 49.31, [1, 2, 3, 4, 5]),
  'only every third harmonic stands: a shaft three times as fast, or three blades': (random) =>
    family(random, 73.8, [1, 2, 3, 4]),
  'half orders stand as well: a shaft half as fast': (random) =>
    family(random, 12.31, [1, 2, 3, 4, 5, 6, 7, 8]),
  'thirds stand as well: a shaft a third as fast': (random) =>
    family(random, 8.2, [1, 2, 3, 4, 5, 6, 7, 8, 9, 10]),
  'two shafts in the range, with as many harmonics each': (random) => [
    ...family(random, 24.2, [1, 2, 3, 4, 5, 6, 7, 8]),
    ...family(random, 25.3, [1, 2, 3, 4, 5, 6, 7, 8]),
  ],
  'nothing but mains of 50 Hz': (random) => family(random, 50.03, [1, 2, 3, 4, 5, 6, 8]),
  'nothing but mains of 50 Hz, and half of it': (random) => family(random, 50, [0.5, 1, 2, 3, 4, 6]),
  'no harmonics: noise': () => [],
  'no harmonics: a single tone at the nominal speed': (random) => family(random, 24.7, [1]),
  'two harmonics only': (random) => family(random, 24.9, [1, 2]),
  'the shaft turns 9 % slower than the range reaches': (random) =>
    family(random, 24.7 * 0.86, [1, 2, 3, 4, 5, 6, 7, 8, 9, 10]),
  'twelve tones anywhere': (random) =>
    Array.from({ length: 12 }, () => ({ hz: 10 + 490 * random.uniform(), amplitude: level(random) })),
};

function family(random: SeededRandom, hz: number, multiples: readonly number[]): Tone[] {
  return multiples.map((multiple) => ({ hz: multiple * hz, amplitude: level(random) }));
}

/** 20 to 40 dB over the floor of a line. */
function level(random: SeededRandom): number {
  return 0.3 * 10 ** random.uniform();
}

/** How many of so many seeds are not refused, with what was found. */
export function countAccepted(name: string, seeds: number): readonly string[] {
  const accepted: string[] = [];
  for (let seed = 1; seed <= seeds; seed++) {
    const random = seededRandom(seed);
    const tones = ambiguousMachines[name](random);
    const found = speedOf({ speedHz: Number.NaN, nominalHz: 24.7, tones }, random);
    if (!('refused' in found))
      accepted.push(
        `seed ${seed}: ${found.speedHz.toFixed(3)} Hz by ${found.harmonics.join(', ')}, next ${found.nextScore.toFixed(2)}`,
      );
  }
  return accepted;
}
