import { describe, expect, it } from 'vitest';
import { overlapGain, recommendedOverlap } from '../../src/signal/overlap-gain.ts';
import type { WindowName } from '../../src/signal/window.ts';

/** Exactly 20 segment lengths, in steps that every overlap below divides. */
const gain = (window: WindowName, overlapPercent = 50) =>
  overlapGain(
    {
      window,
      overlapPercent,
      segmentSamples: 1200,
      skipStartS: 0,
      sampleRateHz: 1200,
      durationS: 20,
    },
    95,
  );

describe('what more overlap gives', () => {
  // Welch 1967, K / (1 + 2 sum (1 - m/K) rho_m²), computed for 24,000 samples in segments of 1200 with NumPy.
  it.each<[WindowName, readonly number[]]>([
    ['hann', [20, 25.997, 36.997, 40.335, 40.274, 40.011, 39.912]],
    ['hamming', [20, 25.964, 35.246, 36.876, 36.766, 36.526, 36.439]],
    ['rectangular', [20, 23.21, 26.224, 27.776, 28.335, 28.88, 28.917]],
    ['blackman-harris', [20, 26, 38.893, 51.797, 54.209, 54.009, 53.879]],
  ])('%s over 0, 25, 50, 66.7, 75, 90, 95 %%', (window, expected) => {
    const rows = gain(window);
    expect(rows.map(({ averages }) => averages)).toEqual([20, 26, 39, 58, 77, 191, 381]);
    rows.forEach(({ effectiveAverages }, n) => {
      expect(effectiveAverages / (expected[n] as number)).toBeCloseTo(1, 3);
    });
  });

  it('repeats data from 75 % on with hann, from 90 % on with blackman-harris, and shares are of the most', () => {
    const repeats = (window: WindowName) =>
      gain(window)
        .filter((row) => row.repeats)
        .map(({ overlapPercent }) => overlapPercent);
    expect(repeats('hann')).toEqual([75, 90, 95]);
    expect(repeats('blackman-harris')).toEqual([90, 95]);
    const [, , half, most] = gain('hann');
    expect(half?.shareOfMostPercent).toBeCloseTo((100 * 36.997) / 40.335, 1);
    expect(most?.shareOfMostPercent).toBe(100);
  });

  it('holds the overlap in use, once', () => {
    expect(gain('hann', 60).map(({ overlapPercent }) => overlapPercent)).toContain(60);
    expect(gain('hann', 67).filter(({ overlapPercent }) => Math.abs(overlapPercent - 67) < 1)).toHaveLength(
      1,
    );
  });

  it('is empty where not one segment fits', () => {
    const recording = { window: 'hann', overlapPercent: 50, segmentSamples: 4096, skipStartS: 0 } as const;
    expect(overlapGain({ ...recording, sampleRateHz: 1024, durationS: 3 }, 95)).toEqual([]);
  });

  it('and which overlap suits a window', () => {
    // Heinzel, Rüdiger & Schilling 2002, list of windows: Hann 50.0, Hamming 50.0, BH92 66.1, five-term flat tops 75.4.
    const found = (['hann', 'hamming', 'blackman-harris', 'flat-top'] as const).map(recommendedOverlap);
    expect(found).toEqual([50, 50, 66, 75]);
  });
});
