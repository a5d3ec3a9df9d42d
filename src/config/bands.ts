import { advisedAverages } from '../signal/segment-length.ts';
import { leastBandLines } from '../signal/window.ts';
import type { PointEnvelope } from './envelope-settings.ts';
import { secondsFor, segmentOf, segmentSamplesFor } from './meaning.ts';
import { printFrequency, printNumber, printSeconds, printSpeed } from './print-value.ts';
import type { AnalysisSettings, Band, Point } from './site.ts';

/** What a band must be judged against. */
export interface BandCase {
  readonly analysis: AnalysisSettings;
  /** Null: the recording says it, and what depends on it is judged by the asked line spacing alone. */
  readonly sampleRateHz: number | null;
  readonly runningSpeedHz: number | null;
  readonly mounting: Point['mounting'];
  readonly shown: string;
  /** Of the point, for bands of it; null or left out: its quantity has none. */
  readonly envelope?: PointEnvelope | null;
}

export interface BandFinding {
  readonly refused: boolean;
  readonly edge: 'from' | 'to';
  /** Names the rule, so that one band of many points is told once. */
  readonly rule: string;
  readonly what: string;
  readonly right: string;
  /** The edge's value that would be right, where there is one. */
  readonly instead: string | null;
}

/**
 * Highest frequency at which a sensor fixed like this reads flat. Common practice without a single source: makers'
 * data sheets differ by a factor of two either way.
 */
export const mountingRangeHz: Readonly<Record<NonNullable<Point['mounting']>, number>> = {
  stud: 10_000,
  glue: 8000,
  magnet: 2000,
  hand: 1000,
};

/** Everything that makes a band's level doubtful, by rule. Order bands are judged at the nominal speed. */
export function judgeBand(band: Band, situation: BandCase): BandFinding[] {
  const edges = edgesHz(band, situation.runningSpeedHz);
  if (edges === null) return [];
  const [fromHz, toHz] = edges;
  const { analysis, sampleRateHz } = situation;
  const spacingHz =
    sampleRateHz === null ? analysis.lineSpacingHz : sampleRateHz / segmentOf(analysis, sampleRateHz);
  const facts = { band, situation, fromHz, toHz, spacingHz };
  return [
    aboveRange(facts),
    tooNarrow(facts),
    tooLow(facts),
    beyondMounting(facts),
    ...speedAtEdge(facts),
  ].filter((finding) => finding !== null);
}

export function edgesHz(band: Band, runningSpeedHz: number | null): readonly [number, number] | null {
  if (!band.inOrders) return [band.from, band.to];
  return runningSpeedHz === null ? null : [band.from * runningSpeedHz, band.to * runningSpeedHz];
}

interface Facts {
  readonly band: Band;
  readonly situation: BandCase;
  readonly fromHz: number;
  readonly toHz: number;
  readonly spacingHz: number;
}

/** fs/2.56 leaves the anti-aliasing filter its room: a convention of analysers, not a law. */
function aboveRange({ band, situation, toHz }: Facts): BandFinding | null {
  const { sampleRateHz, runningSpeedHz, shown } = situation;
  if (sampleRateHz === null || toHz <= (sampleRateHz / 2.56) * (1 + 1e-9)) return null;
  const highest = inBandUnit(band, sampleRateHz / 2.56, runningSpeedHz, Math.floor);
  return {
    refused: true,
    edge: 'to',
    rule: 'above range',
    what: `band '${band.id}' of ${shown} ends at ${printFrequency(toHz)}, above the sample rate / 2.56 = ${printFrequency(sampleRateHz / 2.56)}`,
    right: '',
    instead: highest,
  };
}

function tooNarrow(facts: Facts): BandFinding | null {
  const { band, situation, fromHz, toHz, spacingHz } = facts;
  const least = leastBandLines(situation.analysis.window);
  const lines = (toHz - fromHz) / spacingHz;
  if (lines >= least * (1 - 1e-9)) return null;
  const widened = inBandUnit(band, fromHz + least * spacingHz, situation.runningSpeedHz, Math.ceil);
  return {
    refused: true,
    edge: 'to',
    rule: 'too narrow',
    what: `band '${band.id}' of ${situation.shown} is ${printNumber(lines)} lines of ${printFrequency(spacingHz)} wide, ${situation.analysis.window} needs ${least}`,
    right: `${finer(facts, (toHz - fromHz) / least)}, or write: to: ${widened}`,
    instead: null,
  };
}

/**
 * Integration weighs the lowest lines most, so a level that begins there depends on where a tone falls. Pooled bursts
 * have so few lines that the same holds of every quantity: what the means leave in the lowest ones is no vibration.
 */
function tooLow(facts: Facts): BandFinding | null {
  const { band, situation, fromHz, spacingHz } = facts;
  const pooled = situation.analysis.averageOver !== undefined;
  if (band.quantity !== 'velocity' && band.quantity !== 'displacement' && !pooled) return null;
  const least = leastBandLines(situation.analysis.window);
  if (fromHz >= least * spacingHz * (1 - 1e-9)) return null;
  const lowest = inBandUnit(band, least * spacingHz, situation.runningSpeedHz, Math.ceil);
  const spacing = fromHz > 0 ? `${finer(facts, fromHz / least)}, or ` : '';
  return {
    refused: true,
    edge: 'from',
    rule: 'too low',
    what: `${band.quantity} band '${band.id}' of ${situation.shown} begins ${printNumber(fromHz / spacingHz)} lines of ${printFrequency(spacingHz)} above 0, ${situation.analysis.window} needs ${least}`,
    right: `${spacing}write: from: ${lowest}`,
    instead: null,
  };
}

function beyondMounting({ band, situation, toHz }: Facts): BandFinding | null {
  const { mounting, shown } = situation;
  if (mounting === null || toHz <= mountingRangeHz[mounting]) return null;
  return {
    refused: false,
    edge: 'to',
    rule: 'beyond mounting',
    what: `band '${band.id}' of ${shown} ends at ${printFrequency(toHz)}; a sensor fixed by ${mounting} is usable to about ${printFrequency(mountingRangeHz[mounting])} (common practice)`,
    right: '',
    instead: null,
  };
}

/** Within the main lobe of an edge a tone is counted in part: 30 % of a Hann-windowed one from one line outside. */
function speedAtEdge(facts: Facts): BandFinding[] {
  const { band, situation, fromHz, toHz, spacingHz } = facts;
  const { runningSpeedHz, shown, analysis } = situation;
  if (runningSpeedHz === null) return [];
  const nearLines = analysis.window === 'flat-top' ? 4 : 2;
  const edges = [
    ['from', fromHz],
    ['to', toHz],
  ] as const;
  return edges
    .filter(([, hz]) => Math.abs(hz - runningSpeedHz) < nearLines * spacingHz)
    .map(([edge, hz]) => {
      const gap = Math.abs(hz - runningSpeedHz);
      const remedy = gap > 0 ? `${finer(facts, gap / nearLines)}, or move the edge` : 'move the edge';
      return {
        refused: false,
        edge,
        rule: `speed at ${edge}`,
        what: `the running speed of ${shown} (${printSpeed(runningSpeedHz)}) is less than ${nearLines} lines from the edge ${printFrequency(hz)} of band '${band.id}', so its level wanders with the speed; ${remedy}`,
        right: '',
        instead: null,
      };
    });
}

/** 'line_spacing: 0.8 Hz under analysis, with recordings of at least 6.4 s (5 averages)'. */
function finer({ situation }: Facts, widestHz: number): string {
  return finerSpacing(widestHz, situation.analysis, situation.sampleRateHz);
}

export function finerSpacing(
  widestHz: number,
  analysis: AnalysisSettings,
  sampleRateHz: number | null,
): string {
  const asked = roundTo(widestHz, 2, Math.floor);
  const spacing = `write under analysis: line_spacing: ${printNumber(asked, 2)} Hz`;
  if (sampleRateHz === null) return spacing;
  const segmentSamples = segmentSamplesFor(sampleRateHz, asked);
  const { overlapPercent, skipStartS } = analysis;
  const seconds = secondsFor(advisedAverages, { sampleRateHz, segmentSamples, overlapPercent, skipStartS });
  const length = printSeconds(roundTo(seconds, 3, Math.ceil));
  return `${spacing}, with recordings of at least ${length} (${advisedAverages} averages)`;
}

export function inBandUnit(
  band: Band,
  hz: number,
  runningSpeedHz: number | null,
  rounding: (value: number) => number,
): string {
  if (band.inOrders && runningSpeedHz !== null) return `${roundTo(hz / runningSpeedHz, 3, rounding)}x`;
  return printFrequency(roundTo(hz, 4, rounding));
}

/** Rounded up or down to so many significant figures, as `rounding` says; exact figures stay as they are. */
function roundTo(value: number, figures: number, rounding: (value: number) => number): number {
  if (!(value > 0)) return 0;
  const step = 10 ** (figures - 1 - Math.floor(Math.log10(value)));
  const scaled = value * step;
  const whole = Math.abs(scaled - Math.round(scaled)) < 1e-6 ? Math.round(scaled) : rounding(scaled);
  return Number((whole / step).toPrecision(figures));
}
