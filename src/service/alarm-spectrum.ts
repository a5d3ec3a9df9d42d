import type {
  ChartedFamily,
  ChartedSpectrum,
  SpectrumChartFacts,
} from '../advisory/charts/spectrum-chart.ts';
import type { AlarmFacts } from '../advisory/facts.ts';
import { dayText } from '../advisory/time-words.ts';
import type { Point } from '../config/site.ts';
import { usualDisplayUnit } from '../config/units.ts';
import { type FaultEvidence, speaksForFault } from '../manipulation/evidence.ts';
import type { SpectralPeak } from '../manipulation/measurement.ts';
import { envelopeOf } from '../store/envelopes.ts';
import { evidenceOf } from '../store/evidence.ts';
import type { Reader } from '../store/lent-connection.ts';
import { peaksOf } from '../store/read-trends.ts';
import { newestSpectra } from '../store/spectra.ts';
import type { SiteView } from './site-view.ts';

/** The picture of an alarm's lines: its recording's spectrum (of a band of the envelope: its envelope) over that of a week before. */

const dayMs = 86_400_000;
const daysBefore = 7;
/** Shown at least up to here; and where the band reaches higher, a little beyond its end. */
const leastHz = 1000;

interface Spectrum extends ChartedSpectrum {
  readonly measurementId: number;
  readonly usedMs: number;
  readonly peaks: readonly SpectralPeak[];
}

/** Null where the ledger keeps no spectrum of the alarm's recording. */
export async function alarmSpectrum(
  reader: Reader,
  view: SiteView,
  alarm: AlarmFacts,
): Promise<SpectrumChartFacts | null> {
  const point = view.point(`${alarm.machine.id}/${alarm.point.id}`);
  const band = point?.bands.find(({ id }) => id === alarm.band.id);
  if (point === undefined || band === undefined) return null;
  const ofEnvelope = band.of === 'envelope';
  const { usedMs } = alarm.level;
  const now = await spectrumBefore(reader, view, point, usedMs + 1, ofEnvelope);
  if (now === null || now.usedMs !== usedMs) return null;
  const agoMs = usedMs - daysBefore * dayMs + dayMs / 24;
  const before = await spectrumBefore(reader, view, point, agoMs, ofEnvelope);
  const highest = (now.density.length - 1) * now.lineSpacingHz;
  const on = (ms: number) => dayText(ms, view.site.timeZone);
  const compared = before === null ? '' : `, and on ${on(before.usedMs)} in grey`;
  return {
    title: `Lines${ofEnvelope ? ' of the envelope' : ''} on ${on(usedMs)}${compared}`,
    display: usualDisplayUnit(point.quantity, point.signal.samplesIn.text),
    now,
    before,
    toHz: Math.min(highest, Math.max(leastHz, 1.2 * alarm.band.toHz)),
    ordersOfHz: null,
    scale: 'linear',
    peaks: now.peaks.map(({ frequencyHz, level, names }) => ({
      frequencyHz,
      level,
      name: shortName(names[0]),
    })),
    families: await familiesOf(reader, now.measurementId, ofEnvelope ? 'envelope' : 'plain'),
  };
}

/** 'BPFO x2' of 'BPFO x2, drive-end bearing': a picture has no room for more, and the words have it. */
function shortName(name: string | undefined): string | null {
  return name?.split(',')[0] ?? null;
}

/** Multiples of the frequencies for which the recording gave evidence, in the spectrum that is shown. */
async function familiesOf(
  reader: Reader,
  measurementId: number,
  shown: FaultEvidence['spectrum'],
): Promise<ChartedFamily[]> {
  const evidence = (await evidenceOf(reader, measurementId)).filter(speaksForFault);
  return evidence
    .filter(({ spectrum, alsoIn }) => spectrum === shown || alsoIn === shown)
    .map(({ frequency, observedHz, harmonics }) => ({
      text: frequency,
      hz: observedHz,
      multiples: harmonics,
    }));
}

async function spectrumBefore(
  reader: Reader,
  view: SiteView,
  point: Point,
  beforeMs: number,
  ofEnvelope: boolean,
): Promise<Spectrum | null> {
  const pointId = view.ids.pointId(point.machineId, point.id);
  const [plain] = await newestSpectra(reader, pointId, { beforeMs, limit: 1 });
  if (plain === undefined) return null;
  const { measurementId, usedMs } = plain;
  if (!ofEnvelope) return { ...plain, peaks: await peaksOf(reader, measurementId) };
  const envelope = await envelopeOf(reader, measurementId);
  return envelope?.spectrum == null
    ? null
    : { ...envelope.spectrum, measurementId, usedMs, peaks: envelope.peaks };
}
