import { describe, expect, test } from 'vitest';
import { integrationFactor, integrationsBetween } from '../../src/signal/integration.ts';

/** Level factor of a tone: square root of the factor over a cell too narrow to matter. */
function toneFactor(frequencyHz: number, integrations: 1 | 2): number {
  return Math.sqrt(integrationFactor(frequencyHz * (1 - 1e-9), frequencyHz * (1 + 1e-9), integrations));
}

describe('a tone of 1 g (9.80665 m/s², exact by the 3rd CGPM 1901)', () => {
  // Velocity mm/s and displacement um, by division by 2 pi f.
  test.each([
    [10, 156.07768, 2484.05346],
    [50, 31.21554, 99.36214],
    [100, 15.60777, 24.84053],
    [159.154943, 9.80665, 9.80665],
    [1000, 1.56078, 0.24841],
  ])('at %f Hz is %f mm/s and %f um', (frequency, velocity, displacement) => {
    expect(9806.65 * toneFactor(frequency, 1)).toBeCloseTo(velocity, 5);
    expect(9806650 * toneFactor(frequency, 2)).toBeCloseTo(displacement, 5);
  });

  test('4.5 mm/s is 71.6197 um at 10 Hz and 14.3239 um at 50 Hz', () => {
    expect(4500 * toneFactor(10, 1)).toBeCloseTo(71.6197, 4);
    expect(4500 * toneFactor(50, 1)).toBeCloseTo(14.3239, 4);
  });
});

describe('the factor over a wide cell', () => {
  test('is the mean of (2 pi f)^-2n, by many thin slices', () => {
    for (const [a, b] of [
      [0.5, 1.5],
      [9.7, 10.4],
      [1, 30],
    ]) {
      const slices = 20_000;
      let once = 0;
      let twice = 0;
      for (let i = 0; i < slices; i++) {
        const omega = 2 * Math.PI * (a + ((i + 0.5) * (b - a)) / slices);
        once += omega ** -2 / slices;
        twice += omega ** -4 / slices;
      }
      expect(integrationFactor(a, b, 1) / once).toBeCloseTo(1, 5);
      expect(integrationFactor(a, b, 2) / twice).toBeCloseTo(1, 5);
    }
  });

  test('a narrow cell loses no digits', () => {
    const omega = 2 * Math.PI * 1000;
    expect(Math.abs(integrationFactor(1000, 1000 + 1e-9, 2) * omega ** 4 - 1)).toBeLessThan(1e-11);
    expect(integrationFactor(1000, 1000, 2) * omega ** 4).toBeCloseTo(1, 14);
  });

  test('0 Hz cannot be integrated, but needs no integration', () => {
    expect(() => integrationFactor(0, 1, 1)).toThrow('integration over 0 to 1 Hz');
    expect(() => integrationFactor(2, 1, 2)).toThrow(RangeError);
    expect(integrationFactor(0, 1, 0)).toBe(1);
  });
});

describe('from one quantity to another', () => {
  test.each([
    ['acceleration', 'acceleration', 0],
    ['acceleration', 'velocity', 1],
    ['acceleration', 'displacement', 2],
    ['velocity', 'displacement', 1],
    ['displacement', 'displacement', 0],
    ['sound-pressure', 'sound-pressure', 0],
  ])('%s to %s', (measured, wanted, integrations) => {
    expect(integrationsBetween(measured, wanted)).toBe(integrations);
  });

  test('differentiation is refused and says what can be had', () => {
    expect(integrationsBetween('velocity', 'acceleration')).toEqual({
      refused: 'differentiation',
      reason: 'acceleration would need velocity to be differentiated; ask for velocity or displacement',
    });
  });

  test('what is no motion cannot become one', () => {
    expect(integrationsBetween('current', 'velocity')).toEqual({
      refused: 'other-quantity',
      reason: 'velocity cannot be derived from current; ask for current itself',
    });
    expect(integrationsBetween('velocity', 'current')).toMatchObject({ refused: 'other-quantity' });
  });
});
