import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  letterOf,
  machineZone,
  pointZone,
  type ZoneLevel,
  type ZoneReading,
} from '../../src/assessment/zone.ts';
import { zoneChange } from '../../src/assessment/zone-change.ts';
import { type ZoneChoice, zonesOfMachine } from '../../src/config/machine-zones.ts';
import { readZoneTable, type ZoneStandard, zoneLetters } from '../../src/config/zone-tables.ts';

const zonesFor = (standard: ZoneStandard, choice: Partial<ZoneChoice>) =>
  zonesOfMachine(
    readZoneTable(readFileSync(new URL(`../../config/zones/${standard}.json`, import.meta.url), 'utf8')),
    { powerW: null, shaftHeightM: null, support: null, category: null, class: null, ...choice },
  );
/** ISO 20816-3, group 2, rigid: 1.4, 2.8, 4.5 mm/s; 22, 45, 71 µm. */
const group2 = zonesFor('iso-20816-3', { powerW: 110_000, support: 'rigid' });

const velocity = (level: number, parts: Partial<ZoneLevel> = {}): ZoneLevel => ({
  bandId: 'overall',
  quantity: 'velocity',
  fromHz: 10,
  toHz: 1000,
  level: level / 1000,
  atLeast: false,
  ...parts,
});
const displacement = (um: number): ZoneLevel =>
  velocity(um / 1000, { bandId: 'stroke', quantity: 'displacement' });

function reading(levels: readonly ZoneLevel[], parts: Partial<ZoneReading> = {}): ZoneReading {
  return {
    point: { id: 'de-h', quantity: 'acceleration', sensorOn: null },
    state: 'running',
    speedRpm: 2970,
    levels,
    flags: [],
    ...parts,
  };
}

const zone = (...args: Parameters<typeof reading>) => pointZone(group2, reading(...args)).zone;
const letter = (...args: Parameters<typeof reading>) => zone(...args).letter;
const why = (...args: Parameters<typeof reading>) => {
  const answer = zone(...args);
  return answer.letter === null ? answer.why : answer.letter;
};

describe('the zone of a level', () => {
  it('is A to D by the boundaries; a level on a boundary is in the better zone', () => {
    const levels = [0, 1.4, 1.41, 2.8, 2.81, 4.5, 4.51, 90];
    expect(levels.map((level) => letter([velocity(level)]))).toEqual([
      'A',
      'A',
      'B',
      'B',
      'C',
      'C',
      'D',
      'D',
    ]);
    expect([22, 22.1, 45, 45.1, 71, 71.1].map((um) => letter([displacement(um)]))).toEqual([
      ...['A', 'B', 'B', 'C', 'C', 'D'],
    ]);
  });

  it('never gets better as the level rises', () => {
    const level = fc.double({ min: 0, max: 0.05, noNaN: true });
    const [row] = group2.boundaries;
    if (row === undefined) throw new Error('no row');
    fc.assert(
      fc.property(level, level, (a, b) => {
        const [low, high] = [Math.min(a, b), Math.max(a, b)];
        const rank = (value: number) => zoneLetters.indexOf(letterOf(value, row));
        return rank(low) <= rank(high);
      }),
      { seed: 20261201 },
    );
  });

  it('says of a clipped recording at least which one it is', () => {
    expect(zone([velocity(3, { atLeast: true })])).toMatchObject({ letter: 'C', atLeast: true });
    expect(zone([velocity(9, { atLeast: true })])).toMatchObject({ letter: 'D', atLeast: false });
  });
});

describe('the zone of a point', () => {
  it('is the worse of velocity and displacement (ISO 10816-3, 5.2.3)', () => {
    expect(letter([velocity(1), displacement(50)])).toBe('C');
    expect(letter([velocity(5), displacement(10)])).toBe('D');
    expect(letter([velocity(1), displacement(10)])).toBe('A');
  });

  it('looks only at bands over the range of the table, whatever else the point has', () => {
    const bearing = velocity(9000, { bandId: 'bearing', quantity: 'acceleration', fromHz: 2000, toHz: 8000 });
    const wide = velocity(9, { bandId: 'wide', fromHz: 2 });
    const { zone: worst, bands } = pointZone(group2, reading([bearing, wide, velocity(2)]));
    expect(worst.letter).toBe('B');
    expect([...bands].map(([id, one]) => [id, one.letter])).toEqual([
      ['bearing', null],
      ['wide', null],
      ['overall', 'B'],
    ]);
    expect(why([bearing])).toBe('there is no level of what ISO 20816-3 judges');
    expect(why([])).toBe('there is no level of what ISO 20816-3 judges');
  });
});

describe('no zone, and the reason', () => {
  it('outside steady running', () => {
    expect(why([velocity(2)], { state: 'stopped' })).toBe('the machine stood still');
    expect(why([velocity(2)], { state: 'transient' })).toMatch(/started a short while before/);
    expect(why([velocity(2)], { flags: ['unsteady'] })).toBe('the vibration changed within the recording');
    expect(why([velocity(2)], { flags: ['not-running'] })).toBe('the machine stood still');
  });

  it('where the level may be that of a sensor or cable', () => {
    for (const flag of ['flat', 'dropouts', 'hum-only', 'low-signal', 'bias-out-of-range', 'ski-slope'])
      expect(why([velocity(2)], { flags: [flag] })).toBe(`the recording is flagged ${flag}`);
    for (const flag of ['late', 'clipped', 'clock-ahead', 'settling'])
      expect(letter([velocity(2)], { flags: [flag] })).toBe('B');
  });

  it('on a shaft or elsewhere; a sensor of displacement looks at the shaft unless it is said not to', () => {
    const point = { id: 'x', quantity: 'displacement', sensorOn: null } as const;
    expect(why([displacement(30)], { point })).toMatch(
      /the sensor looks at the shaft, ISO 20816-3 holds for bearing housings; if it does sit there, say sensor_on: bearing-housing$/,
    );
    expect(letter([displacement(30)], { point: { ...point, sensorOn: 'bearing-housing' } })).toBe('B');
    const elsewhere = { id: 'x', quantity: 'acceleration', sensorOn: 'elsewhere' } as const;
    expect(why([velocity(2)], { point: elsewhere })).toMatch(/elsewhere than on a bearing housing/);
  });

  it('outside the power and speed of the table, or without a speed', () => {
    const small = zonesFor('iso-20816-3', { powerW: 11_000, support: 'rigid' });
    expect(pointZone(small, reading([velocity(2)])).zone).toEqual({
      letter: null,
      why: 'ISO 20816-3 holds above 15 kW to 50 MW, this machine has 11 kW',
    });
    expect(why([velocity(2)], { speedRpm: null })).toMatch(/speed is not known/);
    expect(why([velocity(2, { fromHz: 2 })], { speedRpm: 100 })).toMatch(/holds from 120 rpm/);
    expect(why([velocity(2)], { speedRpm: 590 })).toMatch(/over 2 Hz to 1000 Hz below 600 rpm/);
    expect(letter([velocity(2, { fromHz: 2 })], { speedRpm: 590 })).toBe('B');
  });

  it('where the level is no number', () => {
    expect(why([velocity(Number.NaN)])).toBe('there is no level');
    expect(why([velocity(Number.POSITIVE_INFINITY)])).toBe('there is no level');
  });
});

describe('the zone of a machine', () => {
  const at = (id: string, level: number, parts: Partial<ZoneReading> = {}) =>
    reading([velocity(level)], { point: { id, quantity: 'acceleration', sensorOn: null }, ...parts });

  it('is the worst of its points, and names the one', () => {
    const found = machineZone({ zones: group2 }, [at('de', 1), at('nde', 3), at('top', 2)]);
    expect([found.zone.letter, found.pointId]).toEqual(['C', 'nde']);
    expect(found.points.map(({ zone: one }) => one.letter)).toEqual(['A', 'C', 'B']);
  });

  it('is that of the points that are in one; none, with the reason, where none is', () => {
    const one = machineZone({ zones: group2 }, [at('de', 9, { flags: ['flat'] }), at('nde', 2)]);
    expect([one.zone.letter, one.pointId]).toEqual(['B', 'nde']);
    const none = machineZone({ zones: group2 }, [at('de', 9, { state: 'stopped' })]);
    expect(none).toMatchObject({ zone: { letter: null, why: 'the machine stood still' }, pointId: null });
    expect(machineZone({ zones: group2 }, []).zone).toEqual({ letter: null, why: 'there is no recording' });
    expect(machineZone({ zones: null }, [at('de', 1)]).zone.letter).toBeNull();
    expect(machineZone({}, [at('de', 1)]).zone).toMatchObject({ why: /names no zones/ });
  });

  it('is judged for pumps by ISO 10816-7: category I, up to 200 kW', () => {
    const pump = zonesFor('iso-10816-7', { powerW: 90_000, category: 'I' });
    const letters = [2.5, 4, 4.1, 6.6, 6.7].map(
      (level) => machineZone({ zones: pump }, [at('de', level)]).zone.letter,
    );
    expect(letters).toEqual(['A', 'B', 'C', 'C', 'D']);
    // 80 µm peak to peak = 28.3 µm r.m.s., derived.
    const stroke = (um: number) =>
      pointZone(pump, reading([displacement(um / (2 * Math.SQRT2))])).zone.letter;
    expect([49.9, 79.9, 80.1, 131].map(stroke)).toEqual(['A', 'B', 'C', 'D']);
  });
});

describe('the change criterion: more than 25 % of B/C, up or down (ISO 10816-1 and -3, 5.3)', () => {
  it.each([
    ['group 1 rigid', 1000, 'rigid', 1.125],
    ['group 1 flexible', 1000, 'flexible', 1.775],
    ['group 2 rigid', 110, 'rigid', 0.7],
    ['group 2 flexible', 110, 'flexible', 1.125],
  ] as const)('%s', (_what, kw, support, threshold) => {
    const [row] = zonesFor('iso-10816-3', { powerW: kw * 1000, support }).boundaries;
    if (row === undefined) throw new Error('no row');
    const significant = (by: number) => zoneChange((2 + by) / 1000, 2 / 1000, row)?.significant;
    expect(zoneChange(0.003, 0.002, row)?.threshold).toBeCloseTo(threshold / 1000, 12);
    expect([threshold, threshold + 0.01, -threshold, -threshold - 0.01].map(significant)).toEqual([
      ...[false, true, false, true],
    ]);
  });

  it('counts whatever the zone, and is silent without numbers', () => {
    const [row] = group2.boundaries;
    if (row === undefined) throw new Error('no row');
    expect(zoneChange(0.001, 0.0002, row)).toMatchObject({ significant: true, reference: 0.0002 });
    expect(zoneChange(Number.NaN, 0.001, row)).toBeNull();
    expect(zoneChange(0.001, Number.POSITIVE_INFINITY, row)).toBeNull();
  });
});
