import { join } from 'node:path';
import type { QualityFinding } from '../../acquisition/recording.ts';
import { pointMeaning } from '../../config/meaning.ts';
import { type Band, type Machine, type Point, pointPath, type Site } from '../../config/site.ts';
import { anyCondition } from '../../detection/condition.ts';
import { readingOf } from '../../detection/machine-state.ts';
import { nothingKnown } from '../../detection/thresholds.ts';
import type { Averaging, BandLevel } from '../../manipulation/measurement.ts';
import { type LimitInForce, limitsOfMeasured, pointLimits } from '../../service/limits-in-force.ts';
import type { DropLook, Waiting } from './drop-look.ts';
import type { FileLevels } from './file-levels.ts';
import type { LedgerPoint } from './ledger-look.ts';
import type { PointAdvice, RecordingAdviser } from './recording-advice.ts';

/** A level with its interval, SI r.m.s. */
export type LevelNow = Pick<
  BandLevel,
  'level' | 'intervalLow' | 'intervalHigh' | 'confidencePercent' | 'atLeast'
>;

export interface BandCheck {
  readonly band: Band;
  readonly now: LevelNow | null;
  /** Where they stand for that level. */
  readonly limits: readonly LimitInForce[];
  /** False: the machine stood still, and a level of standstill says nothing of its limits. */
  readonly judged: boolean;
}

/** Segment, lines and averages: of the newest recording, or as the site file's rate and duration have it. */
export interface AveragingCheck {
  readonly from: 'recording' | 'site file';
  readonly window: string;
  readonly overlapPercent: number;
  readonly sampleRateHz: number;
  readonly segmentSamples: number;
  readonly lineSpacingHz: number;
  readonly averages: number;
  readonly effectiveAverages: number;
  readonly usedPercent: number;
  /** Recordings that were pooled; left out: the one. */
  readonly recordings?: number;
}

export interface PointCheck {
  readonly point: Point;
  readonly waiting: Waiting | null;
  readonly ledger: LedgerPoint | null;
  /** Where the levels come from; null: there are none. */
  readonly from: 'ledger' | 'file' | null;
  /** Start of the recording they are of. */
  readonly usedMs: number | null;
  readonly bands: readonly BandCheck[];
  readonly averaging: AveragingCheck | null;
  readonly quality: readonly QualityFinding[];
  /** Why there are no levels, or what is doubtful about them. */
  readonly remark: string | null;
  /** What its recordings can and cannot show; null: nothing says how they are made. */
  readonly advice: PointAdvice | null;
}

interface Found {
  /** The machine stood still in the recording. */
  readonly stopped: boolean;
  readonly from: PointCheck['from'];
  readonly usedMs: number | null;
  readonly levels: ReadonlyMap<string, LevelNow>;
  readonly limits: readonly LimitInForce[];
  readonly averaging: AveragingCheck | null;
  readonly quality: readonly QualityFinding[];
  readonly remark: string | null;
}

/**
 * A point with its levels now: from the ledger where those were made under today's settings, else from the newest file
 * found, else the ledger's all the same.
 */
export async function checkPoint(
  site: Site,
  point: Point,
  known: {
    readonly drop: DropLook;
    readonly ledger: LedgerPoint | null;
    readonly files: FileLevels;
    readonly adviser: RecordingAdviser;
  },
): Promise<PointCheck> {
  const { ledger } = known;
  const machine = site.machines.find(({ id }) => id === point.machineId);
  const waiting = known.drop.waiting.get(pointPath(point)) ?? null;
  const stored = ledger === null ? null : fromLedger(ledger, point);
  const found =
    stored !== null && ledger?.otherSettings === false
      ? stored
      : newest(await fromFile(site, { machine, point }, waiting, ledger, known.files), stored);
  const bands = point.bands.map((band) => ({
    band,
    now: found.levels.get(band.id) ?? null,
    limits: found.limits.filter(({ limit }) => limit.bandId === band.id),
    judged: !found.stopped,
  }));
  const { from, usedMs } = found;
  const averaging = found.averaging ?? configured(point);
  const advice = machine === undefined ? null : known.adviser.adviseOn(machine, { point, averaging });
  const { quality, remark } = found.stopped ? ofStandstill(found) : found;
  return { point, waiting, ledger, from, usedMs, bands, averaging, quality, remark, advice };
}

/** What a quality finding says of a vibration, it does not say of silence. */
const aboutVibration: readonly QualityFinding['flag'][] = [
  'dropouts',
  'flat',
  'hum-only',
  'low-signal',
  'settling',
  'ski-slope',
  'speed-doubtful',
  'transient',
  'unsteady',
];

function ofStandstill({ quality, remark }: Found): Pick<Found, 'quality' | 'remark'> {
  const said = quality.some(({ flag }) => flag === 'not-running');
  return {
    quality: quality.filter(({ flag }) => !aboutVibration.includes(flag)),
    remark: remark ?? (said ? null : 'the machine stood still: not judged'),
  };
}

/** False: no limit watches any band of it. */
export function canAlarm({ point }: PointCheck): boolean {
  return point.limits.length > 0;
}

function newest(file: Found, stored: Found | null): Found {
  if (file.from !== null || stored === null) return file;
  return { ...stored, remark: 'measured under earlier settings; the next recording is measured under these' };
}

function fromLedger({ measurement, bandIds, limits }: LedgerPoint, point: Point): Found | null {
  if (measurement === null) return null;
  const levels = new Map<string, LevelNow>();
  for (const level of measurement.levels) {
    const id = bandIds.get(level.bandId);
    const confidencePercent = measurement.confidencePercent ?? point.analysis.confidencePercent;
    if (id !== undefined) levels.set(id, { ...level, confidencePercent });
  }
  return {
    from: 'ledger',
    usedMs: measurement.usedMs,
    levels,
    limits,
    averaging: ofRecording(measurement.averaging, measurement.sampleRateHz),
    quality: measurement.quality,
    remark: null,
    stopped: measurement.machineState === 'stopped',
  };
}

async function fromFile(
  site: Site,
  { machine, point }: { readonly machine: Machine | undefined; readonly point: Point },
  waiting: Waiting | null,
  ledger: LedgerPoint | null,
  files: FileLevels,
): Promise<Found> {
  const none: Found = {
    from: null,
    usedMs: null,
    levels: new Map(),
    limits: nothingMeasured(point, machine),
    averaging: null,
    quality: [],
    remark: null,
    stopped: false,
  };
  const archived = ledger?.archived.newest ?? null;
  if (waiting === null && archived === null) return { ...none, remark: 'no recording yet' };
  const answer = await (waiting === null
    ? files.analyse(join(site.folders.data, archived as string), archived as string, point)
    : files.analyse(join(site.folders.drop, waiting.newest), waiting.newest, point));
  const name = (waiting?.newest ?? archived) as string;
  if ('reason' in answer) return { ...none, remark: `${name}: ${answer.reason}` };
  const measurement = answer.measurements.find(
    (one) => one.machineId === point.machineId && one.pointId === point.id,
  );
  if (measurement === undefined) {
    const why = answer.missing.find((text) => text.startsWith(`${pointPath(point)}: `));
    return {
      ...none,
      remark: `${name}: ${why?.slice(pointPath(point).length + 2) ?? 'nothing for this point'}`,
    };
  }
  const quality = [...answer.quality, ...measurement.quality];
  const rule = machine?.running ?? null;
  return {
    from: 'file',
    // Filed away, a recording has lost the subfolders that its name may need to tell its start.
    usedMs: waiting === null ? (ledger?.measurement?.usedMs ?? null) : answer.start.startMs,
    levels: new Map(measurement.levels.map((level) => [level.bandId, level])),
    limits: machine === undefined ? [] : limitsOfMeasured(machine, point, measurement),
    averaging: ofRecording(measurement.averaging, measurement.sampleRateHz),
    quality,
    // A finding says more than this.
    remark:
      measurement.averaging === null && quality.length === 0
        ? `${name}: not even one segment fits into it`
        : null,
    stopped: readingOf(rule, measurement) === false,
  };
}

/** Of limits that stand the values are known all the same. */
function nothingMeasured(point: Point, machine: Machine | undefined): readonly LimitInForce[] {
  const condition = (machine?.conditions ?? []).length === 0 ? anyCondition : null;
  return pointLimits(point, { condition, levelOf: () => null, situationOf: () => nothingKnown });
}

function ofRecording(averaging: Averaging | null, sampleRateHz: number): AveragingCheck | null {
  return averaging === null ? null : { ...averaging, from: 'recording', sampleRateHz };
}

function configured(point: Point): AveragingCheck | null {
  const meaning = pointMeaning(point);
  if (meaning === null) return null;
  const { window, overlapPercent } = point.analysis;
  return { ...meaning, from: 'site file', window, overlapPercent };
}
