import type { Band, Limit, Machine, Point } from '../config/site.ts';
import { nothingKnown } from '../detection/thresholds.ts';
import { baselinesOf } from '../store/baselines.ts';
import { conditionNames } from '../store/conditions.ts';
import type { Reader } from '../store/lent-connection.ts';
import { conditionOfStored, type LimitInForce, limitInForce } from './limits-in-force.ts';
import type { TrendRow } from './trend-of-band.ts';

/**
 * The limits of a band for each row of its trend: by the row's speed, load and operating condition, and by the baselines
 * as they are now (what a baseline was at the time is not kept). A rate is not looked at: it belongs to a stretch of rows.
 */
export async function limitsOverTime(
  reader: Reader,
  of: {
    readonly machine: Machine;
    readonly point: Point;
    readonly band: Band;
    readonly seriesIds: readonly number[];
  },
): Promise<(row: TrendRow) => readonly LimitInForce[]> {
  const { machine, band } = of;
  const limits = of.point.limits.filter(({ bandId }) => bandId === band.id);
  const reckoned = limits.some(({ rule }) => rule !== undefined);
  const names = reckoned ? await conditionNames(reader) : new Map<number, string>();
  const known = new Map(
    (reckoned ? await baselinesOf(reader, of.seriesIds) : []).map((one) => [
      `${one.seriesId} ${names.get(one.conditionId) ?? ''}`,
      one,
    ]),
  );
  return (row) => {
    const condition = conditionOfStored(machine, row);
    const speedHz = row.speedMeasured && row.speedRpm !== null ? row.speedRpm / 60 : null;
    const baseline = known.get(`${row.seriesId} ${condition}`) ?? null;
    const { level, loadPercent } = row;
    const situation = { ...nothingKnown, baseline, speedHz, loadPercent };
    return limits.map((limit) =>
      isRate(limit)
        ? { limit, now: { unknown: 'it judges the line through the levels, not one of them' } }
        : limitInForce(limit, { condition, level, situation }, band.display),
    );
  };
}

function isRate({ rule }: Limit): boolean {
  return rule?.by === 'rate';
}
