import type { RecordingStart } from '../acquisition/start-time.ts';
import { looksDead } from '../detection/trouble.ts';
import { endAttempt, noteSeen } from '../store/intake-marks.ts';
import type { Writer } from '../store/lent-connection.ts';
import { findTaken, insertRecording, type StoredRecording } from '../store/recordings.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import { getSource, noteArrival, type Source, saveSource } from '../store/sources.ts';
import { insertMeasurement } from '../store/trends.ts';
import { noteEnvelopeChoices } from './envelope-choices.ts';
import { type Evaluated, evaluate } from './evaluate.ts';
import { onKnownSeries } from './known-series.ts';
import { learn } from './learn.ts';
import type { RecordingTime } from './recording-time.ts';
import { spansOf, statedStart, timeOf } from './recording-time.ts';
import { troublesOf } from './recording-troubles.ts';
import type { SiteView } from './site-view.ts';
import { keepPool, storeEnded } from './store-pooled.ts';
import {
  fileFindings,
  identityOf,
  looksOf,
  otherReading,
  recordingRow,
  remarkOf,
  type TakenFile,
} from './taken-file.ts';
import type { ReadyRecording } from './verdicts.ts';
import { followAll } from './watch-suppressions.ts';

/**
 * The one transaction of a recording: what it is (identity, version, repeat), when it counts (the logger's clock),
 * what it says (measurements), what that does (alarms, troubles), who is to be told, and where the file goes.
 */
export interface Decided {
  readonly recordingId: number;
  readonly outcome: 'taken' | 'repeat';
  readonly usedMs: number;
}

export async function decide(
  writer: Writer,
  view: SiteView,
  taken: TakenFile,
  wallMs: number,
): Promise<Decided> {
  const { ready, answer } = taken;
  const source = await getSource(writer, ready.source);
  const start = statedStart(view, ready, source.newestStatedMs);
  const identity = identityOf(taken, start.statedMs);
  const twin = (await findTaken(writer, identity)) ?? (await otherReading(writer, taken, start.otherMs));
  await endAttempt(writer, taken.fileKey);
  if (twin !== null) return repeat(writer, view, taken, { identity, source, start, twin });
  const { batchNewestStatedMs } = taken;
  const time = await timeOf(writer, {
    view,
    ready,
    source,
    sha256: answer.sha256,
    start,
    batchNewestStatedMs,
  });
  const judged = !time.repeated && !time.secondVersion;
  const measurements = await onKnownSeries(writer, view, answer.measurements);
  const evaluated = await evaluate(writer, {
    view,
    measurements,
    usedMs: time.usedMs,
    late: time.late,
    judged,
    recordingFlags: [...time.findings, ...fileFindings(taken)].map(({ flag }) => flag),
  });
  const row = recordingRow(view, taken, {
    identity,
    source,
    usedMs: time.usedMs,
    statedMs: start.statedMs,
    origin: start.origin,
  });
  const recordingId = await insertRecording(writer, {
    ...row,
    outcome: 'taken',
    reason: remarkOf(taken, time),
    evaluated: judged && !time.late,
    quality: [...row.quality, ...time.findings],
  });
  const context: ChangeContext = {
    ids: view.ids,
    wallMs,
    recordingId,
    actor: 'service',
    via: 'service',
    fromBacklog: isBacklog(ready, start.startMs),
  };
  for (const one of evaluated)
    await storeEvaluated(writer, view, one, { recordingId, time, judged, context });
  if (judged && !time.late)
    await noteEnvelopeChoices(writer, view, { measurements, evaluated, usedMs: Math.round(time.usedMs) });
  for (const change of await troublesOf(writer, taken, time, source))
    await saveAlarmChange(writer, change, context);
  if (answer.measurements.some(({ machineId }) => view.namedInSuppressions.has(machineId)))
    await followAll(writer, view, { ...context, recordingId: null });
  await noteArrivals(writer, view, taken, time, judged);
  await saveSource(writer, sourceAfter(source, taken, time, judged));
  await keepInPlace(writer, view, taken, recordingId);
  return { recordingId, outcome: 'taken', usedMs: time.usedMs };
}

/** The same recording came before: counted and filed, nothing else. */
async function repeat(
  writer: Writer,
  view: SiteView,
  taken: TakenFile,
  about: {
    readonly identity: string;
    readonly source: Source;
    readonly start: RecordingStart;
    readonly twin: StoredRecording;
  },
): Promise<Decided> {
  const { identity, source, start, twin } = about;
  const usedMs = twin.usedMs ?? start.startMs;
  const { statedMs, origin } = start;
  const recordingId = await insertRecording(writer, {
    ...recordingRow(view, taken, { identity, source, usedMs, statedMs, origin }),
    outcome: 'repeat',
    reason: `the same recording was taken before as ${twin.fileName}`,
    evaluated: false,
  });
  await keepInPlace(writer, view, taken, recordingId);
  return { recordingId, outcome: 'repeat', usedMs };
}

/** With `after_reading: keep` the ledger remembers what file and sidecar looked like, so that they are read once. */
async function keepInPlace(
  writer: Writer,
  view: SiteView,
  { ready, answer }: TakenFile,
  recordingId: number,
): Promise<void> {
  if (view.site.folders.afterReading !== 'keep' || ready.archived !== null) return;
  for (const { path, size, mtimeMs, ctimeMs } of looksOf(ready, answer.look))
    await noteSeen(writer, { path, sizeBytes: size, mtimeMs, ctimeMs, recordingId });
}

/** Older than two expected intervals when it arrived, or taken again from the archive. */
export function isBacklog(ready: ReadyRecording, startMs: number): boolean {
  return ready.archived !== null || ready.arrivedMs - startMs > 2 * spansOf(ready.points).intervalMs;
}

async function storeEvaluated(
  writer: Writer,
  view: SiteView,
  one: Evaluated,
  about: {
    readonly recordingId: number;
    readonly time: RecordingTime;
    readonly judged: boolean;
    readonly context: ChangeContext;
  },
): Promise<void> {
  const { recordingId, time, judged, context } = about;
  const usedMs = Math.round(time.usedMs);
  await storeEnded(writer, view, one, context);
  await insertMeasurement(writer, view.ids, {
    measurement: one.measurement,
    recordingId,
    usedMs,
    machineState: one.machineState,
    condition: one.condition,
    runningHours: one.runningHours,
    evaluated: judged && !time.late,
    inTrend: one.inTrend && !isOfDeadSensor(one),
    atAlarm: one.changes.some(({ journal }) => journal.length > 0),
  });
  for (const change of one.changes) await saveAlarmChange(writer, change, context);
  await keepPool(writer, view, one, recordingId);
  if (judged) await learn(writer, view, one.point, usedMs);
}

/** What a dead sensor sends is held against limits, but no median and no baseline learns from it. */
function isOfDeadSensor({ measurement, machineState }: Evaluated): boolean {
  const flags = measurement.quality.map(({ flag }) => flag);
  return looksDead(flags, machineState, measurement.waveform !== null)?.present === true;
}

async function noteArrivals(
  writer: Writer,
  view: SiteView,
  { ready, answer }: TakenFile,
  time: RecordingTime,
  judged: boolean,
): Promise<void> {
  for (const { machineId, pointId } of answer.measurements) {
    await noteArrival(writer, view.ids.pointId(machineId, pointId), {
      arrivedMs: Math.round(ready.arrivedMs),
      usedMs: Math.round(time.usedMs),
      evaluated: judged && !time.late,
    });
  }
}

function sourceAfter(source: Source, { ready }: TakenFile, time: RecordingTime, judged: boolean): Source {
  const evaluated = judged && !time.late;
  const stated = time.start.statedMs;
  return {
    ...source,
    clockOffsetMs: Math.round(time.clock.offsetMs),
    newestStatedMs:
      stated === null ? source.newestStatedMs : Math.max(stated, source.newestStatedMs ?? stated),
    newestUsedMs: evaluated
      ? Math.max(Math.round(time.usedMs), source.newestUsedMs ?? Number.NEGATIVE_INFINITY)
      : source.newestUsedMs,
    lastArrivedMs: Math.max(Math.round(ready.arrivedMs), source.lastArrivedMs ?? 0),
    lastEvaluatedArrivedMs: evaluated ? Math.round(ready.arrivedMs) : source.lastEvaluatedArrivedMs,
    repeatsInARow: time.repeated ? source.repeatsInARow + 1 : 0,
  };
}
