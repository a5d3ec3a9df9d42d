import type { Band, Point } from '../config/site.ts';
import { type BandWeights, bandWeights, type LineGrid } from '../signal/band-level.ts';
import { integrationsBetween } from '../signal/integration.ts';

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

/**
 * Lays the point's bands onto the lines; bands in orders follow the running speed (Hz; null or 0: unknown or at a
 * standstill). Throws where a band's quantity cannot be had from the point's, which the site file's check refuses.
 */
export function layBands(
  point: Pick<Point, 'quantity' | 'bands'>,
  grid: LineGrid,
  speedHz: number | null,
): { readonly laid: readonly LaidBand[]; readonly unlaid: readonly UnlaidBand[] } {
  const laid: LaidBand[] = [];
  const unlaid: UnlaidBand[] = [];
  for (const band of point.bands) {
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
