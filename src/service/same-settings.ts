import type { Band, Machine, Point, Site } from '../config/site.ts';
import type { CarriedIds } from '../store/carried-ids.ts';

/**
 * Whether a site file would measure a band as the one in force does. Where it would not, the ledger's levels say nothing
 * of its limits: the recordings would have to be analysed anew.
 */
export interface SettingsInForce {
  /** Why the levels are not those that this file would give; null: they are. */
  otherLevels(point: Point, band: Band): string | null;
  /** The machine's running or its start would be judged by another rule than the stored recordings were. */
  otherRunning(machine: Machine): boolean;
  otherConditions(machine: Machine): boolean;
}

/** A site file and the rows of the ledger with which it would go on. */
export interface KnownSite {
  readonly site: Site;
  readonly ids: CarriedIds;
}

export function settingsInForce(candidate: KnownSite, inForce: KnownSite): SettingsInForce {
  const { ids: inForceIds } = inForce;
  const machines = new Map(inForce.site.machines.map((one) => [inForceIds.machine(one.id)?.id, one]));
  const points = new Map(
    inForce.site.machines.flatMap((machine) => machine.points).map((one) => [inForceIds.point(one)?.id, one]),
  );
  const isOther = (machine: Machine, what: (one: Machine) => readonly unknown[]) => {
    const was = machines.get(candidate.ids.machine(machine.id)?.id ?? Number.NaN);
    return was !== undefined && differ(what(machine), what(was));
  };
  return {
    otherLevels: (point, band) => {
      const row = candidate.ids.band(point, band);
      const was = points.get(candidate.ids.point(point)?.id ?? Number.NaN);
      const wasBand = was?.bands.find((one) => inForceIds.band(was, one)?.id === row?.id);
      if (row === null || was === undefined || wasBand === undefined)
        return 'the site file in force does not have it';
      if (differ(edgesOf(band), edgesOf(wasBand))) return 'its edges or its quantity are others';
      if (differ(measuringOf(point, band), measuringOf(was, wasBand)))
        return 'analysis, sensitivity or sample rate are others';
      return null;
    },
    otherRunning: (machine) => isOther(machine, ({ running, afterStartMs }) => [running, afterStartMs]),
    otherConditions: (machine) => isOther(machine, ({ conditions = [] }) => conditions),
  };
}

function edgesOf({ of, quantity, from, to, inOrders }: Band): unknown[] {
  return [of ?? null, quantity, from, to, inOrders];
}

function measuringOf(point: Point, band: Band): unknown[] {
  const { window, overlapPercent, lineSpacingHz, segmentSamples, skipStartS, detrend, averageOver } =
    point.analysis;
  const { samplesIn, fullScale, sensitivity } = point.signal;
  return [
    [window, overlapPercent, lineSpacingHz, segmentSamples, skipStartS, detrend ?? null, averageOver ?? null],
    [
      point.quantity,
      samplesIn.quantity,
      samplesIn.inSi,
      fullScale,
      sensitivity,
      point.recordings.sampleRateHz,
    ],
    band.of === 'envelope' ? (point.envelope ?? null) : null,
  ];
}

function differ(a: readonly unknown[], b: readonly unknown[]): boolean {
  return JSON.stringify(a) !== JSON.stringify(b);
}
