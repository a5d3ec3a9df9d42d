import type { RecordingHeader, SidecarChannel } from '../../acquisition/recording.ts';
import { parseSampleUnit } from '../../config/level.ts';
import { segmentSamplesFor, usualLineSpacingHz } from '../../config/meaning.ts';
import type { Point, Quantity, SignalSettings } from '../../config/site.ts';
import { siUnit } from '../../config/units.ts';
import type { AnalysisPlan, PlanFor } from '../../service/analyse-file.ts';
import { bandsOf, type OneOffSettings } from './options.ts';

/** Stands for the machine of a channel that is no point of a site. */
export const noMachine = 'channel';

/**
 * Every channel of a file as a point of its own, by the options of the command line. What they leave open is taken from
 * the sidecar, then from the unit in a column's heading.
 */
export function plansOfChannels(settings: OneOffSettings): PlanFor {
  return (header, sidecar): AnalysisPlan | { readonly reason: string } => {
    const rateHz = header.sampleRateHz ?? settings.sampleRateHz;
    if (rateHz === null) return { reason: 'the file does not say its sample rate; give --sample-rate' };
    const points: Point[] = [];
    for (const [index, name] of header.channelNames.entries()) {
      const signal = signalOf(
        settings,
        header,
        index,
        sidecar?.channels[name] ?? sidecar?.channels[String(index + 1)],
      );
      if ('reason' in signal) return signal;
      const bands = bandsOf(settings.bands, signal.quantity);
      if ('reason' in bands) return bands;
      points.push(point(settings, { index, name, rateHz, header, bands, ...signal }));
    }
    return {
      points: points.map((one) => ({ point: one, nominalHz: null })),
      sidecar: sidecar === null ? null : { ...sidecar, channels: {} },
      clock: { kind: 'utc' },
      siteZone: 'UTC',
      startInName: null,
    };
  };
}

interface ChannelSignal {
  readonly quantity: Quantity;
  readonly signal: SignalSettings;
}

function signalOf(
  { samplesIn, fullScale, sensitivity }: OneOffSettings,
  header: RecordingHeader,
  index: number,
  said: SidecarChannel | undefined,
): ChannelSignal | { readonly reason: string } {
  // What the command line says of the samples goes before the sidecar, as a whole.
  const own = samplesIn === null && sensitivity === null;
  const headed = header.channelUnits[index];
  const heading = headed == null ? null : parseSampleUnit(headed);
  const unit = own
    ? (said?.samplesIn ?? (heading?.ok ? heading.value : null))
    : (samplesIn ?? siUnit('voltage'));
  if (unit === null) {
    const where = headed == null ? '' : ` (its heading says '${headed}')`;
    return {
      reason: `channel ${header.channelNames[index]}: what its samples are is not said${where}; give --samples-in, or --sensitivity for samples in V`,
    };
  }
  if (own && said?.sensitivity != null) {
    return {
      reason: `channel ${header.channelNames[index]}: its sidecar gives a sensitivity without a quantity; give --sensitivity`,
    };
  }
  return {
    quantity: sensitivity?.quantity ?? unit.quantity,
    signal: {
      samplesIn: unit,
      fullScale: fullScale ?? (own ? (said?.fullScale ?? null) : null),
      sensitivity: sensitivity?.voltsPerSi ?? null,
      sensitivityText: sensitivity?.text ?? null,
    },
  };
}

function point(
  settings: OneOffSettings,
  of: ChannelSignal & {
    readonly index: number;
    readonly name: string;
    readonly rateHz: number;
    readonly header: RecordingHeader;
    readonly bands: Point['bands'];
  },
): Point {
  const { window, overlapPercent, sampleRateHz } = settings;
  const lineSpacingHz = usualLineSpacingHz(null);
  return {
    machineId: noMachine,
    id: of.name,
    name: of.name,
    formerly: [],
    direction: null,
    mounting: null,
    channel: of.index + 1,
    quantity: of.quantity,
    signal: of.signal,
    recordings: {
      files: null,
      filesRegex: null,
      startInName: null,
      clock: { kind: 'utc' },
      ignore: [],
      sampleRateHz,
      durationS: null,
      expectedEveryMs: 0,
      overdueAfterMs: 0,
      settleMs: 0,
      sidecar: 'optional',
      layout: settings.layout,
    },
    analysis: {
      window,
      overlapPercent,
      lineSpacingHz,
      segmentSamples:
        settings.segmentSamples ?? usualSegment(of.rateHz, lineSpacingHz, of.header.framesClaimed),
      skipStartS: 0,
      confidencePercent: 95,
      falsePeaksPerSpectrum: 0.1,
    },
    bands: of.bands,
    limits: [],
  };
}

/** The segment for the usual line spacing; a burst that is shorter gets the longest segment that fits into it. */
function usualSegment(rateHz: number, lineSpacingHz: number, frames: number | null): number {
  const usual = segmentSamplesFor(rateHz, lineSpacingHz);
  if (frames === null || frames >= usual || frames < 8) return usual;
  return 2 ** Math.floor(Math.log2(frames));
}
