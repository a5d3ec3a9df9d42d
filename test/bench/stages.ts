import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { hashingSource } from '../../src/acquisition/byte-source.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { isRefusal } from '../../src/acquisition/recording.ts';
import { SampleQuality } from '../../src/acquisition/sample-quality.ts';
import type { Band, Point } from '../../src/config/site.ts';
import { EnvelopeRun, envelopePlan } from '../../src/manipulation/envelope-plan.ts';
import { measureEnvelope } from '../../src/manipulation/measure-envelope.ts';
import { layFixedBands } from '../../src/manipulation/point-bands.ts';
import { openRegularFile } from '../../src/service/file-source.ts';
import work from '../../src/service/recording-worker.ts';
import { type AveragedDensity, averageDensity } from '../../src/signal/averaging.ts';
import { bandInterval, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { findPeaks, type PeakSearch } from '../../src/signal/peaks.ts';
import { SegmentSpectra } from '../../src/signal/segment-spectra.ts';
import { steadiness } from '../../src/signal/steadiness.ts';
import { waveformValues } from '../../src/signal/waveform.ts';
import { durationS, makeSite, sampleRateHz } from './bench-site.ts';

/** Milliseconds of CPU for a recording. */
export interface StageTimes {
  readonly [stage: string]: number;
}

const segmentSamples = 16_384;
const hop = segmentSamples / 2;

/** Every stage of reading a recording by itself, then all of them as the worker thread does them. */
export async function stageTimes(bytes: readonly Uint8Array[]): Promise<StageTimes> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-bench-'));
  try {
    const paths = bytes.map((file, index) => {
      const path = join(folder, `${index}.wav`);
      writeFileSync(path, file);
      return path;
    });
    const point = makeSite(folder).site.machines[0]?.points[0] as Point;
    return await measured(paths, point);
  } finally {
    rmSync(folder, { recursive: true });
  }
}

interface Prepared {
  readonly path: string;
  readonly samples: Float64Array;
  readonly averaged: AveragedDensity;
  readonly segments: SegmentSpectra;
  readonly search: PeakSearch;
}

async function measured(paths: readonly string[], point: Point): Promise<StageTimes> {
  const files = paths.map(prepared);
  const { averages } = (files[0] as Prepared).averaged;
  const kernel = makeIntervalKernel('hann', segmentSamples, hop, averages);
  const grid = { lineSpacingHz: sampleRateHz / segmentSamples, lines: hop + 1 };
  const { laid } = layFixedBands(point, grid);
  const each = (stage: (file: Prepared) => unknown) => cpuMsEach(files, stage);
  return {
    'read, hash, decode': await each(({ path }) => readSamples(path)),
    'sample quality': await each(({ samples }) => checkSamples(samples)),
    'waveform values': await each(({ samples }) => waveformValues(samples)),
    averaging: await each(({ samples }) => averageDensity(samples, averaging)),
    'each segment kept':
      (await each(({ samples }) => segmentsOf(samples))) -
      (await each(({ samples }) => averageDensity(samples, averaging))),
    peaks: await each(({ averaged }) => findPeaks(averaged.density, shapeOf(averages))),
    steadiness: await each(({ segments, search }) => steadiness(segments, search, shapeOf(averages))),
    'six bands with intervals': await each(({ averaged, search }) => {
      const tones = search.peaks.filter(({ kind }) => kind === 'tone');
      for (const { weights } of laid) bandInterval(averaged.density, weights, kernel, tones);
    }),
    'envelope, its level and peaks (not of the task)': await each(({ samples }) =>
      envelopeStage(samples, point, 'fixed'),
    ),
    'the same, and its band looked for': await each(({ samples }) =>
      envelopeStage(samples, point, 'kurtosis'),
    ),
    'whole task of the thread': await each(({ path }) => measureTask(path, point)),
  };
}

function prepared(path: string): Prepared {
  const samples = readSamples(path);
  const { averaged, segments } = segmentsOf(samples);
  return {
    path,
    samples,
    averaged,
    segments,
    search: findPeaks(averaged.density, shapeOf(averaged.averages)),
  };
}

function shapeOf(averages: number) {
  return { window: 'hann', segmentSamples, hopSamples: hop, averages, sampleRateHz } as const;
}

function segmentsOf(samples: Float64Array): { averaged: AveragedDensity; segments: SegmentSpectra } {
  const segments = new SegmentSpectra(hop + 1);
  return { averaged: averageDensity(samples, averaging, (density) => segments.add(density)), segments };
}

const averaging = { window: 'hann', segmentSamples, overlapPercent: 50, sampleRateHz } as const;

function readSamples(path: string): Float64Array {
  const file = openRegularFile(path, Number.MAX_SAFE_INTEGER);
  if ('reason' in file) throw new Error(file.reason);
  const hash = createHash('sha256');
  const source = hashingSource(file.source, (part) => hash.update(part));
  const header = wavReader.header(source);
  if (isRefusal(header)) throw new Error(header.reason);
  const all = new Float64Array(durationS * sampleRateHz);
  const blocks = wavReader.samples(source, header);
  for (const { channels, firstFrame } of blocks) all.set(channels[0] as Float64Array, firstFrame);
  source.finish();
  hash.digest('hex');
  file.close();
  return all;
}

function checkSamples(samples: Float64Array): void {
  const check = new SampleQuality({
    samples: 'integer',
    sampleRateHz,
    quantity: 'acceleration',
    voltsPerSample: 5,
  });
  check.add(samples);
  check.finish(null, { lowestVelocityHz: 10, speedHz: 1480 / 60 });
}

function envelopeStage(samples: Float64Array, plain: Point, choose: 'fixed' | 'kurtosis'): void {
  const band: Band = {
    ...(plain.bands[0] as Band),
    of: 'envelope',
    quantity: 'acceleration',
    from: 20,
    to: 400,
  };
  const envelope = { band: null, choose, lineSpacingHz: 2, highestHz: band.to };
  const point: Point = { ...plain, bands: [band], envelope };
  const plan = envelopePlan(point, sampleRateHz, null);
  if (plan === null) throw new Error('no envelope');
  const run = new EnvelopeRun(plan);
  run.add(samples);
  const result = run.finish();
  const { averages } = result.density;
  measureEnvelope({ ...result, point, averages, speedHz: null, atLeast: false, seriesOf: () => '' });
}

async function measureTask(path: string, point: Point): Promise<void> {
  const file = openRegularFile(path, Number.MAX_SAFE_INTEGER);
  if ('reason' in file) throw new Error(file.reason);
  file.close();
  const points = [{ point, nominalHz: 1480 / 60 }];
  const largestBytes = Number.MAX_SAFE_INTEGER;
  const answer = await work({ task: 'measure', path, largestBytes, seen: file.first, sidecar: null, points });
  if (answer.kind !== 'measured') throw new Error(`${path}: ${answer.kind}`);
}

/** CPU time, in the best of several rounds over all files: both keep out what else the machine does meanwhile. */
async function cpuMsEach(files: readonly Prepared[], stage: (file: Prepared) => unknown): Promise<number> {
  let best = Number.POSITIVE_INFINITY;
  for (let round = 0; round < 6; round++) {
    const before = process.cpuUsage();
    for (const file of files) await stage(file);
    const { user, system } = process.cpuUsage(before);
    best = Math.min(best, (user + system) / 1000 / files.length);
  }
  return best;
}
