import { allBoundaries } from '../../advisory/zone-words.ts';
import { bandZone, machineZone, type ZoneAnswer, type ZoneReading } from '../../assessment/zone.ts';
import {
  boundariesFor,
  type MachineZones,
  notOnHousing,
  rangeAt,
  zonesName,
} from '../../config/machine-zones.ts';
import { printFrequency } from '../../config/print-value.ts';
import type { Band, Machine, Point } from '../../config/site.ts';
import { bandThatWouldDo } from '../../config/zone-limits.ts';
import type { PointCheck } from './point-check.ts';

/** The zone of a point's newest levels, band by band. */
export interface ZoneCheck {
  readonly reading: ZoneReading;
  /** By band id, of those that a table may judge; a band without a level yet says what stands against it, or nothing. */
  readonly bands: ReadonlyMap<string, ZoneAnswer>;
}

/** Null where the machine has no zones. */
export function zoneCheck(machine: Machine, check: PointCheck): ZoneCheck | null {
  const { zones = null, runningSpeedHz } = machine;
  if (zones === null) return null;
  const { point, ledger, from } = check;
  const nominalRpm = runningSpeedHz === null ? null : runningSpeedHz * 60;
  const measuredRpm = from === 'ledger' ? (ledger?.measurement?.speed?.rpm ?? null) : null;
  const speedRpm = measuredRpm ?? nominalRpm;
  const measured = check.bands.flatMap(({ band, now }) =>
    now === null || band.of === 'envelope' ? [] : [{ ...now, bandId: band.id, ...edgesOf(band, speedRpm) }],
  );
  const reading: ZoneReading = {
    point,
    state: check.bands.some(({ judged }) => !judged) ? 'stopped' : 'running',
    speedRpm,
    levels: measured,
    flags: check.quality.map(({ flag }) => flag),
  };
  const bands = new Map<string, ZoneAnswer>();
  for (const band of point.bands) {
    if (band.of === 'envelope' || (band.quantity !== 'velocity' && band.quantity !== 'displacement'))
      continue;
    const level = measured.find(({ bandId }) => bandId === band.id);
    bands.set(
      band.id,
      level === undefined ? unmeasured(zones, point, band, speedRpm) : bandZone(zones, reading, level),
    );
  }
  return { reading, bands };
}

function edgesOf({ quantity, from, to, inOrders }: Band, speedRpm: number | null) {
  const perOrder = inOrders ? (speedRpm ?? 0) / 60 : 1;
  return { quantity, fromHz: from * perOrder, toHz: to * perOrder };
}

function unmeasured(zones: MachineZones, point: Point, band: Band, speedRpm: number | null): ZoneAnswer {
  const answer = boundariesFor(zones, edgesOf(band, speedRpm), speedRpm);
  const why = notOnHousing(point, zones) ?? (answer.ok ? 'no level yet' : answer.why);
  return { letter: null, why };
}

/** 'ISO 20816-3 (group 2, rigid): velocity A/B 1.4, ... mm/s r.m.s. ...; over 10 Hz to 1000 Hz'. */
export function tableText({ runningSpeedHz }: Machine, zones: MachineZones): string {
  if (zones.outside !== null) return `none: ${zones.outside}`;
  const rows = zones.boundaries.map((row) => `${row.quantity} ${allBoundaries(row, row.display)}`);
  const range = runningSpeedHz === null ? zones.frequency : rangeAt(zones, runningSpeedHz * 60);
  const over = `over ${printFrequency(range.fromHz)} to ${printFrequency(range.toHz)}`;
  const fromMemory = zones.boundaries.some(({ known }) => known === 'memory');
  const source = fromMemory ? '; kept from memory, so compare them with the standard' : '';
  return `${zonesName(zones)}: ${[...rows, over].join('; ')}${source}`;
}

/** 'zone C (de-h), the worst of its points'; null where none is in a zone. */
export function machineZoneText(machine: Machine, checks: readonly ZoneCheck[]): string | null {
  const { zone, pointId } = machineZone(
    machine,
    checks.map(({ reading }) => reading),
  );
  if (zone.letter === null) return null;
  return `${zone.atLeast ? 'at least ' : ''}zone ${zone.letter} (${pointId}), the worst of its points`;
}

/** A line for each band, 'overall in zone B'; or why the point is in none. */
export function pointZoneTexts(machine: Machine, point: Point, check: ZoneCheck): string[] {
  const zones = machine.zones ?? null;
  if (zones === null || zones.outside !== null) return [];
  const texts = [...check.bands].map(([id, answer]) =>
    answer.letter === null
      ? `no zone, ${id}: ${answer.why}`
      : `${id} in ${answer.atLeast ? 'at least ' : ''}zone ${answer.letter}`,
  );
  if (texts.length > 0) return texts;
  const { runningSpeedHz } = machine;
  const wanted = runningSpeedHz === null ? '' : `: ${bandThatWouldDo(zones, runningSpeedHz)}`;
  return [`no zone: ${notOnHousing(point, zones) ?? `none of its bands is judged${wanted}`}`];
}
