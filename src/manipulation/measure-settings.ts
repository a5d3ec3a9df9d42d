import type { QualityFinding, Sidecar } from '../acquisition/recording.ts';
import type { DemodulationBand } from '../config/envelope-settings.ts';
import type { Point, SignalSettings } from '../config/site.ts';
import type { AveragedDensity } from '../signal/averaging.ts';

/** Looks at the samples as the file holds them, and at what was made of them. */
export interface SampleCheck {
  /** Raw samples of the channel, from the end of the skipped start on. */
  add(samples: Float64Array): void;
  /** Its findings. `density`: one-sided, (SI unit of the point)²/Hz; null where not one segment fitted. */
  finish(
    spectrum: Pick<AveragedDensity, 'density' | 'lineSpacingHz' | 'averages'> | null,
    machine: { readonly speedHz: number | null; readonly lowestVelocityHz: number | null },
  ): readonly QualityFinding[];
}

export interface MeasureSettings {
  readonly point: Point;
  /** Channel as the file names it. */
  readonly channel: string;
  /** The recording's own; null where neither the file nor the site file says it. */
  readonly sampleRateHz: number | null;
  /** What a sample is multiplied by to be in the SI unit of the point's quantity. */
  readonly siPerSample: number;
  /** The way from sample to SI as it was applied, for the fingerprint. */
  readonly signal: SignalSettings;
  readonly sidecar: Pick<Sidecar, 'loadPercent' | 'running'> | null;
  readonly check: SampleCheck | null;
  /** The band of the envelope that recordings of the point have agreed on; left out: none yet. */
  readonly chosenBand?: DemodulationBand | null;
}
