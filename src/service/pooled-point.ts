import type { Part } from '../config/parts.ts';
import type { Point } from '../config/site.ts';
import { pooledMeasurement } from '../manipulation/measure-pooled.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { type Pool, type PoolArrival, type PoolStep, poolStep } from '../manipulation/pooling.ts';
import type { Writer } from '../store/lent-connection.ts';
import { loadPool, type PoolNewest } from '../store/pooling.ts';
import { assessedPool } from './assess-measurement.ts';

/** What a recording does to the pool of its point; the rules are those of pooling.ts. */
export interface Pooled {
  readonly step: PoolStep;
  /** What the pool says that this recording filled. */
  readonly full: Measurement | null;
  /** A pool that ended before this recording, judged as it stands, with its newest recording. */
  readonly ended: EndedPool | null;
}

export interface EndedPool {
  readonly measurement: Measurement;
  readonly usedMs: number;
  readonly condition: string | null;
  readonly newest: PoolNewest;
}

/** A recording in its turn; nothing is stored yet. Null where the point does not pool. */
export async function poolOf(
  writer: Writer,
  pointId: number,
  { point, parts }: { readonly point: Point; readonly parts: readonly Part[] | undefined },
  arrival: PoolArrival,
): Promise<Pooled | null> {
  const { averageOver } = point.analysis;
  if (averageOver === undefined) return null;
  const { expectedEveryMs, overdueAfterMs } = point.recordings;
  const open = await loadPool(writer, pointId);
  const step = poolStep(open?.pool ?? null, arrival, { averageOver, expectedEveryMs, overdueAfterMs });
  const said = (newest: Measurement, pool: Pool) =>
    assessedPool(pooledMeasurement(point, newest, pool), parts);
  return {
    step,
    full: step.full === null ? null : said(arrival.measurement, step.full),
    ended:
      step.ended === null || open === null
        ? null
        : {
            measurement: said(open.newest.measurement, step.ended),
            usedMs: step.ended.newestUsedMs,
            condition: step.ended.condition,
            newest: open.newest,
          },
  };
}
