import type { AlarmFacts, ZoneFacts } from '../advisory/facts.ts';
import { bandZone, isJudged, machineZone, type ZoneReading } from '../assessment/zone.ts';
import { zoneChange } from '../assessment/zone-change.ts';
import { zonesName } from '../config/machine-zones.ts';
import type { Band, Machine, Point } from '../config/site.ts';
import { worstZone } from '../config/zone-tables.ts';
import { readingOf } from '../detection/machine-state.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestMeasurement, type StoredMeasurement } from '../store/read-measurements.ts';
import { type Series, seriesOfPoint } from '../store/read-trends.ts';
import { pointFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** From stored recordings to the zones that people read. */

/** A level and an earlier one, SI r.m.s., of the same series and operating condition. */
export interface Compared {
  readonly level: number;
  readonly reference: number;
  readonly since: 'baseline' | 'week';
}

/** Null where the machine has no table, or the band is of nothing that a table judges. */
export function zoneFacts(
  machine: Machine | undefined,
  reading: ZoneReading,
  bandId: string,
  compared: Compared | null,
): ZoneFacts | null {
  const zones = machine?.zones ?? null;
  const level = reading.levels.find((one) => one.bandId === bandId);
  if (zones === null || level === undefined || !isJudged(zones, level.quantity)) return null;
  const answer = bandZone(zones, reading, level);
  const table = zonesName(zones);
  if (answer.letter === null) {
    const { why } = answer;
    return { letter: null, why, atLeast: false, table, boundaries: null, change: null, machine: null };
  }
  const { letter, atLeast, boundaries } = answer;
  const change = compared === null ? null : zoneChange(compared.level, compared.reference, boundaries);
  const { ab, bc, cd } = boundaries;
  return {
    letter,
    why: null,
    atLeast,
    table,
    boundaries: { ab, bc, cd },
    change: change === null || compared === null ? null : { ...change, since: compared.since },
    machine: null,
  };
}

/** Envelopes have the quantity of a vibration, but are none. */
function ofVibration({ bands }: Point): readonly Band[] {
  return bands.filter((band) => band.of !== 'envelope');
}

/** A stored recording of a point as its zones see it; a level keeps the edges between which it was measured. */
export function zoneReading(
  view: SiteView,
  machine: Machine,
  point: Point,
  measurement: StoredMeasurement,
  series: ReadonlyMap<number, Series>,
): ZoneReading {
  const { runningSpeedHz } = machine;
  return {
    point,
    state: measurement.machineState,
    speedRpm: measurement.speed?.rpm ?? (runningSpeedHz === null ? null : runningSpeedHz * 60),
    levels: ofVibration(point).flatMap((band) => {
      const bandId = view.ids.bandId(machine.id, point.id, band.id);
      const level = measurement.levels.find((one) => one.bandId === bandId);
      const edges = level === undefined ? undefined : series.get(level.seriesId);
      if (level === undefined || edges === undefined) return [];
      const { quantity, fromHz, toHz } = edges;
      return [{ bandId: band.id, quantity, fromHz, toHz, level: level.level, atLeast: level.atLeast }];
    }),
    flags: measurement.quality.map(({ flag }) => flag),
  };
}

export async function seriesById(reader: Reader, pointId: number): Promise<Map<number, Series>> {
  return new Map((await seriesOfPoint(reader, pointId)).map((one) => [one.id, one]));
}

/** What an alarm mail says of the zone: of the level that it tells, and of the machine where that is in a worse one. */
export async function alarmZone(
  reader: Reader,
  view: SiteView,
  about: {
    readonly machine: Machine | undefined;
    readonly point: Point | undefined;
    readonly bandId: string;
    readonly measurement: StoredMeasurement;
    readonly before: AlarmFacts['before'];
  },
): Promise<ZoneFacts | null> {
  const { machine, point, bandId, measurement, before } = about;
  if (machine === undefined || point === undefined || machine.zones == null) return null;
  const own = zoneReading(view, machine, point, measurement, await seriesById(reader, measurement.pointId));
  const level = own.levels.find((one) => one.bandId === bandId)?.level;
  const facts = zoneFacts(machine, own, bandId, level === undefined ? null : comparedWith(level, before));
  if (facts === null) return null;
  const { points } = machineZone(
    machine,
    await otherReadings(reader, view, machine, point, measurement.usedMs),
  );
  const worst = worstZone(points.flatMap(({ zone }) => (zone.letter === null ? [] : [zone.letter])));
  const worse = worst !== null && worst !== facts.letter && worstZone([worst, facts.letter ?? 'A']) === worst;
  const there = points.find(({ zone }) => zone.letter === worst);
  if (!worse || there === undefined) return facts;
  return { ...facts, machine: { letter: worst, point: pointFacts(view, machine.id, there.pointId) } };
}

function comparedWith(level: number, { baseline, weekBefore }: AlarmFacts['before']): Compared | null {
  if (baseline !== null) return { level, reference: baseline, since: 'baseline' };
  return weekBefore === null ? null : { level, reference: weekBefore.level, since: 'week' };
}

/** The newest recording of each other point, where it is not old. */
async function otherReadings(
  reader: Reader,
  view: SiteView,
  machine: Machine,
  except: Point,
  usedMs: number,
): Promise<ZoneReading[]> {
  const readings: ZoneReading[] = [];
  for (const point of machine.points) {
    if (point.id === except.id) continue;
    const pointId = view.ids.pointId(machine.id, point.id);
    const measurement = await newestMeasurement(reader, pointId, { evaluated: true });
    const { overdueAfterMs, settleMs } = point.recordings;
    if (measurement === null || usedMs - measurement.usedMs > overdueAfterMs + settleMs) continue;
    readings.push(zoneReading(view, machine, point, measurement, await seriesById(reader, pointId)));
  }
  return readings;
}

/** A recording that was analysed on the spot, as its zones see it. */
export function measuredReading(machine: Machine, point: Point, measurement: Measurement): ZoneReading {
  const { runningSpeedHz } = machine;
  return {
    point,
    state: readingOf(machine.running, measurement) === false ? 'stopped' : 'running',
    speedRpm: measurement.speed?.rpm ?? (runningSpeedHz === null ? null : runningSpeedHz * 60),
    levels: measurement.levels.filter(({ bandId }) => ofVibration(point).some(({ id }) => id === bandId)),
    flags: measurement.quality.map(({ flag }) => flag),
  };
}
