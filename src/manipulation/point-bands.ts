import type { Band, Point } from '../config/site.ts';
import { type BandWeights, bandWeights, type LineGrid } from '../signal/band-level.ts';
import { integrationsBetween } from '../signal/integration.ts';
import { leastBandLines } from '../signal/window.ts';

/** A band of a point laid onto the lines of a spectrum. */
export interface LaidBand {
  readonly band: Band;
  readonly fromHz: number;
  readonly toHz: number;
  readonly weights: BandWeights;
}

/** A band that this recording cannot give a level for, and why. */
export interface UnlaidBand {
  readonly band: Band;
  readonly flag: 'wrong-rate' | 'speed-doubtful' | 'too-short';
  readonly reason: string;
}

export interface LaidBands {
  readonly laid: readonly LaidBand[];
  readonly unlaid: readonly UnlaidBand[];
}

/** What laying bands asks of a point. */
export type BandedPoint = Pick<Point, 'quantity' | 'bands'> & Partial<Pick<Point, 'analysis'>>;

/** Lays those of the point's bands that are in Hz onto the lines. Throws like `layBands`. */
export function layFixedBands(point: BandedPoint, grid: LineGrid): LaidBands {
  return layBands(point, grid, null, (band) => !band.inOrders && band.of !== 'envelope');
}

/**
 * Lays the point's bands in orders of the running speed (Hz; null or 0: unknown or at a standstill) onto the lines.
 * Throws like `layBands`.
 */
export function layOrderBands(point: BandedPoint, grid: LineGrid, speedHz: number | null): LaidBands {
  return layBands(point, grid, speedHz, (band) => band.inOrders && band.of !== 'envelope');
}

/** Lays the point's bands of the envelope onto its lines; up to `highestHz` it says something. */
export function layEnvelopeBands(
  point: BandedPoint,
  grid: LineGrid,
  speedHz: number | null,
  highestHz: number,
): LaidBands {
  const { laid, unlaid } = layBands(point, grid, speedHz, (band) => band.of === 'envelope');
  const reaching = ({ toHz }: LaidBand) => toHz <= highestHz * (1 + 1e-9);
  return {
    laid: laid.filter(reaching),
    unlaid: [
      ...unlaid,
      ...laid
        .filter((one) => !reaching(one))
        .map(
          ({ band, toHz }): UnlaidBand => ({
            band,
            flag: 'wrong-rate',
            reason: `no level of band ${band.id}: it ends at ${toHz} Hz, the envelope of this recording at ${highestHz} Hz`,
          }),
        ),
    ],
  };
}

/** Lower edge of the point's lowest band in velocity, Hz; null where it has none, or none that can be laid. */
export function lowestVelocityHz({ bands }: Pick<Point, 'bands'>, speedHz: number | null): number | null {
  const edges = bands
    .filter(({ quantity }) => quantity === 'velocity')
    .flatMap(({ from, inOrders }) => (inOrders ? (speedHz ? [from * speedHz] : []) : [from]));
  return edges.length === 0 ? null : Math.min(...edges);
}

/** Throws where a band's quantity cannot be had from the point's, which the site file's check refuses. */
function layBands(
  point: BandedPoint,
  grid: LineGrid,
  speedHz: number | null,
  wanted: (band: Band) => boolean,
): LaidBands {
  const laid: LaidBand[] = [];
  const unlaid: UnlaidBand[] = [];
  for (const band of point.bands.filter(wanted)) {
    const integrations = integrationsBetween(point.quantity, band.quantity);
    if (typeof integrations !== 'number') throw new Error(`band ${band.id}: ${integrations.reason}`);
    if (band.inOrders && !speedHz) {
      unlaid.push({
        band,
        flag: 'speed-doubtful',
        reason: `no level of band ${band.id}: it is in orders and the recording has no running speed`,
      });
      continue;
    }
    const perUnit = band.inOrders ? (speedHz as number) : 1;
    const [fromHz, toHz] = [band.from * perUnit, band.to * perUnit];
    const tooLow = tooLowForPool(point, fromHz, grid);
    if (tooLow !== null) {
      unlaid.push({ band, flag: 'too-short', reason: `no level of band ${band.id}: ${tooLow}` });
      continue;
    }
    const weights = bandWeights(fromHz, toHz, grid, integrations);
    if ('refused' in weights) {
      const flag = weights.refused === 'empty' ? 'too-short' : 'wrong-rate';
      unlaid.push({ band, flag, reason: `no level of band ${band.id}: ${weights.reason}` });
    } else {
      laid.push({ band, fromHz, toHz, weights });
    }
  }
  return { laid, unlaid };
}

/** Pooling adds averages, never resolution: where a band of pooled bursts begins too few lines above 0, why. */
function tooLowForPool(
  { analysis }: BandedPoint,
  fromHz: number,
  { lineSpacingHz }: LineGrid,
): string | null {
  if (analysis?.averageOver === undefined) return null;
  const least = leastBandLines(analysis.window);
  if (fromHz >= least * lineSpacingHz * (1 - 1e-9)) return null;
  return `it begins at ${fromHz} Hz, fewer than ${least} lines of ${lineSpacingHz} Hz above 0, which no pooling mends; begin it higher or record longer`;
}
