import type { Band } from '../config/site.ts';
import {
  type FingerprintSettings,
  isWrongRate,
  rateTolerance,
  seriesFingerprint,
  seriesRate,
  settingsFingerprint,
} from './fingerprint.ts';
import type { BandLevel } from './measurement.ts';

/**
 * A series is named by its sample rate among other things, and a rate that no site file gives is measured and rounded.
 * Where the clock of a logger jitters about the edge of two roundings, its recordings would go to one series and the
 * other by turns. So a recording also knows the names under which its neighbours would go, and joins what is there.
 */
export interface SeriesBeside {
  readonly settingsFingerprint: string;
  /** By the level's own fingerprint. */
  readonly fingerprints: Readonly<Record<string, string>>;
}

/** Nearest first; none where the rate is the configured one. */
export function seriesBeside(
  settings: FingerprintSettings,
  bands: readonly Band[],
  levels: readonly BandLevel[],
): readonly SeriesBeside[] {
  return ratesBeside(settings.sampleRateHz, settings.point.recordings.sampleRateHz).map((sampleRateHz) => {
    const beside = { ...settings, sampleRateHz };
    const named = levels.flatMap(({ bandId, fingerprint }) => {
      const band = bands.find(({ id }) => id === bandId);
      const isOwn = band !== undefined && seriesFingerprint(settings, band) === fingerprint;
      return isOwn ? [[fingerprint, seriesFingerprint(beside, band)] as const] : [];
    });
    return {
      settingsFingerprint: settingsFingerprint(beside, bands),
      fingerprints: Object.fromEntries(named),
    };
  });
}

/** The rounded rates next to the one of `seriesRate` that are within the tolerance of the recording's, nearest first. */
export function ratesBeside(sampleRateHz: number, configuredHz: number | null): number[] {
  if (!(sampleRateHz > 0) || (configuredHz !== null && !isWrongRate(sampleRateHz, configuredHz))) return [];
  const own = seriesRate(sampleRateHz, configuredHz);
  const step = 10 ** (Math.floor(Math.log10(own)) - 3);
  // Below a power of ten the steps are a tenth of those above.
  const stepDown = own === 1000 * step ? step / 10 : step;
  const away = (rateHz: number) => Math.abs(sampleRateHz / rateHz - 1);
  return (
    [own - stepDown, own + step]
      .map((rateHz) => seriesRate(rateHz, null))
      .filter((rateHz) => away(rateHz) <= rateTolerance)
      // Who sends another rate than the configured one does not join the series of the configured one.
      .filter((rateHz) => configuredHz === null || isWrongRate(rateHz, configuredHz))
      .sort((a, b) => away(a) - away(b))
  );
}
