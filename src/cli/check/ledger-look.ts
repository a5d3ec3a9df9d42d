import { segmentOf } from '../../config/meaning.ts';
import type { Point, Site } from '../../config/site.ts';
import { chosenBand, type EnvelopeChoice } from '../../manipulation/envelope-choice.ts';
import { envelopePlan } from '../../manipulation/envelope-plan.ts';
import { settingsFingerprint } from '../../manipulation/fingerprint.ts';
import { type LimitInForce, limitsOfStored } from '../../service/limits-in-force.ts';
import { type Archived, archivedOfPoint } from '../../store/archived.ts';
import { envelopeChoices } from '../../store/envelope-choices.ts';
import type { Reader } from '../../store/lent-connection.ts';
import { newestMeasurement, type StoredMeasurement } from '../../store/read-measurements.ts';
import type { SiteIds } from '../../store/site-ids.ts';
import { arrivalsOf } from '../../store/sources.ts';

/** What the ledger knows of a point. */
export interface LedgerPoint {
  readonly recordings: number;
  readonly newestUsedMs: number | null;
  readonly archived: Archived;
  readonly measurement: StoredMeasurement | null;
  /** Ids of the site file by the ledger's, for the bands it has of this point. */
  readonly bandIds: ReadonlyMap<number, string>;
  /** Its limits for the newest measurement. */
  readonly limits: readonly LimitInForce[];
  /** The newest levels were made under other settings than those in the site file now. */
  readonly otherSettings: boolean;
  /** What its recordings have agreed on; null: nothing, or they have no choice. */
  readonly choice: EnvelopeChoice | null;
}

/** Null: the ledger has never heard of the point, under this id or a former one. */
export async function lookUpPoint(
  reader: Reader,
  ids: SiteIds,
  site: Site,
  point: Point,
): Promise<LedgerPoint | null> {
  const machine = site.machines.find(({ id }) => id === point.machineId);
  const names = [point.machineId, ...(machine?.formerly ?? [])].flatMap((machineId) =>
    [point.id, ...point.formerly].map((pointId) => ({ machineId, pointId })),
  );
  const known = names.find((name) => idOf(() => ids.pointId(name.machineId, name.pointId)) !== null);
  if (known === undefined) return null;
  const pointId = ids.pointId(known.machineId, known.pointId);
  const arrivals = (await arrivalsOf(reader, [pointId])).get(pointId);
  const measurement = await newestMeasurement(reader, pointId);
  const choice = (await envelopeChoices(reader, [pointId])).get(pointId) ?? null;
  const bandIds = new Map<number, string>();
  for (const band of point.bands) {
    for (const name of [band.id, ...band.formerly]) {
      const id = idOf(() => ids.bandId(known.machineId, known.pointId, name));
      if (id !== null && !bandIds.has(id)) bandIds.set(id, band.id);
    }
  }
  return {
    recordings: arrivals?.recordings ?? 0,
    newestUsedMs: arrivals?.newestUsedMs ?? null,
    archived: await archivedOfPoint(reader, pointId),
    measurement,
    bandIds,
    limits:
      machine === undefined
        ? []
        : await limitsOfStored(reader, {
            machine,
            point,
            measurement,
            bandIds,
            machineLedgerId: ids.machineId(known.machineId),
          }),
    otherSettings: measurement !== null && hasOtherSettings(measurement, point, choice),
    choice,
  };
}

/** A sidecar's own scaling counts as other settings too: then the newest file is analysed, which takes it in. */
function hasOtherSettings(
  measurement: StoredMeasurement,
  point: Point,
  choice: EnvelopeChoice | null,
): boolean {
  const { sampleRateHz, settingsFingerprint: found } = measurement;
  const segmentSamples = segmentOf(point.analysis, sampleRateHz);
  const { signal, bands } = point;
  const envelope = envelopePlan(point, sampleRateHz, chosenBand(choice, point, sampleRateHz));
  return found !== settingsFingerprint({ point, signal, sampleRateHz, segmentSamples, envelope }, bands);
}

/** Asking for what the ledger does not have is a mistake there, and an answer here. */
function idOf(ask: () => number): number | null {
  try {
    return ask();
  } catch {
    return null;
  }
}
