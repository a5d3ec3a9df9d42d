import type { Measurement } from '../manipulation/measurement.ts';
import type { Reader } from '../store/lent-connection.ts';
import { seriesOfPoint } from '../store/read-trends.ts';
import type { SiteView } from './site-view.ts';

/**
 * The measurements under the series that are there: where its own are new and those of a neighbouring rate are not, a
 * measurement joins these (series-beside.ts). Read inside the transaction, before anything is made of them.
 */
export async function onKnownSeries(
  reader: Reader,
  view: SiteView,
  measurements: readonly Measurement[],
): Promise<readonly Measurement[]> {
  const settled: Measurement[] = [];
  for (const measurement of measurements) {
    const { machineId, pointId, levels, seriesBeside = [] } = measurement;
    if (seriesBeside.length === 0 || levels.length === 0) {
      settled.push(measurement);
      continue;
    }
    const series = await seriesOfPoint(reader, view.ids.pointId(machineId, pointId));
    const known = new Set(series.map(({ fingerprint }) => fingerprint));
    const isNew = levels.every(({ fingerprint }) => !known.has(fingerprint));
    const joined = seriesBeside.find(({ fingerprints }) =>
      Object.values(fingerprints).some((fingerprint) => known.has(fingerprint)),
    );
    if (!isNew || joined === undefined) {
      settled.push(measurement);
      continue;
    }
    const { settingsFingerprint, fingerprints } = joined;
    settled.push({
      ...measurement,
      settingsFingerprint,
      levels: levels.map((level) => ({
        ...level,
        fingerprint: fingerprints[level.fingerprint] ?? level.fingerprint,
      })),
    });
  }
  return settled;
}
