import type { Quantity, SampleUnit, SignalSettings } from '../config/site.ts';
import type { RecordingHeader, SidecarChannel } from './recording.ts';

export interface Scaling {
  /** What a sample, as its reader gives it, is multiplied by to be in the SI unit of the point's quantity. */
  readonly siPerSample: number;
  /** What it is multiplied by to be in volts; null where the samples are no voltage. */
  readonly voltsPerSample: number | null;
  /** The settings that were applied: the site file's, overridden by the sidecar's. */
  readonly signal: SignalSettings;
}

export interface ScalingRefusal {
  /** What does not fit and what would, for people. */
  readonly reason: string;
}

/** The site file's settings with what the recording's sidecar says of the channel in their place. */
export function appliedSignal(signal: SignalSettings, sidecar: SidecarChannel | undefined): SignalSettings {
  if (sidecar === undefined) return signal;
  const samplesIn = sidecar.samplesIn ?? signal.samplesIn;
  // Another unit of the samples makes the site file's full scale, given in the old one, meaningless unless rescaled.
  const fullScale =
    sidecar.fullScale !== undefined
      ? sidecar.fullScale
      : rescaled(signal.fullScale, signal.samplesIn, samplesIn);
  const sensitivity =
    sidecar.sensitivity !== undefined
      ? sidecar.sensitivity
      : samplesIn.quantity === signal.samplesIn.quantity
        ? signal.sensitivity
        : null;
  const sensitivityText = sensitivity === signal.sensitivity ? signal.sensitivityText : null;
  return { ...signal, samplesIn, fullScale, sensitivity, sensitivityText };
}

function rescaled(fullScale: number | null, from: SampleUnit, to: SampleUnit): number | null {
  if (fullScale === null || from.quantity !== to.quantity) return null;
  return (fullScale * from.inSi) / to.inSi;
}

/**
 * How samples become SI values. Integer samples come as fractions of full scale: times `full_scale`, times the unit of
 * `samples_in`; numbers come as they stand, so `full_scale` does not touch them. A sensitivity (volts per SI unit)
 * divides. Without a full scale, the largest integer stands for 1 of `samples_in`.
 *
 * Refused where samples in volts have no sensitivity for a quantity that is none, or their unit is another quantity's.
 * Checked: 16 bit, full scale 10 V, 100 mV/g: a sample of 0.01 is 0.1 V, 1 g, 9.80665 m/s².
 */
export function scalingOf(
  samples: RecordingHeader['samples'],
  quantity: Quantity,
  signal: SignalSettings,
): Scaling | ScalingRefusal {
  const { samplesIn, fullScale, sensitivity } = signal;
  const si = (samples === 'integer' ? (fullScale ?? 1) : 1) * samplesIn.inSi;
  const voltsPerSample = samplesIn.quantity === 'voltage' ? si : null;
  if (sensitivity !== null) {
    if (voltsPerSample === null) {
      return { reason: `a sensitivity is given, but the samples are in ${samplesIn.text}, not in V` };
    }
    return { siPerSample: si / sensitivity, voltsPerSample, signal };
  }
  if (samplesIn.quantity !== quantity) {
    return {
      reason: `the samples are in ${samplesIn.text} and the point measures ${quantity}; give a sensitivity, or samples_in of ${quantity}`,
    };
  }
  return { siPerSample: si, voltsPerSample, signal };
}
