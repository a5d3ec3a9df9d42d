import { readFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import { type WindowName, windowNames } from '../../src/signal/window.ts';
import { type GoldenInput, goldenSamples } from './golden-samples.ts';

interface GoldenDensity {
  sample_rate_hz: number;
  inputs: Record<string, GoldenInput>;
  lines: Record<string, number[]>;
  cases: {
    window: WindowName;
    segment_samples: number;
    overlap_percent: number;
    input: string;
    samples: number;
    averages: number;
    largest: number;
    sum: number;
    density: number[];
  }[];
}

const golden: GoldenDensity = JSON.parse(
  readFileSync(new URL('../golden/density.json', import.meta.url), 'utf8'),
);
const longest = Math.max(...golden.cases.map(({ samples }) => samples));
const inputs = new Map(
  Object.entries(golden.inputs).map(([name, input]) => [name, goldenSamples(longest, input)]),
);

test.each(windowNames)(
  '%s density agrees with SciPy, segments of 256 to 16384, overlaps 0 to 90 %%',
  (window) => {
    const cases = golden.cases.filter((entry) => entry.window === window);
    expect(cases).toHaveLength(35);
    for (const entry of cases) {
      const samples = (inputs.get(entry.input) as Float64Array).subarray(0, entry.samples);
      const { density, averages } = averageDensity(samples, {
        window,
        segmentSamples: entry.segment_samples,
        overlapPercent: entry.overlap_percent,
        sampleRateHz: golden.sample_rate_hz,
      });
      const where = `${entry.segment_samples} samples, ${entry.overlap_percent} %`;
      expect(averages, where).toBe(entry.averages);
      const sum = density.reduce((total, value) => total + value, 0);
      expect(Math.abs(sum / entry.sum - 1), where).toBeLessThan(1e-12);
      golden.lines[entry.segment_samples].forEach((line, i) => {
        const expected = entry.density[i];
        const error = Math.abs(density[line] - expected);
        // Of the largest line, so little that even the side lobes of Blackman-Harris (1e-9) are held to 1e-5.
        const allowed = Math.max(1e-9 * expected, 1e-14 * entry.largest);
        expect(error, `${where}, line ${line}`).toBeLessThanOrEqual(allowed);
        if (expected > 1e-10 * entry.largest) {
          expect(error, `${where}, line ${line}`).toBeLessThanOrEqual(1e-11 * expected);
        }
      });
    }
  },
);
