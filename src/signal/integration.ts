/** Quantities of one motion, each the time derivative of the next. */
const motionQuantities: readonly string[] = ['acceleration', 'velocity', 'displacement'];

/** How often a quantity is integrated over time to become another. */
export type Integrations = 0 | 1 | 2;

export interface IntegrationRefusal {
  readonly refused: 'differentiation' | 'other-quantity';
  /** What is wrong and what would do, for people. */
  readonly reason: string;
}

/**
 * Integrations from the measured quantity to the wanted one: acceleration to velocity 1, acceleration to
 * displacement 2, any quantity to itself 0. The other way would differentiate, which raises noise without bound
 * towards high frequencies, and is refused; so is a quantity that is no motion.
 */
export function integrationsBetween(measured: string, wanted: string): Integrations | IntegrationRefusal {
  if (measured === wanted) return 0;
  const from = motionQuantities.indexOf(measured);
  const to = motionQuantities.indexOf(wanted);
  if (from < 0 || to < 0) {
    return {
      refused: 'other-quantity',
      reason: `${wanted} cannot be derived from ${measured}; ask for ${measured} itself`,
    };
  }
  if (to < from) {
    return {
      refused: 'differentiation',
      reason: `${wanted} would need ${measured} to be differentiated; ask for ${motionQuantities
        .slice(from)
        .join(' or ')}`,
    };
  }
  return (to - from) as Integrations;
}

/**
 * Mean of (2 pi f)^(-2 n) over the part [fromHz, toHz] of a line's cell, n integrations: what the density there is
 * multiplied by to become that of the integrated quantity. Units s^(2 n).
 *
 * n = 1: 1 / (4 pi² a b). n = 2: (a^-3 - b^-3) / (3 (b - a) (2 pi)^4), here in a form that does not lose digits
 * when the cell is narrow. Throws a RangeError unless 0 < fromHz <= toHz (any number of integrations of 0 Hz is
 * without bound).
 * Checked: 1 integration at 159.154943 Hz (1000 rad/s): 1e-6.
 */
export function integrationFactor(fromHz: number, toHz: number, integrations: Integrations): number {
  if (integrations === 0) return 1;
  if (!(fromHz > 0 && fromHz <= toHz)) throw new RangeError(`integration over ${fromHz} to ${toHz} Hz`);
  const a = 2 * Math.PI * fromHz;
  const b = 2 * Math.PI * toHz;
  if (integrations === 1) return 1 / (a * b);
  return (a * a + a * b + b * b) / (3 * (a * b) ** 3);
}
