import { averageDensity, hopSamples } from '../../src/signal/averaging.ts';
import { bandInterval, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { type BandWeights, bandWeights } from '../../src/signal/band-level.ts';
import type { Integrations } from '../../src/signal/integration.ts';
import { mainLobeHalfWidthLines, type WindowName } from '../../src/signal/window.ts';
import { gaussianNoise, seededRandom } from './random.ts';

export interface CoverageCase {
  readonly window: WindowName;
  /** Segments of one recording, or of each of several that are pooled. */
  readonly averages: number | readonly number[];
  readonly overlapPercent: number;
  /** Whole lines from `firstLine` on. */
  readonly bandLines: readonly number[];
  readonly firstLine?: number;
  readonly integrations?: Integrations;
  /** A steady tone of random phase that lies anywhere between two lines of the bands. */
  readonly tone?: { readonly fromLine: number; readonly toLine: number; readonly dbOverFloorLine: number };
  readonly recordings: number;
  readonly seed: number;
}

const segmentSamples = 512;
/** With as many samples a second as in a segment, lines lie 1 Hz apart. */
const sampleRateHz = segmentSamples;
/** White noise of variance 1 has the density 2 / sample rate. */
const floorDensity = 2 / sampleRateHz;

/** Share of recordings, in percent, whose 95 % interval holds the true level; one figure a band. */
export function intervalCoverage(cases: CoverageCase): number[] {
  const { window, averages, overlapPercent, tone, firstLine = 20, integrations = 0 } = cases;
  const random = seededRandom(cases.seed);
  const hop = hopSamples(segmentSamples, overlapPercent);
  const kernel = makeIntervalKernel(window, segmentSamples, hop, averages);
  const parts = typeof averages === 'number' ? [averages] : averages;
  const bands = cases.bandLines.map((lines) => bandOf(firstLine, lines, integrations));
  const half = mainLobeHalfWidthLines(window);
  const hits = bands.map(() => 0);
  for (let recording = 0; recording < cases.recordings; recording++) {
    const tonePower = tone ? floorDensity * 10 ** (tone.dbOverFloorLine / 10) : 0;
    const toneLine = tone ? tone.fromLine + (tone.toLine - tone.fromLine) * random.uniform() : 0;
    const middle = Math.round(toneLine);
    const tones = tone ? [{ firstLine: middle - half, lastLine: middle + half, floorDensity }] : [];
    const density = new Float64Array(segmentSamples / 2 + 1);
    const total = parts.reduce((sum, part) => sum + part, 0);
    for (const part of parts) {
      const samples = gaussianNoise(random, segmentSamples + (part - 1) * hop);
      if (tone) addTone(samples, toneLine, Math.sqrt(2 * tonePower), 2 * Math.PI * random.uniform());
      const averaged = averageDensity(samples, { window, segmentSamples, overlapPercent, sampleRateHz });
      for (let k = 0; k < density.length; k++) density[k] += (averaged.density[k] * part) / total;
    }
    bands.forEach((band, i) => {
      const { low, high } = bandInterval(density, band, kernel, tones);
      const noise = band.weights.reduce((sum, weight) => sum + weight * floorDensity, 0);
      const truth = Math.sqrt(noise + tonePower);
      if (low <= truth && truth <= high) hits[i]++;
    });
  }
  return hits.map((count) => (100 * count) / cases.recordings);
}

function bandOf(firstLine: number, lines: number, integrations: Integrations): BandWeights {
  const grid = { lineSpacingHz: 1, lines: segmentSamples / 2 + 1 };
  const band = bandWeights(firstLine - 0.5, firstLine - 0.5 + lines, grid, integrations);
  if ('refused' in band) throw new Error(band.reason);
  return band;
}

function addTone(samples: Float64Array, line: number, amplitude: number, phase: number): void {
  for (let n = 0; n < samples.length; n++) {
    samples[n] += amplitude * Math.cos((2 * Math.PI * line * n) / segmentSamples + phase);
  }
}
