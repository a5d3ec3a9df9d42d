import type { Band, Point } from '../config/site.ts';
import { type MeasuredEnvelope, measureEnvelope } from './measure-envelope.ts';
import { levelsOf, type MeasuredLevels, searchPeaks } from './measure-levels.ts';
import type { BandLevel, MeasuredSpeed, Measurement } from './measurement.ts';
import { gridOf } from './point-averaging.ts';
import { layFixedBands, layOrderBands } from './point-bands.ts';
import type { Pool } from './pooling.ts';

/**
 * What a pool says of its point: as the measurement of its newest recording, but with levels, intervals, peaks and
 * envelope of the average over all its recordings. Waveform values stay those of the newest recording. The running speed
 * is the mean over the recordings, and bands in orders are laid at it: within one operating condition it hardly moves.
 * How steady the segments of so many recordings are is not judged, and no single one of them proves a danger.
 *
 * `newest` is of the pool's fingerprint of settings; its levels name the series of the bands.
 */
export function pooledMeasurement(point: Point, newest: Measurement, pool: Pool): Measurement {
  const series = new Map(newest.levels.map(({ bandId, fingerprint }) => [bandId, fingerprint]));
  const known = { ...point, bands: point.bands.filter(({ id }) => series.has(id)) };
  const seriesOf = ({ id }: Band): string => series.get(id) ?? '';
  const speed = pooledSpeed(newest.speed, pool);
  const speedHz = speed && speed.rpm / 60;
  const plain = pooledPlain(known, pool, speedHz, seriesOf);
  const envelope = pooledEnvelope(known, newest, pool, speedHz, seriesOf);
  const place = ({ bandId }: BandLevel) => known.bands.findIndex(({ id }) => id === bandId);
  const { lineSpacingHz, density } = pool.density;
  const { share: _, orders: __, ...rest } = newest;
  return {
    ...rest,
    durationS: pool.durationS,
    speed,
    averaging: { ...plain.averaging, recordings: pool.segments.length },
    levels: [...plain.levels, ...(envelope?.levels ?? [])].sort((a, b) => place(a) - place(b)),
    peaks: plain.peaks,
    spectrum: { lineSpacingHz, density: Float32Array.from(density) },
    envelope: envelope?.envelope ?? null,
    evidence: [],
  };
}

function pooledPlain(
  point: Point,
  { averaging, density, segments }: Pool,
  speedHz: number | null,
  seriesOf: (band: Band) => string,
): MeasuredLevels {
  const grid = gridOf(averaging);
  const { falsePeaksPerSpectrum } = point.analysis;
  const laid = [...layFixedBands(point, grid).laid, ...layOrderBands(point, grid, speedHz).laid];
  return levelsOf({
    point,
    averaging,
    searched: searchPeaks(density, averaging, { falsePeaksPerSpectrum, averages: segments }),
    segments: null,
    bands: laid.map((one) => ({ laid: one, segmentPowers: [] })),
    speedHz,
    atLeast: false,
    seriesOf,
  });
}

function pooledEnvelope(
  point: Point,
  newest: Measurement,
  { envelope }: Pool,
  speedHz: number | null,
  seriesOf: (band: Band) => string,
): MeasuredEnvelope | null {
  if (envelope === null) return null;
  const { plan, density, segments: averages } = envelope;
  const shape = { point, plan, density, averages, segments: null, kurtogram: null, median: null };
  const measured = measureEnvelope({ ...shape, speedHz, atLeast: false, seriesOf });
  if (measured === null) return null;
  const recordings = averages.length;
  const { averaging } = measured.envelope;
  return {
    ...measured,
    envelope: {
      ...measured.envelope,
      averaging: { ...averaging, recordings },
      // Shocks are looked for in each recording by itself.
      candidate: newest.envelope?.candidate ?? null,
    },
  };
}

function pooledSpeed(newest: MeasuredSpeed | null, { speed }: Pool): MeasuredSpeed | null {
  if (newest === null || speed === null) return newest;
  const rpm = speed.rpmTimesSegments / speed.segments;
  const uncertaintyRpm = Math.max(rpm - speed.lowestRpm, speed.highestRpm - rpm);
  return { ...newest, rpm, uncertaintyRpm };
}

/** A recording that only waits in an open pool: its levels and peaks are in nobody's hands until the pool is judged. */
export function waitingMeasurement({ share: _, ...measurement }: Measurement): Measurement {
  return {
    ...measurement,
    averaging: null,
    levels: [],
    peaks: [],
    spectrum: null,
    orders: null,
    envelope: null,
    evidence: [],
    waits: true,
  };
}
