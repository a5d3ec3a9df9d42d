import type { QualityFinding } from '../acquisition/recording.ts';
import { localDay } from '../config/local-time.ts';
import type { Band, Machine, Point } from '../config/site.ts';
import { conditionOf } from '../detection/condition.ts';
import {
  levelMarks,
  type PastLevels,
  type PastRecordings,
  recordingMarks,
} from '../detection/past-levels.ts';
import type { Ledger } from '../store/ledger.ts';
import {
  type PastMeasurement,
  type PlainLevel,
  pastLevels,
  pastMeasurements,
} from '../store/point-history.ts';
import { seriesOfPoint } from '../store/read-trends.ts';

/** Measurements of one page; with the levels of twelve bands some fifty thousand rows. */
const pageSize = 4000;

/** A band that is wanted, and what of its levels. */
export interface WantedBand {
  readonly band: Band;
  readonly bandLedgerId: number;
  readonly exceeded: boolean;
  readonly intervals: boolean;
}

export interface PointColumns {
  readonly recordings: PastRecordings;
  /** By id in the site file. */
  readonly levels: ReadonlyMap<string, PastLevels>;
}

/** The point's recordings and levels in [fromMs, toMs) as columns; operating conditions by this machine's list. */
export async function pointColumns(
  ledger: Ledger,
  of: { readonly machine: Machine; readonly point: Point; readonly pointLedgerId: number },
  bands: readonly WantedBand[],
  time: { readonly fromMs: number; readonly toMs: number; readonly dayOf: (usedMs: number) => number },
): Promise<PointColumns> {
  const { pointLedgerId: pointId } = of;
  const recordings = new RecordingColumns(of.machine, of.point);
  const columns = bands.map((one) => new LevelColumns(one));
  const series = await ledger.read((reader) => seriesOfPoint(reader, pointId));
  const bySeries = new Map(
    series.map(({ id, bandId }) => [id, columns.find(({ wanted }) => wanted.bandLedgerId === bandId)]),
  );
  const exceeded = bands.some((one) => one.exceeded);
  const intervals = bands.some((one) => one.intervals);
  for (let fromMs = time.fromMs; ; ) {
    const begunMs = fromMs;
    const page = await ledger.read(async (reader) => {
      const read = await pastMeasurements(reader, {
        pointId,
        fromMs: begunMs,
        toMs: time.toMs,
        limit: pageSize,
      });
      const isLast = read.length < pageSize;
      // Of one moment all or none are in a page.
      const endMs = isLast ? time.toMs : (read.at(-1)?.usedMs ?? time.toMs);
      const measurements = isLast ? read : read.filter(({ usedMs }) => usedMs < endMs);
      if (measurements.length === 0) return { measurements, levels: [], endMs, isLast };
      const range = { pointId, fromMs: begunMs, toMs: endMs, exceeded, intervals };
      return { measurements, levels: await pastLevels(reader, range), endMs, isLast };
    });
    const places = new Map<number, number>();
    for (const one of page.measurements) places.set(one.id, recordings.add(one, time.dayOf(one.usedMs)));
    for (const level of page.levels) {
      const at = places.get(level.measurementId);
      if (at !== undefined) bySeries.get(level.seriesId)?.add(level, at, recordings.trendOf(at, level.marks));
    }
    if (page.isLast) break;
    if (page.endMs === fromMs) throw new Error(`${pageSize} recordings of point ${pointId} at ${fromMs}`);
    fromMs = page.endMs;
  }
  const levels = new Map(columns.map((one) => [one.wanted.band.id, one.finish()]));
  return { recordings: recordings.finish(), levels };
}

class RecordingColumns {
  readonly #machine: Machine;
  readonly #pools: boolean;
  readonly #names: readonly string[];
  readonly #usedMs: number[] = [];
  readonly #day: number[] = [];
  readonly #marks: number[] = [];
  readonly #averages: number[] = [];
  readonly #speedHz: number[] = [];
  readonly #loadPercent: number[] = [];
  readonly #condition: number[] = [];
  /** 1: it ran outside all conditions of its day, which are not the ones asked for now. */
  readonly #wasOutside: boolean[] = [];

  constructor(machine: Machine, point: Point) {
    this.#machine = machine;
    this.#pools = point.analysis.averageOver !== undefined;
    const { conditions = [] } = machine;
    this.#names = conditions.length === 0 ? [''] : conditions.map(({ id }) => id);
  }

  /** Its place. */
  add(one: PastMeasurement, day: number): number {
    const runs = one.runs === 1;
    const flags = flagsOf(one.quality).concat(flagsOf(one.recordingQuality));
    const plain = flags.some((flag) => flag !== 'speed-doubtful');
    const good = one.quality === null;
    const judged = runs && one.evaluated === 1;
    const { judged: j, flagged, flaggedInOrders, onlyAtOnce, good: g } = recordingMarks;
    this.#usedMs.push(one.usedMs);
    this.#day.push(day);
    this.#marks.push(
      (judged ? j : 0) |
        (plain ? flagged : 0) |
        (flags.length > 0 ? flaggedInOrders : 0) |
        (this.#pools && one.pooledRecordings === null && flags.length === 0 ? onlyAtOnce : 0) |
        (good ? g : 0),
    );
    this.#averages.push(one.averages ?? 0);
    const measured = one.speedRpm !== null && one.nominal !== 1;
    this.#speedHz.push(measured ? (one.speedRpm ?? 0) / 60 : Number.NaN);
    this.#loadPercent.push(one.loadPercent ?? Number.NaN);
    this.#condition.push(runs ? this.#conditionOf(one) : -1);
    this.#wasOutside.push(judged && good && one.outside === 1);
    return this.#usedMs.length - 1;
  }

  /** Whether a level belongs to the trend in the conditions of this site file. */
  trendOf(at: number, marks: number): boolean {
    return this.#condition[at] >= 0 && ((marks & levelMarks.inTrend) !== 0 || this.#wasOutside[at]);
  }

  #conditionOf({ speedRpm: rpm, nominal, loadPercent }: PastMeasurement): number {
    // That it was measured is what counts, not how.
    const speed = rpm === null ? null : ({ rpm, origin: nominal === 1 ? 'nominal' : 'pulses' } as const);
    const found = conditionOf(this.#machine.conditions ?? [], { speed, loadPercent });
    return found === null ? -1 : this.#names.indexOf(found);
  }

  finish(): PastRecordings {
    return {
      usedMs: Float64Array.from(this.#usedMs),
      day: Int32Array.from(this.#day),
      marks: Uint8Array.from(this.#marks),
      averages: Float64Array.from(this.#averages),
      speedHz: Float64Array.from(this.#speedHz),
      loadPercent: Float64Array.from(this.#loadPercent),
      condition: Int16Array.from(this.#condition),
      conditions: this.#names,
    };
  }
}

function flagsOf(quality: string | null): string[] {
  return quality === null ? [] : (JSON.parse(quality) as QualityFinding[]).map(({ flag }) => flag);
}

class LevelColumns {
  readonly wanted: WantedBand;
  readonly #at: number[] = [];
  readonly #level: number[] = [];
  readonly #low: number[] = [];
  readonly #high: number[] = [];
  readonly #exceeded: number[] = [];
  readonly #marks: number[] = [];
  readonly #series: number[] = [];

  constructor(wanted: WantedBand) {
    this.wanted = wanted;
  }

  add(
    { level, intervalLow, intervalHigh, exceeded, marks, seriesId }: PlainLevel,
    at: number,
    inTrend: boolean,
  ) {
    this.#at.push(at);
    this.#level.push(level);
    this.#marks.push((marks & levelMarks.atLeast) | (inTrend ? levelMarks.inTrend : 0));
    this.#series.push(seriesId);
    if (this.wanted.exceeded) this.#exceeded.push(exceeded ?? Number.NaN);
    if (!this.wanted.intervals) return;
    this.#low.push(intervalLow ?? level);
    this.#high.push(intervalHigh ?? level);
  }

  finish(): PastLevels {
    const level = Float64Array.from(this.#level);
    const { intervals, exceeded } = this.wanted;
    return {
      at: Int32Array.from(this.#at),
      level,
      intervalLow: intervals ? Float64Array.from(this.#low) : level,
      intervalHigh: intervals ? Float64Array.from(this.#high) : level,
      exceeded: exceeded
        ? Float64Array.from(this.#exceeded)
        : new Float64Array(level.length).fill(Number.NaN),
      marks: Uint8Array.from(this.#marks),
      series: Int32Array.from(this.#series),
    };
  }
}

/** Local days, reckoned once a quarter of an hour: zones differ by whole quarters, and a year has millions of recordings. */
export function quarterDays(timeZone: string): (usedMs: number) => number {
  const days = new Map<number, number>();
  return (usedMs) => {
    const quarter = Math.floor(usedMs / 900_000);
    let day = days.get(quarter);
    if (day === undefined) {
      day = localDay(usedMs, timeZone);
      days.set(quarter, day);
    }
    return day;
  };
}
