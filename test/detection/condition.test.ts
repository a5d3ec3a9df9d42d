import { describe, expect, it } from 'vitest';
import type { OperatingCondition } from '../../src/config/site.ts';
import { conditionOf } from '../../src/detection/condition.ts';
import type { SpeedOrigin } from '../../src/manipulation/measurement.ts';

const speed = (rpm: number, origin: SpeedOrigin = 'sidecar') => ({
  rpm,
  origin,
  uncertaintyRpm: 1,
  usableForNames: true,
  rangeRpm: null,
  inSpectrum: null,
});
const full: OperatingCondition = {
  id: 'full',
  speedHz: { from: 2800 / 60, to: 3000 / 60 },
  loadPercent: { from: 60, to: 100 },
};
const part: OperatingCondition = {
  id: 'part',
  speedHz: { from: 1000 / 60, to: 3000 / 60 },
  loadPercent: null,
};

describe('the operating condition of a recording', () => {
  it('is the first that fits, both ends belonging to it', () => {
    expect(conditionOf([full, part], { speed: speed(3000), loadPercent: 60 })).toBe('full');
    expect(conditionOf([full, part], { speed: speed(2900), loadPercent: 59 })).toBe('part');
    expect(conditionOf([full, part], { speed: speed(900), loadPercent: 80 })).toBeNull();
  });

  it('is one for all running where the machine lists none', () => {
    expect(conditionOf([], { speed: null, loadPercent: null })).toBe('');
  });

  it('is not guessed: a nominal speed and a load that nobody gave fit nothing that asks for them', () => {
    expect(conditionOf([full], { speed: speed(2900, 'nominal'), loadPercent: 80 })).toBeNull();
    expect(conditionOf([full], { speed: speed(2900), loadPercent: null })).toBeNull();
    expect(conditionOf([part], { speed: null, loadPercent: 80 })).toBeNull();
  });
});
