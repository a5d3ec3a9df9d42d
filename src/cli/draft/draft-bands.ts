import { judgeBand } from '../../config/bands.ts';
import { longestSegmentSamples, segmentSamplesFor, usualLineSpacingHz } from '../../config/meaning.ts';
import { printFrequency } from '../../config/print-value.ts';
import { parseFrequency } from '../../config/quantity.ts';
import type { AnalysisSettings, Quantity } from '../../config/site.ts';
import { usualDisplayUnit } from '../../config/units.ts';

/** A band as the site file writes it. */
export interface DraftBand {
  readonly id: string;
  readonly quantity: Quantity;
  readonly from: string;
  readonly to: string;
  readonly unit: string | null;
  /** Alert and danger of an example, to be replaced by the site's own; null where no usual unit is known. */
  readonly example: readonly [alert: string, danger: string] | null;
}

interface Wanted {
  readonly id: string;
  readonly quantity: Quantity;
  readonly fromHz: number;
  readonly toHz: number;
  readonly unit: string | null;
  readonly example: DraftBand['example'];
}

/** Bands that suit most rotating machines, as far as the recordings can carry them. */
export function draftBands(
  quantity: Quantity,
  sampleRateHz: number | null,
  durationS: number | null,
): DraftBand[] {
  const highestHz = sampleRateHz === null ? Number.POSITIVE_INFINITY : sampleRateHz / 2.56;
  const analysis = usualAnalysis(sampleRateHz, durationS);
  const spacingHz =
    sampleRateHz === null
      ? analysis.lineSpacingHz
      : sampleRateHz / segmentSamplesFor(sampleRateHz, analysis.lineSpacingHz);
  // Three lines are the least for the usual window; one more leaves room for rounding.
  const leastHz = 4 * spacingHz;
  const carried = usualBands(quantity, highestHz, leastHz).flatMap((wanted) => {
    const from = printFrequency(roundTo(Math.max(wanted.fromHz, leastHz), Math.ceil));
    const to = printFrequency(roundTo(Math.min(wanted.toHz, highestHz), Math.floor));
    const band: DraftBand = { ...wanted, from, to };
    return isSound(band, analysis, sampleRateHz) ? [band] : [];
  });
  return carried.map(({ id, quantity: of, from, to, unit, example }) => ({
    id,
    quantity: of,
    from,
    to,
    unit,
    example,
  }));
}

function usualBands(quantity: Quantity, highestHz: number, leastHz: number): Wanted[] {
  const velocity: Wanted = {
    id: 'overall',
    quantity: 'velocity',
    fromHz: 10,
    toHz: 1000,
    unit: 'mm/s',
    example: ['2.8 mm/s', '4.5 mm/s'],
  };
  const whole: Wanted = {
    id: 'overall',
    quantity,
    fromHz: Math.max(10, leastHz) < highestHz / 4 ? 10 : leastHz,
    toHz: Math.min(1000, highestHz),
    unit: null,
    example:
      quantity === 'other'
        ? null
        : [`1 ${usualDisplayUnit(quantity).text}`, `2 ${usualDisplayUnit(quantity).text}`],
  };
  if (quantity === 'acceleration') {
    const bearing: Wanted = {
      ...whole,
      id: 'bearing',
      fromHz: 2000,
      toHz: 8000,
      unit: 'm/s2',
      example: ['4 m/s2', '12 m/s2'],
    };
    if (highestHz < 40) return [{ ...whole, unit: 'm/s2', example: ['4 m/s2', '12 m/s2'] }];
    return highestHz < 3000 ? [velocity] : [velocity, bearing];
  }
  if (quantity === 'velocity') return [highestHz < 40 ? { ...velocity, fromHz: whole.fromHz } : velocity];
  if (quantity === 'displacement') return [{ ...whole, unit: 'um pp', example: ['50 um pp', '80 um pp'] }];
  return [{ ...whole, id: 'signal' }];
}

function usualAnalysis(sampleRateHz: number | null, durationS: number | null): AnalysisSettings {
  const asked = usualLineSpacingHz(null);
  const samples =
    sampleRateHz === null || durationS === null
      ? longestSegmentSamples
      : Math.min(longestSegmentSamples, Math.floor(durationS * sampleRateHz + 1e-6));
  const widestHz =
    sampleRateHz === null ? 0 : sampleRateHz / 2 ** Math.floor(Math.log2(Math.max(2, samples)));
  return {
    window: 'hann',
    overlapPercent: 50,
    lineSpacingHz: Math.max(asked, widestHz),
    segmentSamples: null,
    skipStartS: 0,
    confidencePercent: 95,
    falsePeaksPerSpectrum: 0.1,
  };
}

/** Judged by the rules of the site file, so that a draft never holds a band that `check` refuses. */
function isSound(band: DraftBand, analysis: AnalysisSettings, sampleRateHz: number | null): boolean {
  const from = parseFrequency(band.from);
  const to = parseFrequency(band.to);
  if (!from.ok || !to.ok || to.value <= from.value) return false;
  const judged = {
    id: band.id,
    formerly: [],
    quantity: band.quantity,
    from: from.value,
    to: to.value,
    inOrders: false,
    display: usualDisplayUnit(band.quantity),
  };
  const situation = { analysis, sampleRateHz, runningSpeedHz: null, mounting: null, shown: '' };
  return judgeBand(judged, situation).every(({ refused }) => !refused);
}

/** To two figures, up or down; what has fewer stays as it is. */
function roundTo(value: number, rounding: (value: number) => number): number {
  if (!(value > 0) || !Number.isFinite(value)) return 0;
  const step = 10 ** (1 - Math.floor(Math.log10(value)));
  const scaled = value * step;
  const whole = Math.abs(scaled - Math.round(scaled)) < 1e-6 ? Math.round(scaled) : rounding(scaled);
  return Number((whole / step).toPrecision(2));
}
