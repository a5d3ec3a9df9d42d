import type { Point } from '../config/site.ts';
import { levelsOf, searchPeaks } from './measure-levels.ts';
import type { MeasuredSpeed, Measurement } from './measurement.ts';
import { gridOf } from './point-averaging.ts';
import { layFixedBands, layOrderBands } from './point-bands.ts';
import type { Pool } from './pooling.ts';

/**
 * What a pool says of its point: as the measurement of its newest recording, but with levels, intervals and peaks of the
 * average over all its recordings. Waveform values stay those of the newest recording; the running speed is the mean.
 * How steady the segments of so many recordings are is not judged, and no single one of them proves a danger.
 * `newest` is of the pool's fingerprint of settings; its levels name the series of the bands.
 */
export function pooledMeasurement(point: Point, newest: Measurement, pool: Pool): Measurement {
  const { averaging, density, segments } = pool;
  const speed = pooledSpeed(newest.speed, pool);
  const speedHz = speed && speed.rpm / 60;
  const grid = gridOf(averaging);
  const { falsePeaksPerSpectrum } = point.analysis;
  const searched = searchPeaks(density, averaging, { falsePeaksPerSpectrum, averages: segments });
  const series = new Map(newest.levels.map(({ bandId, fingerprint }) => [bandId, fingerprint]));
  const laid = [...layFixedBands(point, grid).laid, ...layOrderBands(point, grid, speedHz).laid]
    .filter(({ band }) => series.has(band.id))
    .sort((a, b) => point.bands.indexOf(a.band) - point.bands.indexOf(b.band));
  const measured = levelsOf({
    point,
    averaging,
    searched,
    segments: null,
    bands: laid.map((band) => ({ laid: band, segmentPowers: [] })),
    speedHz,
    atLeast: false,
    seriesOf: ({ id }) => series.get(id) as string,
  });
  const { share: _, ...plain } = newest;
  return {
    ...plain,
    durationS: pool.durationS,
    speed,
    averaging: { ...measured.averaging, recordings: segments.length },
    levels: measured.levels,
    peaks: measured.peaks,
    spectrum: { lineSpacingHz: density.lineSpacingHz, density: Float32Array.from(density.density) },
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
  return { ...measurement, averaging: null, levels: [], peaks: [], spectrum: null };
}
