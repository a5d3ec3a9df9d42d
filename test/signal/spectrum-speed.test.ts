import { describe, expect, it } from 'vitest';
import { findSpeed, type SpeedFound } from '../../src/signal/spectrum-speed.ts';
import { seededRandom } from './random.ts';
import {
  ambiguousMachines,
  countAccepted,
  countFound,
  speedOf,
  speedSpectrum,
  type Tone,
  usualMachine,
  within,
} from './speed-trials.ts';

const harmonics = (hz: number, amplitudes: readonly number[]): Tone[] =>
  amplitudes.flatMap((amplitude, n) => (amplitude > 0 ? [{ hz: (n + 1) * hz, amplitude }] : []));

function found(answer: ReturnType<typeof findSpeed>): SpeedFound {
  if ('refused' in answer) throw new Error(answer.refused);
  return answer;
}

describe('the speed found in a spectrum', () => {
  it('is right to 0.1 % on 95 of 100 simulated machines up to 5 % off their nominal speed', () => {
    const { counts, missed } = countFound(100);
    expect(counts.right, missed.join('\n')).toBeGreaterThanOrEqual(95);
    expect(counts.wrong, missed.join('\n')).toBeLessThanOrEqual(1);
    expect(counts.inside).toBeGreaterThanOrEqual(0.95 * (counts.right + counts.wrong));
  });

  it('comes with its harmonics, a score, and how near the next speed comes', () => {
    const tones = harmonics(24.6, [1, 0.5, 0, 0.3, 0.3]);
    const speed = found(speedOf({ speedHz: 24.6, nominalHz: 24.7, tones }, seededRandom(2)));
    expect(speed.harmonics).toEqual([1, 2, 4, 5]);
    expect(Math.abs(speed.speedHz / 24.6 - 1)).toBeLessThan(5e-4);
    expect(speed.score).toBeGreaterThan(60);
    expect(speed.nextScore).toBeLessThan(0.5);
  });

  it('is found across the points of a machine where no point shows enough of it', () => {
    const trial = (multiples: readonly number[]) => ({
      speedHz: 24.6,
      nominalHz: 24.7,
      tones: multiples.map((n) => ({ hz: 24.6 * n, amplitude: 0.6 })),
    });
    const spectra = [[1, 4], [3], [2, 6]].map((multiples, n) =>
      speedSpectrum(trial(multiples), seededRandom(n)),
    );
    for (const one of spectra) expect(findSpeed([one], 24.7, within)).toHaveProperty('refused');
    const speed = found(findSpeed(spectra, 24.7, within));
    expect(speed.harmonics).toEqual([1, 2, 3, 4, 6]);
    expect(Math.abs(speed.speedHz / 24.6 - 1)).toBeLessThan(5e-4);
  });

  it('is the faster one where a wide range holds its half as well', () => {
    const tones = harmonics(31, [0.5, 0.5, 0.5, 0.3]);
    const spectrum = speedSpectrum({ speedHz: 31, nominalHz: 24, tones }, seededRandom(5));
    expect(Math.abs(found(findSpeed([spectrum], 24, 0.5)).speedHz / 31 - 1)).toBeLessThan(5e-4);
  });

  it('is found beside mains that none of its harmonics meets', () => {
    const tones = [...harmonics(24.63, [0.5, 0.4, 0.5, 0.3, 0.4, 0.4, 0.5]), { hz: 100.03, amplitude: 3 }];
    const speed = found(speedOf({ speedHz: 24.63, nominalHz: 25, tones }, seededRandom(6)));
    expect(Math.abs(speed.speedHz / 24.63 - 1)).toBeLessThan(1e-3);
  });

  it('is found beside the strong harmonics of a bearing, which meet only high multiples of another speed', () => {
    const bearing = harmonics(3.572 * 24.63, [2, 2, 2, 1.5, 1]);
    const tones = [...harmonics(24.63, [0.8, 0.7, 0.7, 0.6]), ...bearing];
    const speed = found(speedOf({ speedHz: 24.63, nominalHz: 24.7, tones }, seededRandom(7)));
    expect(Math.abs(speed.speedHz / 24.63 - 1)).toBeLessThan(1e-3);
  });

  it('is refused where the lines are too coarse for the shaft', () => {
    const { trial, random } = usualMachine(1);
    const spectrum = speedSpectrum(trial, random);
    expect(findSpeed([spectrum], 5, within)).toEqual({ refused: expect.stringContaining('too far apart') });
    expect(findSpeed([], 25, within)).toHaveProperty('refused');
  });
});

describe('a speed in the spectrum that is not the only one', () => {
  it.each(Object.keys(ambiguousMachines))('is refused: %s', (name) => {
    expect(countAccepted(name, 6)).toEqual([]);
  });
});
