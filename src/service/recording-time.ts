import { type ClockAnswer, readLoggerClock } from '../acquisition/logger-clock.ts';
import type { QualityFinding } from '../acquisition/recording.ts';
import { type RecordingStart, recordingStart } from '../acquisition/start-time.ts';
import type { Point } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';
import { findTakenByContent, type StoredRecording, takenBetween } from '../store/recordings.ts';
import type { Source } from '../store/sources.ts';
import type { SiteView } from './site-view.ts';
import type { ReadyRecording } from './verdicts.ts';

/** When a recording counts, and whether it takes part in detection. */
export interface RecordingTime {
  readonly start: RecordingStart;
  readonly usedMs: number;
  readonly clock: ClockAnswer;
  /** Earlier than the newest: kept, but it changes no state. */
  readonly late: boolean;
  /** Seen before under another name, without a start of its own. */
  readonly repeated: boolean;
  /** Another version of a recording that is there already and was whole. */
  readonly secondVersion: boolean;
  readonly findings: readonly QualityFinding[];
}

/** What the file says of its own start, in the clock of its logger. */
export function statedStart(
  view: SiteView,
  ready: ReadyRecording,
  previousMs: number | null,
): RecordingStart {
  const { header, look, sidecar } = ready.header;
  const [first] = ready.points as readonly [Point, ...Point[]];
  return recordingStart({
    sidecar: sidecar?.content.start ?? null,
    fileName: view.startInName(ready.path, ready.points),
    header: header.start,
    modifiedMs: look.mtimeMs,
    clock: first.recordings.clock,
    siteZone: view.site.timeZone,
    previousMs,
  });
}

/**
 * Starts of files that wait together, for their order. In the hour that comes twice, of two files of a source
 * with one reading the one that was changed later is the second.
 */
export function startsOf(view: SiteView, ready: readonly ReadyRecording[]): Map<ReadyRecording, number> {
  const changed = ({ header }: ReadyRecording) => header.look.mtimeMs;
  const inOrder = [...ready].sort((a, b) => changed(a) - changed(b) || (a.path < b.path ? -1 : 1));
  const taken = new Set<string>();
  const starts = new Map<ReadyRecording, number>();
  for (const one of inOrder) {
    const { startMs, otherMs } = statedStart(view, one, null);
    const reading = `${one.source}\n${startMs}`;
    starts.set(one, otherMs !== null && taken.has(reading) ? otherMs : startMs);
    taken.add(reading);
  }
  return starts;
}

/** Shortest expected interval, and shortest overdue span, of the points of a recording. */
export function spansOf(points: readonly Point[]): {
  readonly intervalMs: number;
  readonly overdueAfterMs: number;
} {
  return {
    intervalMs: Math.min(...points.map(({ recordings }) => recordings.expectedEveryMs)),
    overdueAfterMs: Math.min(...points.map(({ recordings }) => recordings.overdueAfterMs)),
  };
}

export interface TimeQuestion {
  readonly view: SiteView;
  readonly ready: ReadyRecording;
  readonly source: Source;
  readonly sha256: string;
  readonly start: RecordingStart;
  readonly batchNewestStatedMs: number;
}

export async function timeOf(reader: Reader, question: TimeQuestion): Promise<RecordingTime> {
  const { view, ready, source, start, sha256 } = question;
  const { intervalMs, overdueAfterMs } = spansOf(ready.points);
  const wantedMs = start.startMs + source.clockOffsetMs;
  const near = await takenBetween(reader, source.id, {
    fromMs: wantedMs - Math.floor(intervalMs / 2),
    toMs: wantedMs + Math.floor(intervalMs / 2),
    limit: 100,
  });
  const repeated = start.statedMs === null && (await findTakenByContent(reader, source.id, sha256)) !== null;
  // Nothing was evaluated for the overdue span: then what the clock rules make of it goes before all else.
  const evaluatedMs = source.lastEvaluatedArrivedMs;
  const blind = evaluatedMs !== null && ready.arrivedMs - evaluatedMs > overdueAfterMs;
  const first = repeated || blind ? undefined : versionBefore(near, start, ready.arrivedMs, intervalMs);
  if (first !== undefined && first.usedMs !== null) return inPlaceOf(first, first.usedMs, start, source);
  const clock = readLoggerClock(
    { ...source, offsetMs: source.clockOffsetMs },
    {
      statedMs: start.startMs,
      arrivedMs: ready.arrivedMs,
      batchNewestStatedMs: question.batchNewestStatedMs,
      intervalMs,
      overdueAfterMs,
      toleranceMs: view.site.timings.clockToleranceMs,
      nearestUsedMs: nearestUsed(near, wantedMs),
    },
  );
  const late = clock.late;
  const findings = findingsOf(clock, { late, repeated, start, source });
  return { start, usedMs: clock.usedMs, clock, late, repeated, secondVersion: false, findings };
}

/**
 * The recording of the same start that came at most half an interval before; the file is a second version of it. What
 * was a second version itself is nobody's first: a logger that states one start for ever would blind its point.
 */
function versionBefore(
  near: readonly StoredRecording[],
  start: RecordingStart,
  arrivedMs: number,
  intervalMs: number,
): StoredRecording | undefined {
  if (start.statedMs === null) return undefined;
  const within = (a: number, b: number) => Math.abs(a - b) <= intervalMs / 2;
  const same = near.filter(({ statedMs }) => statedMs === start.statedMs);
  let first: StoredRecording | undefined;
  for (const other of same.sort((a, b) => a.arrivedMs - b.arrivedMs))
    if (first === undefined || !within(other.arrivedMs, first.arrivedMs)) first = other;
  return first !== undefined && within(arrivedMs, first.arrivedMs) ? first : undefined;
}

/** A second version: evaluated only where the first was incomplete, and late where newer ones were evaluated since. */
function inPlaceOf(
  first: StoredRecording,
  usedMs: number,
  start: RecordingStart,
  source: Source,
): RecordingTime {
  const secondVersion = !first.quality.some(({ flag }) => flag === 'too-short' || flag === 'dropouts');
  const late = source.newestUsedMs !== null && usedMs < source.newestUsedMs;
  const clock: ClockAnswer = { usedMs, offsetMs: source.clockOffsetMs, late, trouble: 'none', flag: null };
  const findings = findingsOf(clock, { late, repeated: false, start, source });
  return { start, usedMs, clock, late, repeated: false, secondVersion, findings };
}

function nearestUsed(near: readonly StoredRecording[], wantedMs: number): number | null {
  const times = near.flatMap(({ usedMs }) => (usedMs === null ? [] : [usedMs]));
  if (times.length === 0) return null;
  return times.reduce((a, b) => (Math.abs(b - wantedMs) < Math.abs(a - wantedMs) ? b : a));
}

function findingsOf(
  clock: ClockAnswer,
  about: {
    readonly late: boolean;
    readonly repeated: boolean;
    readonly start: RecordingStart;
    readonly source: Source;
  },
): QualityFinding[] {
  const findings: QualityFinding[] = [];
  if (clock.flag !== null) {
    const minutes = Math.round(Math.abs(clock.offsetMs) / 60_000);
    const detail = `the logger's clock is ${minutes} min ${clock.offsetMs < 0 ? 'ahead' : 'behind'}; the recording counts from its arrival`;
    findings.push({ flag: clock.flag, detail });
  }
  if (about.late)
    findings.push({ flag: 'late', detail: 'it begins before the newest recording that was evaluated' });
  if (about.repeated) {
    findings.push({
      flag: 'repeated-content',
      detail: 'the same content came before under another name or time',
    });
  }
  return findings;
}
