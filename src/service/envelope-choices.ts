import type { QualityFlag } from '../acquisition/recording.ts';
import type { DemodulationBand } from '../config/envelope-settings.ts';
import { type Point, pointPath } from '../config/site.ts';
import { choiceAmong, choiceStep, chosenBand } from '../manipulation/envelope-choice.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { envelopeChoices, saveEnvelopeChoice } from '../store/envelope-choices.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Writer } from '../store/lent-connection.ts';
import type { Evaluated } from './evaluate.ts';
import type { SiteView } from './site-view.ts';
import type { ReadyRecording } from './verdicts.ts';

/** The band that is demodulated where recordings of a point have agreed on one; null: the fixed one. */
export type ChosenBands = (ready: ReadyRecording, point: Point) => DemodulationBand | null;

/** As the ledger knows them now; it is not asked where no point of the recordings lets them choose. */
export async function chosenBandsOf(ledger: Ledger, files: readonly ReadyRecording[]): Promise<ChosenBands> {
  const asking = files.flatMap(({ view, points }) =>
    points
      .filter(({ envelope }) => envelope?.choose === 'kurtosis')
      .map((point) => [pointPath(point), view.ids.pointId(point.machineId, point.id)] as const),
  );
  if (asking.length === 0) return () => null;
  const ids = new Map(asking);
  const choices = await ledger.read((reader) => envelopeChoices(reader, [...ids.values()]));
  return ({ header }, point) => {
    const choice = choices.get(ids.get(pointPath(point)) ?? Number.NaN) ?? null;
    return chosenBand(choice, point, header.header.sampleRateHz ?? point.recordings.sampleRateHz);
  };
}

/** Knocks that are none of the machine's: recordings flagged so have no say. */
const spoilt: readonly QualityFlag[] = ['clipped', 'saturated', 'dropouts', 'settling', 'wrong-rate'];

/** What the recordings of points that choose have to say, in the transaction in which they are taken. */
export async function noteEnvelopeChoices(
  writer: Writer,
  view: SiteView,
  taken: {
    readonly measurements: readonly Measurement[];
    readonly evaluated: readonly Evaluated[];
    readonly usedMs: number;
  },
): Promise<void> {
  for (const measurement of taken.measurements) {
    const candidate = measurement.envelope?.candidate ?? null;
    const found = taken.evaluated.find(({ point }) => isOf(measurement, point));
    if (candidate === null || found?.machineState !== 'running') continue;
    if (measurement.quality.some(({ flag }) => spoilt.includes(flag))) continue;
    const among = choiceAmong(found.point, measurement.sampleRateHz);
    if (among === null) continue;
    const pointId = view.ids.pointId(measurement.machineId, measurement.pointId);
    const before = (await envelopeChoices(writer, [pointId])).get(pointId) ?? null;
    const after = choiceStep(before, among, candidate, taken.usedMs);
    if (after !== before) await saveEnvelopeChoice(writer, pointId, after);
  }
}

function isOf({ machineId, pointId }: Measurement, point: Point): boolean {
  return point.machineId === machineId && point.id === pointId;
}
