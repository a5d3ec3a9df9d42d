import type { Quantity } from '../config/site.ts';
import { quantile } from '../signal/statistics.ts';
import { qualityRules as rules } from './quality-rules.ts';
import type { QualityFinding } from './recording.ts';

export interface SpectrumLook {
  /** One-sided, (SI unit of the quantity)²/Hz. */
  readonly density: Float64Array;
  readonly lineSpacingHz: number;
  readonly averages: number;
}

/** What is known of the machine once its recording is read. */
export interface MachineLook {
  /** Lower edge of the lowest band in velocity, Hz; null: none is asked for. */
  readonly lowestVelocityHz: number | null;
  readonly speedHz: number | null;
}

export interface SpectrumQuestion extends MachineLook {
  readonly quantity: Quantity;
}

/** Lines nearest to 0 that hold what the removal of the mean leaves; no rule looks at them. */
const lowestLine = 3;

/** Findings of a spectrum: mains hum and nothing else, or a velocity that is nothing but its slope. */
export function spectrumFindings(look: SpectrumLook, question: SpectrumQuestion): QualityFinding[] {
  const found: QualityFinding[] = [];
  const hum = rules.humFrequenciesHz
    .map((mains) => humOnly(look, mains, question.speedHz))
    .find((text) => text !== null);
  if (hum !== undefined) found.push({ flag: 'hum-only', detail: hum });
  const slope = skiSlope(look, question);
  if (slope !== null) found.push({ flag: 'ski-slope', detail: slope });
  return found;
}

function humOnly(
  { density, lineSpacingHz }: SpectrumLook,
  mainsHz: number,
  speedHz: number | null,
): string | null {
  if (speedHz !== null && speedHz > 0) {
    const multiple = Math.max(1, Math.round(mainsHz / speedHz));
    const nearHz = multiple === 1 ? rules.humSpeedPart * mainsHz : rules.humSpeedDistanceHz;
    if (Math.abs(multiple * speedHz - mainsHz) < nearHz) return null;
  }
  const belowHz = speedHz === null ? rules.humBelowUnknownSpeedHz : rules.humToleranceHz;
  const side = rules.humSideLines;
  // Where the multiples cover most lines anyway, their share says nothing.
  if ((2 * side + 1) * lineSpacingHz > 0.5 * mainsHz) return null;
  let all = 0;
  for (let line = lowestLine; line < density.length; line++) all += density[line];
  let atMultiples = 0;
  let standing = 0;
  for (let k = 1; k * mainsHz < (density.length - 1 - side) * lineSpacingHz; k++) {
    const centre = Math.round((k * mainsHz) / lineSpacingHz);
    let part = 0;
    let peak = centre;
    for (let line = Math.max(lowestLine, centre - side); line <= centre + side; line++) {
      part += density[line];
      if (density[line] > density[peak]) peak = line;
    }
    atMultiples += part;
    const offHz = (peakLine(density, peak) * lineSpacingHz) / k - mainsHz;
    if (part > 1e-4 * all && offHz <= rules.humToleranceHz && offHz >= -belowHz) standing++;
  }
  if (atMultiples < rules.humPart * all || standing < rules.humLeastMultiples) return null;
  const share = ((100 * atMultiples) / all).toFixed(1);
  return `${share} % of the power lies at multiples of ${mainsHz} Hz: mains hum, no vibration; check cable and shield`;
}

/** Where a peak lies between the lines, by a parabola through the logarithms: good to a twentieth of a line. */
function peakLine(density: Float64Array, line: number): number {
  if (line < 1 || line >= density.length - 1) return line;
  const [below, at, above] = [line - 1, line, line + 1].map((n) => Math.log(density[n] + Number.MIN_VALUE));
  const bend = below - 2 * at + above;
  return bend < 0 ? line + (0.5 * (below - above)) / bend : line;
}

/**
 * Judged from the lower edge of the lowest velocity band on, over four octaves: the lower quartile of the lines in
 * each octave (tones fill less than that) against its frequency.
 */
function skiSlope(look: SpectrumLook, { quantity, lowestVelocityHz }: SpectrumQuestion): string | null {
  const { density, lineSpacingHz, averages } = look;
  if (lowestVelocityHz === null || averages < rules.skiSlopeLeastAverages) return null;
  if (quantity !== 'acceleration' && quantity !== 'velocity') return null;
  const first = Math.max(lowestLine, Math.ceil(lowestVelocityHz / lineSpacingHz));
  // In an octave of fewer lines a tone fills the lower quartile too.
  if (first < rules.skiSlopeLeastLines || 16 * first >= density.length) return null;
  const velocity = (line: number) =>
    quantity === 'velocity' ? density[line] : density[line] / (2 * Math.PI * line * lineSpacingHz) ** 2;
  const octaves = [1, 2, 4, 8].map((octave) => {
    const lines = Array.from({ length: octave * first }, (_, n) => octave * first + n);
    return { x: Math.log(octave * first * Math.SQRT2), y: Math.log(quantile(lines.map(velocity), 0.25)) };
  });
  const { slope, at } = straightLine(octaves);
  if (!(slope <= rules.skiSlopeExponent)) return null;
  // An even acceleration gives 1/f too: a pump that cavitates is not a doubtful sensor.
  const middle = 4 * first;
  const acceleration = Math.sqrt(Math.exp(at(Math.log(middle)))) * 2 * Math.PI * middle * lineSpacingHz;
  if (slope > rules.skiSlopeSteepExponent && acceleration > rules.sensorNoise) return null;
  let all = 0;
  let floor = 0;
  for (let line = first; line < density.length; line++) {
    const fitted = Math.exp(at(Math.log(line)));
    all += velocity(line);
    // What stands above the fitted slope (tones) is none of it.
    floor += Math.min(velocity(line), 2 * fitted);
  }
  if (floor < rules.skiSlopePart * all) return null;
  const share = Math.round((100 * floor) / all);
  return `the velocity rises towards its lowest lines like f^${(slope / 2).toFixed(1)} and this slope is ${share} % of its power: sensor noise or an overdriven input, integrated`;
}

function straightLine(points: readonly { readonly x: number; readonly y: number }[]) {
  const mx = points.reduce((sum, { x }) => sum + x, 0) / points.length;
  const my = points.reduce((sum, { y }) => sum + y, 0) / points.length;
  const slope =
    points.reduce((sum, { x, y }) => sum + (x - mx) * (y - my), 0) /
    points.reduce((sum, { x }) => sum + (x - mx) ** 2, 0);
  return { slope, at: (x: number) => my + slope * (x - mx) };
}
