import { speedOrigin } from '../../advisory/wording.ts';
import { observedSpeed } from '../../assessment/assess.ts';
import { printNumber } from '../../config/print-value.ts';
import type { MeasuredSpeed, OrderSpectrum, SpectralPeak } from '../../manipulation/measurement.ts';

export function speedJson(speed: MeasuredSpeed) {
  const { inSpectrum, rangeRpm } = speed;
  return {
    rpm: speed.rpm,
    origin: speed.origin,
    uncertainty_rpm: speed.uncertaintyRpm,
    names_lines: observedSpeed(speed) !== null,
    lowest_rpm: rangeRpm?.lowest ?? null,
    highest_rpm: rangeRpm?.highest ?? null,
    in_spectrum: inSpectrum && {
      rpm: inSpectrum.rpm,
      uncertainty_rpm: inSpectrum.uncertaintyRpm,
      score_db: inSpectrum.score,
    },
  };
}

/** The running speed for people: how well it is known, where from, what the recording says beside it. */
export function speedText(speed: MeasuredSpeed): string {
  const { rpm, uncertaintyRpm, origin, rangeRpm, inSpectrum } = speed;
  const words = [`${printNumber(rpm, 5)} rpm ± ${printNumber(uncertaintyRpm, 2)}, ${speedOrigin[origin]}`];
  if (rangeRpm !== null)
    words.push(`between ${printNumber(rangeRpm.lowest, 4)} and ${printNumber(rangeRpm.highest, 4)} rpm`);
  if (inSpectrum !== null && origin !== 'spectrum')
    words.push(
      `the spectrum shows ${printNumber(inSpectrum.rpm, 5)} rpm ± ${printNumber(inSpectrum.uncertaintyRpm, 2)}`,
    );
  if (observedSpeed(speed) === null) words.push('no line is named by it');
  return words.join('; ');
}

/** The spectrum over orders as JSON; `spectrum` adds its density. */
export function ordersJson(
  orders: OrderSpectrum,
  unit: string,
  peakJson: (peak: SpectralPeak, unit: string) => unknown,
  spectrum: boolean,
) {
  return {
    mean_rpm: orders.meanRpm,
    line_spacing_orders: orders.lineSpacingOrders,
    averages: orders.averages,
    peaks: orders.peaks.map((peak) => peakJson(peak, unit)),
    ...(spectrum
      ? {
          spectrum: {
            line_spacing_orders: orders.lineSpacingOrders,
            unit: `(${unit})²/order`,
            density: Array.from(orders.density),
          },
        }
      : {}),
  };
}

/** How it was made, for people. */
export function ordersText({ meanRpm, lineSpacingOrders, averages }: OrderSpectrum): string {
  const spacing = `a line every ${printNumber(lineSpacingOrders)} orders`;
  const count = `${averages} ${averages === 1 ? 'average' : 'averages'}`;
  return `from samples at equal angles, for the speed moved; ${spacing}; ${count}; in Hz at ${printNumber(meanRpm, 4)} rpm`;
}
