import { seededNoise } from '../../src/cli/demo/noise.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { sampleRateHz } from './bench-site.ts';

/** Seconds of signal that are averaged in a second of CPU, Hann, 50 %: the best of several runs over the same 60 s. */
export function averagingSpeed(segmentSamples: number): number {
  const signalS = 60;
  const noise = seededNoise(1);
  const samples = Float64Array.from({ length: signalS * sampleRateHz }, () => noise.gaussian());
  const settings = { window: 'hann', segmentSamples, overlapPercent: 50, sampleRateHz } as const;
  let bestS = Number.POSITIVE_INFINITY;
  for (let run = 0; run < 8; run++) {
    const before = process.cpuUsage();
    const { averages } = averageDensity(samples, settings);
    if (averages === 0) throw new Error('nothing was averaged');
    const { user, system } = process.cpuUsage(before);
    bestS = Math.min(bestS, (user + system) / 1e6);
  }
  return signalS / bestS;
}
