import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { hashingSource } from '../../src/acquisition/byte-source.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { isRefusal } from '../../src/acquisition/recording.ts';
import { SampleQuality } from '../../src/acquisition/sample-quality.ts';
import type { Point } from '../../src/config/site.ts';
import { layBands } from '../../src/manipulation/point-bands.ts';
import { openRegularFile } from '../../src/service/file-source.ts';
import work from '../../src/service/recording-worker.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { bandInterval, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { waveformValues } from '../../src/signal/waveform.ts';
import { durationS, makeSite, sampleRateHz } from './bench-site.ts';

/** Milliseconds of CPU for a recording. */
export interface StageTimes {
  readonly [stage: string]: number;
}

const segmentSamples = 16_384;
const hop = segmentSamples / 2;

/** Every stage of reading a recording by itself, then all of them as the worker thread does them. */
export function stageTimes(bytes: readonly Uint8Array[]): StageTimes {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-bench-'));
  try {
    const paths = bytes.map((file, index) => {
      const path = join(folder, `${index}.wav`);
      writeFileSync(path, file);
      return path;
    });
    const point = makeSite(folder).site.machines[0]?.points[0] as Point;
    return measured(paths, point);
  } finally {
    rmSync(folder, { recursive: true });
  }
}

function measured(paths: readonly string[], point: Point): StageTimes {
  const samples = paths.map(readSamples);
  const averaged = samples.map((values) => averageDensity(values, averaging));
  const { averages } = averaged[0] as (typeof averaged)[0];
  const shape = { window: 'hann', segmentSamples, hopSamples: hop, averages, sampleRateHz } as const;
  const found = averaged.map(({ density }) => findPeaks(density, shape).peaks);
  const kernel = makeIntervalKernel('hann', segmentSamples, hop, averages);
  const grid = { lineSpacingHz: sampleRateHz / segmentSamples, lines: hop + 1 };
  const each = (stage: (index: number) => unknown) => cpuMsEach(paths.length, stage);
  return {
    'read, hash, decode': each((index) => readSamples(paths[index] as string)),
    'sample quality': each((index) => checkSamples(samples[index] as Float64Array)),
    'waveform values': each((index) => waveformValues(samples[index] as Float64Array)),
    averaging: each((index) => averageDensity(samples[index] as Float64Array, averaging)),
    peaks: each((index) => findPeaks((averaged[index] as (typeof averaged)[0]).density, shape)),
    'six bands with intervals': each((index) => {
      const tones = (found[index] ?? []).filter(({ kind }) => kind === 'tone');
      for (const { weights } of layBands(point, grid, null).laid)
        bandInterval((averaged[index] as (typeof averaged)[0]).density, weights, kernel, tones);
    }),
    'whole task of the thread': each((index) => measureTask(paths[index] as string, point)),
  };
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
    lowestVelocityHz: 10,
    speedHz: 1480 / 60,
  });
  check.add(samples);
  check.finish(null);
}

function measureTask(path: string, point: Point): void {
  const file = openRegularFile(path, Number.MAX_SAFE_INTEGER);
  if ('reason' in file) throw new Error(file.reason);
  file.close();
  const points = [{ point, nominalHz: 1480 / 60 }];
  const largestBytes = Number.MAX_SAFE_INTEGER;
  const answer = work({ task: 'measure', path, largestBytes, seen: file.first, sidecar: null, points });
  if (answer.kind !== 'measured') throw new Error(`${path}: ${answer.kind}`);
}

/** CPU time, in the best of several rounds over all files: both keep out what else the machine does meanwhile. */
function cpuMsEach(files: number, stage: (index: number) => unknown): number {
  let best = Number.POSITIVE_INFINITY;
  for (let round = 0; round < 6; round++) {
    const before = process.cpuUsage();
    for (let index = 0; index < files; index++) stage(index);
    const { user, system } = process.cpuUsage(before);
    best = Math.min(best, (user + system) / 1000 / files);
  }
  return best;
}
