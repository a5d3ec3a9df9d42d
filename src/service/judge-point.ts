import type { QualityFlag } from '../acquisition/recording.ts';
import type { Point } from '../config/site.ts';
import { type AlarmChange, type AlarmState, subjectKey } from '../detection/alarm.ts';
import { type DetectionInput, detect } from '../detection/detect.ts';
import type { MachineState } from '../detection/machine-state.ts';
import { waitingMeasurement } from '../manipulation/measure-pooled.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import type { Writer } from '../store/lent-connection.ts';
import { limitSituations } from './limit-situations.ts';
import { type EndedPool, type Pooled, poolOf } from './pooled-point.ts';
import type { SiteView } from './site-view.ts';

/** One point's part in a recording, in its turn. */
export interface PointArrival {
  readonly view: SiteView;
  readonly point: Point;
  readonly measurement: Measurement;
  readonly machineState: MachineState;
  readonly readsStopped: boolean | null;
  readonly condition: string | null;
  readonly usedMs: number;
  readonly late: boolean;
  /** False for repeated content and for second versions: nothing is judged, nothing learned. */
  readonly judged: boolean;
  readonly recordingFlags: readonly QualityFlag[];
  /** Alarm states by `subjectKey`; what is missing is normal. */
  readonly earlier: ReadonlyMap<string, AlarmState>;
}

export interface PointJudged {
  /** The recording's own measurement, as it was judged. */
  readonly own: Measurement;
  /** What the ledger keeps of the recording. */
  readonly measurement: Measurement;
  readonly inTrend: boolean;
  readonly changes: readonly AlarmChange[];
  /** Null where the point does not pool, or the recording is not in its turn. */
  readonly pooled: Pooled | null;
  /** What a pool that ended before this recording did to the alarms, which comes before its own changes. */
  readonly ended: (EndedPool & { readonly changes: readonly AlarmChange[] }) | null;
}

/**
 * Judges a recording of one point. Where the point pools, a recording that enters the pool is itself held against
 * nothing but 'danger at once': its segments are proof enough or none. What is judged is the pool, when it is full
 * or has ended.
 */
export async function judgePoint(writer: Writer, arrival: PointArrival): Promise<PointJudged> {
  const { view, point, measurement, usedMs, judged, late, condition } = arrival;
  const { parts } = view.machine(point.machineId);
  const pools = point.analysis.averageOver !== undefined;
  const pooled =
    pools && judged && !late
      ? await poolOf(
          writer,
          view.ids.pointId(point.machineId, point.id),
          { point, parts },
          {
            measurement,
            usedMs,
            running: arrival.machineState === 'running',
            condition,
            flagged: measurement.quality.length > 0 || arrival.recordingFlags.length > 0,
          },
        )
      : null;
  let earlier = arrival.earlier;
  const judge = async (change: Partial<DetectionInput>): Promise<readonly AlarmChange[]> => {
    const input = { ...arrival, earlier, ...change };
    const { condition, usedMs } = input;
    const situations = await limitSituations(writer, view, point, input.measurement, { condition, usedMs });
    const changes = detect({ ...input, situations });
    earlier = new Map([
      ...earlier,
      ...changes.map(({ subject, state }) => [subjectKey(subject), state] as const),
    ]);
    return changes;
  };
  if (!judged)
    return { own: measurement, measurement, inTrend: false, changes: [], pooled: null, ended: null };
  const ended = pooled?.ended ?? null;
  const endedChanges =
    ended === null
      ? []
      : await judge({
          measurement: ended.measurement,
          machineState: 'running',
          condition: ended.condition,
          usedMs: ended.usedMs,
          recordingFlags: [],
          only: 'limits',
        });
  const entered = pooled?.step.entered === true;
  const own = await judge(entered ? { only: 'danger-at-once' } : {});
  const full = pooled?.full ?? null;
  const ofPool = full === null ? [] : await judge({ measurement: full, only: 'limits' });
  const waits = entered && full === null && own.length === 0;
  return {
    own: measurement,
    measurement: full ?? (waits ? waitingMeasurement(measurement) : withoutShare(measurement)),
    inTrend: condition !== null && (!pools || full !== null),
    changes: [...own, ...ofPool],
    pooled,
    ended: ended === null ? null : { ...ended, changes: endedChanges },
  };
}

function withoutShare({ share: _, ...measurement }: Measurement): Measurement {
  return measurement;
}
