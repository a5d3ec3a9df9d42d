import { levelEveryMs } from '../config/meaning.ts';
import type { Band, Limit, Machine, Point } from '../config/site.ts';
import { isOpen } from '../detection/baseline.ts';
import { type KeptBaseline, type LearnedChange, learnedOverTime } from '../detection/learned-over-time.ts';
import { learnedKey, type PastLevels } from '../detection/past-levels.ts';
import {
  alarmsInTime,
  type InTime,
  type Rehearsal,
  rehearse,
  type WorseThan,
} from '../detection/rehearsal.ts';
import { type WantedLimit, wantedLimit } from '../detection/wanted-limit.ts';
import { baselinesOf, type StoredBaseline } from '../store/baselines.ts';
import { conditionNames } from '../store/conditions.ts';
import type { Ledger } from '../store/ledger.ts';
import { breakingKinds, notesOf } from '../store/notes.ts';
import { seriesOfPoint } from '../store/read-trends.ts';
import { zoneCOf } from './learn.ts';
import { type PointColumns, pointColumns, type WantedBand } from './point-columns.ts';

const dayMs = 86_400_000;

export interface RehearsedTime {
  /** Used times; `fromMs` included, `toMs` not. */
  readonly fromMs: number;
  readonly toMs: number;
  readonly dayOf: (usedMs: number) => number;
  /** Alarms of one limit within that time that are wanted at most; null: nothing is suggested. */
  readonly most: number | null;
}

export interface PointToRehearse {
  readonly machine: Machine;
  readonly point: Point;
  readonly machineLedgerId: number;
  readonly pointLedgerId: number;
  /** Bands whose levels are those that the site file would give, with their ids in the ledger. */
  readonly bands: readonly { readonly band: Band; readonly bandLedgerId: number }[];
  /** The machine's operating conditions are those of the site file in force, so that its baselines hold. */
  readonly sameConditions: boolean;
}

export interface LimitRehearsal {
  readonly limit: Limit;
  readonly band: Band;
  readonly rehearsal: Rehearsal;
  readonly inTime: InTime;
  readonly wanted: WantedLimit | null;
}

/** The limits of one point over the levels of that time, each by itself. */
export async function rehearsePoint(
  ledger: Ledger,
  of: PointToRehearse,
  time: RehearsedTime,
): Promise<LimitRehearsal[]> {
  const { point } = of;
  const limits = point.limits.flatMap((limit) => {
    const found = of.bands.find(({ band }) => band.id === limit.bandId);
    return found === undefined ? [] : [{ limit, ...found }];
  });
  if (limits.length === 0) return [];
  const learns = limits.some(({ limit }) => asksBaseline(limit));
  const kept = learns && of.sameConditions ? await keptBaselines(ledger, of) : [];
  const fromMs = readFrom(of, kept, time.fromMs);
  const bands = of.bands.flatMap((one) => wantedBand(one, limits));
  const columns = await pointColumns(ledger, of, bands, { ...time, fromMs });
  const breaksMs = await breaksOf(ledger, of, time.toMs);
  const learned = new Map<string, readonly LearnedChange[]>();
  return limits.map(({ limit, band }) => {
    const levels = columns.levels.get(band.id);
    if (levels === undefined) throw new Error(`no columns of ${band.id}`);
    if (asksBaseline(limit) && !learned.has(band.id))
      learned.set(band.id, learnedOf(of, { band, levels, columns, kept, breaksMs }));
    const { recordings } = columns;
    const own = asksBaseline(limit) ? (learned.get(band.id) ?? []) : [];
    const play = (one: Limit, unless?: WorseThan) =>
      rehearse({
        limit: one,
        band,
        recordings,
        levels,
        learned: own,
        breaksMs,
        ...(unless === undefined ? {} : { unless }),
      });
    const rehearsal = play(limit);
    const inTime = alarmsInTime(rehearsal.alarms, time);
    const wanted =
      time.most === null || rehearsal.compared === 0
        ? null
        : wantedHere(limit, band, { ...time, most: time.most }, inTime, play);
    return { limit, band, rehearsal, inTime, wanted };
  });
}

/** A tighter limit may stand for this share of the time before it is one that is always passed. */
const longStandingShare = 0.02;

function wantedHere(
  limit: Limit,
  { display }: Band,
  time: RehearsedTime & { readonly most: number },
  now: InTime,
  play: (limit: Limit, unless: WorseThan) => Rehearsal,
): WantedLimit | null {
  const { fromMs, toMs } = time;
  const most = Math.floor(time.most);
  const wanted = { most, oftenMs: longStandingShare * (toMs - fromMs) };
  return wantedLimit(limit, display, wanted, now, (one, longestMs) =>
    alarmsInTime(play(one, { fromMs, most, longestMs }).alarms, time),
  );
}

function asksBaseline({ rule }: Limit): boolean {
  return rule?.by === 'baseline' || rule?.by === 'spread' || rule?.by === 'change';
}

function wantedBand(
  one: { readonly band: Band; readonly bandLedgerId: number },
  limits: readonly { readonly limit: Limit; readonly band: Band }[],
): WantedBand[] {
  const own = limits.flatMap(({ limit, band }) => (band.id === one.band.id ? [limit] : []));
  if (own.length === 0) return [];
  const exceeded = own.some(
    ({ danger, rule, side }) =>
      side === 'upper' &&
      (danger !== null ||
        (rule !== undefined && 'danger' in rule && rule.danger !== null) ||
        rule?.by === 'curve'),
  );
  return [{ ...one, exceeded, intervals: own.some(({ confident }) => confident === true) }];
}

/** Baselines of the point's series by condition, as people and the service left them. */
type Kept = StoredBaseline & { readonly condition: string };

async function keptBaselines(ledger: Ledger, { pointLedgerId }: PointToRehearse): Promise<Kept[]> {
  return ledger.read(async (reader) => {
    const series = await seriesOfPoint(reader, pointLedgerId);
    const names = await conditionNames(reader);
    const stored = await baselinesOf(
      reader,
      series.map(({ id }) => id),
    );
    return stored.map((one) => ({ ...one, condition: names.get(one.conditionId) ?? '' }));
  });
}

/**
 * Reading begins earlier than what is counted: alarms that stand then have their beginning before, and baselines that
 * were still learning have their readings.
 */
function readFrom({ point }: PointToRehearse, kept: readonly Kept[], fromMs: number): number {
  const everyMs = point.recordings.expectedEveryMs;
  const delays = point.limits.flatMap(({ onDelay, offDelay }) => [onDelay, offDelay]);
  const longestMs = Math.max(
    0,
    ...delays.map((delay) => ('ms' in delay ? delay.ms : delay.recordings * levelEveryMs(point))),
    ...point.limits.map(({ rule }) => (rule?.by === 'rate' ? rule.overMs : 0)),
  );
  const beginMs = fromMs - Math.max(14 * dayMs, longestMs + 2 * dayMs, 48 * everyMs);
  const begins = kept.flatMap((one) => {
    const grew = isOpen(one.state) || (one.toMs ?? Number.NEGATIVE_INFINITY) >= beginMs;
    return grew && one.fromMs !== null ? [one.fromMs] : [];
  });
  return Math.min(beginMs, ...begins);
}

async function breaksOf(ledger: Ledger, of: PointToRehearse, toMs: number): Promise<number[]> {
  const { machineLedgerId: machineId, pointLedgerId: pointId } = of;
  const fromMs = Number.MIN_SAFE_INTEGER;
  const notes = await ledger.read((reader) => notesOf(reader, { machineId, pointId, fromMs, toMs }));
  return notes.filter(({ kind }) => breakingKinds.includes(kind)).map(({ atMs }) => atMs);
}

function learnedOf(
  { machine, point }: PointToRehearse,
  about: {
    readonly band: Band;
    readonly levels: PastLevels;
    readonly columns: PointColumns;
    readonly kept: readonly Kept[];
    readonly breaksMs: readonly number[];
  },
): LearnedChange[] {
  const { band, levels, breaksMs } = about;
  const { recordings } = about.columns;
  const series = new Set(levels.series);
  const kept = about.kept.flatMap((one): KeptBaseline[] => {
    const condition = recordings.conditions.indexOf(one.condition);
    if (!series.has(one.seriesId) || condition === -1) return [];
    const { learnFromMs } = one;
    return [{ key: learnedKey(one.seriesId, condition), baseline: one, learnFromMs }];
  });
  const expectedADay = Math.max(1, dayMs / levelEveryMs(point));
  const zoneC = zoneCOf(machine, point, band);
  return learnedOverTime({ recordings, levels, expectedADay, zoneC, breaksMs, kept });
}
