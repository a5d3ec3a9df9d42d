import { type Finding, findFaults, type ObservedSpeed } from '../../src/assessment/evidence.ts';
import type { SearchedSpectrum } from '../../src/assessment/standing-lines.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { demodulationOf, envelopeOf } from '../../src/signal/demodulation.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { type BearingMachine, sampleRateHz } from './bearing-machine.ts';

const band = { fromHz: 2000, toHz: 8000, highestHz: 2400 };
const falsePeaks = Number(process.env.FP ?? 5);

/** Lines of the envelope of the usual fixed band, at most 1/25 of the shaft speed apart. */
export function envelopeLines({ samples, declaredHz }: BearingMachine): SearchedSpectrum {
  const settings = { ...band, sampleRateHz };
  const { envelopeRateHz } = demodulationOf(settings);
  const envelope = envelopeOf(samples, settings);
  const segmentSamples =
    2 ** Math.ceil(Math.log2((25 * envelopeRateHz * Number(process.env.FINER ?? 1)) / declaredHz));
  const averaging = {
    window: 'hann',
    segmentSamples,
    overlapPercent: 50,
    sampleRateHz: envelopeRateHz,
  } as const;
  const averaged = averageDensity(envelope, averaging);
  const { peaks } = findPeaks(averaged.density, {
    ...averaging,
    hopSamples: averaged.hopSamples,
    averages: averaged.averages,
    falsePeaksPerSpectrum: falsePeaks,
  });
  const { lineSpacingHz } = averaged;
  return { lines: peaks, lineSpacingHz, fromHz: 4 * lineSpacingHz, toHz: band.highestHz };
}

export function findingsOf(machine: BearingMachine, speed: ObservedSpeed): Finding[] {
  const shafts = [{ ...speed, harmonics: Number.POSITIVE_INFINITY }];
  return findFaults(envelopeLines(machine), [machine.bearing], speed, shafts);
}
