/**
 * The zone tables against the published figures, typed here a second time. Sources: for ISO 10816-3 a motor maker's
 * maintenance manual (group 1, velocity) and the tests of an open acoustics library that quote Tables A.1 and A.2; for
 * ISO 10816-1 a motor maker's data sheet; for ISO 10816-7 a one-page summary of DIN ISO 10816-7:2009-08.
 */
import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { boundariesFor, type ZoneChoice, zonesName, zonesOfMachine } from '../../src/config/machine-zones.ts';
import { inDisplayUnit } from '../../src/config/print-value.ts';
import { readZoneTable, type ZoneStandard, zoneStandards } from '../../src/config/zone-tables.ts';

const folder = new URL('../../config/zones/', import.meta.url);
const table = (standard: ZoneStandard) =>
  readZoneTable(readFileSync(new URL(`${standard}.json`, folder), 'utf8'));

const nothing: ZoneChoice = { powerW: null, shaftHeightM: null, support: null, category: null, class: null };
const zonesFor = (standard: ZoneStandard, choice: Partial<ZoneChoice>) =>
  zonesOfMachine(table(standard), { ...nothing, ...choice });

/** In the table's own unit, as it is printed there. */
function printed(zones: ReturnType<typeof zonesFor>, quantity: 'velocity' | 'displacement') {
  const row = zones.boundaries.find((one) => one.quantity === quantity);
  if (row === undefined) return null;
  return [row.ab, row.bc, row.cd].map((value) => Number(inDisplayUnit(value, row.display).toPrecision(12)));
}

describe('the zone tables', () => {
  it('are one file a standard, and each row says where its figures come from', () => {
    expect(readdirSync(folder).sort()).toEqual(zoneStandards.map((name) => `${name}.json`).sort());
    for (const standard of zoneStandards) {
      const { name, rows, standard: said } = table(standard);
      expect(said).toBe(standard);
      for (const { source, known, display } of rows) {
        expect(source.length).toBeGreaterThan(20);
        expect(['seen', 'memory']).toContain(known);
        expect(source).toContain(name);
        expect(['mm/s', 'µm r.m.s.', 'µm peak to peak (derived)']).toContain(display.text);
      }
    }
  });

  it('say of ISO 20816-3:2022, of which only the title page was seen, that its boundaries are from memory', () => {
    const known = (standard: ZoneStandard) => new Set(table(standard).rows.map((row) => row.known));
    expect([...known('iso-20816-3')]).toEqual(['memory']);
    expect([...known('iso-10816-3')]).toEqual(['seen']);
  });

  it('refuse a file whose boundaries are not in order', () => {
    const text = readFileSync(new URL('iso-10816-1.json', folder), 'utf8');
    expect(() => readZoneTable(text.replace('"bc": 1.8', '"bc": 0.18'))).toThrow(/not in order/);
    expect(() => readZoneTable(text.replace('"mm/s rms"', '"mm/h"'))).toThrow(/zone table/);
    expect(() => readZoneTable(text.replace('"iso-10816-1"', '"iso-1"'))).toThrow(/no zone table/);
  });
});

describe('ISO 10816-3:2009 and ISO 20816-3:2022, Tables A.1 and A.2', () => {
  it.each([
    ['rigid', 1000, 'group 1, rigid', [2.3, 4.5, 7.1], [29, 57, 90]],
    ['flexible', 1000, 'group 1, flexible', [3.5, 7.1, 11], [45, 90, 140]],
    ['rigid', 110, 'group 2, rigid', [1.4, 2.8, 4.5], [22, 45, 71]],
    ['flexible', 110, 'group 2, flexible', [2.3, 4.5, 7.1], [37, 71, 113]],
  ] as const)('%s, %d kW: %s', (support, kw, place, velocity, displacement) => {
    for (const standard of ['iso-10816-3', 'iso-20816-3'] as const) {
      const zones = zonesFor(standard, { support, powerW: kw * 1000 });
      expect([zones.place, zones.outside]).toEqual([place, null]);
      expect(printed(zones, 'velocity')).toEqual(velocity);
      expect(printed(zones, 'displacement')).toEqual(displacement);
      expect(zones.boundaries.map(({ display }) => display.detector)).toEqual(['rms', 'rms']);
    }
  });

  it('meet at about 12.5 Hz in group 1 and 10 Hz in group 2: below it displacement decides', () => {
    for (const [kw, about] of [
      [1000, 12.5],
      [110, 10],
    ] as const) {
      const { boundaries } = zonesFor('iso-10816-3', { support: 'rigid', powerW: kw * 1000 });
      const [v, d] = boundaries;
      const meetHz = (v?.bc ?? 0) / (2 * Math.PI * (d?.bc ?? 1));
      expect(Math.abs(meetHz - about)).toBeLessThan(0.6);
    }
  });

  it('part the groups above 300 kW and begin above 15 kW', () => {
    const placeAt = (kw: number) => zonesFor('iso-20816-3', { support: 'rigid', powerW: kw * 1000 });
    expect([15.001, 300, 300.001, 50_000].map((kw) => placeAt(kw).place)).toEqual([
      'group 2, rigid',
      'group 2, rigid',
      'group 1, rigid',
      'group 1, rigid',
    ]);
    expect(placeAt(15).outside).toBe('ISO 20816-3 holds above 15 kW to 50 MW, this machine has 15 kW');
    expect(placeAt(50_001).boundaries).toEqual([]);
  });

  it('group electrical machines by their shaft height, whatever their power', () => {
    const at = (mm: number, kw = 250) =>
      zonesFor('iso-20816-3', { support: 'rigid', powerW: kw * 1000, shaftHeightM: mm / 1000 });
    expect([160, 314.9, 315].map((mm) => at(mm).place)).toEqual([
      'group 2, rigid',
      'group 2, rigid',
      'group 1, rigid',
    ]);
    expect(at(132).outside).toBe('ISO 20816-3 holds for shaft heights from 160 mm, this one is 132 mm');
  });
});

describe('ISO 10816-1:1995, Annex B', () => {
  it.each([
    ['I', [0.71, 1.8, 4.5]],
    ['II', [1.12, 2.8, 7.1]],
    ['III', [1.8, 4.5, 11.2]],
    ['IV', [2.8, 7.1, 18]],
  ] as const)('class %s', (ofClass, velocity) => {
    const zones = zonesFor('iso-10816-1', { class: ofClass });
    expect(zonesName(zones)).toBe(`ISO 10816-1 (class ${ofClass})`);
    expect(printed(zones, 'velocity')).toEqual(velocity);
    expect(printed(zones, 'displacement')).toBeNull();
    // The preferred ladder 0.28 x 10^(k/5), rounded as printed (12 is printed 11.2).
    for (const value of velocity) {
      const k = Math.round(5 * Math.log10(value / 0.28));
      expect(Math.abs(value / (0.28 * 10 ** (k / 5)) - 1)).toBeLessThan(0.02);
    }
  });
});

describe('ISO 10816-7:2009, rotodynamic pumps', () => {
  it.each([
    ['I', 200, 'category I, up to 200 kW', [2.5, 4, 6.6], 5, 8.3],
    ['I', 201, 'category I, above 200 kW', [3.5, 5, 7.6], 6.3, 9.5],
    ['II', 200, 'category II, up to 200 kW', [3.2, 5.1, 8.5], 6.4, 10.6],
    ['II', 201, 'category II, above 200 kW', [4.2, 6.1, 9.5], 7.6, 11.9],
  ] as const)('category %s, %d kW', (category, kw, place, velocity, alarm, trip) => {
    const zones = zonesFor('iso-10816-7', { category, powerW: kw * 1000 });
    expect(zones.place).toBe(place);
    expect(printed(zones, 'velocity')).toEqual(velocity);
    expect(printed(zones, 'displacement')).toEqual([50, 80, 130]);
    const [row, displacement] = zones.boundaries;
    expect([row?.alarmAtMost, row?.tripAtMost]).toEqual([alarm / 1000, trip / 1000]);
    // Printed ceilings are 1.25 x the boundaries within their rounding.
    expect(Math.abs((row?.alarmAtMost ?? 0) - 1.25 * (row?.bc ?? 0))).toBeLessThanOrEqual(0.05e-3 + 1e-12);
    // Peak to peak is derived: 2 sqrt 2 of the r.m.s.
    expect(displacement?.bc).toBeCloseTo(80e-6 / (2 * Math.SQRT2), 12);
  });

  it('begin above 1 kW', () => {
    expect(zonesFor('iso-10816-7', { category: 'II', powerW: 1000 }).outside).toBe(
      'ISO 10816-7 holds above 1 kW, this machine has 1 kW',
    );
  });
});

describe('a table holds only under its own conditions', () => {
  const zones = zonesFor('iso-20816-3', { support: 'rigid', powerW: 110_000 });
  const velocity = { quantity: 'velocity', fromHz: 10, toHz: 1000 } as const;
  const whyNot = (...args: Parameters<typeof boundariesFor>) => {
    const answer = boundariesFor(...args);
    return answer.ok ? null : answer.why;
  };

  it('from 10 Hz, and below 600 rpm from 2 Hz, to 1000 Hz', () => {
    const slow = { ...velocity, fromHz: 2 };
    expect([whyNot(zones, velocity, 600), whyNot(zones, velocity, 2970), whyNot(zones, slow, 599)]).toEqual([
      null,
      null,
      null,
    ]);
    expect(whyNot(zones, slow, 600)).toBe(
      'the band is over 2 Hz to 1000 Hz, ISO 20816-3 over 10 Hz to 1000 Hz from 600 rpm on',
    );
    expect(whyNot(zones, velocity, 599)).toBe(
      'the band is over 10 Hz to 1000 Hz, ISO 20816-3 over 2 Hz to 1000 Hz below 600 rpm',
    );
    expect(whyNot(zones, { ...velocity, toHz: 2000 }, 2970)).toMatch(/over 10 Hz to 2 kHz/);
    expect(whyNot(zones, { ...velocity, fromHz: 12 }, 2970)).toMatch(/over 12 Hz/);
    expect(whyNot(zones, { ...velocity, fromHz: 10.05 }, 2970)).toBeNull();
  });

  it('at a speed that is known and covered: 120 to 30,000 rpm, of the 2009 edition to 15,000', () => {
    const older = zonesFor('iso-10816-3', { support: 'rigid', powerW: 110_000 });
    expect(whyNot(zones, velocity, null)).toMatch(/running speed is not known/);
    expect(whyNot(zones, { ...velocity, fromHz: 2 }, 119)).toBe(
      'ISO 20816-3 holds from 120 rpm, the machine runs at 119 rpm',
    );
    expect(whyNot(zones, velocity, 20_000)).toBeNull();
    expect(whyNot(older, velocity, 20_000)).toBe(
      'ISO 10816-3 holds to 15000 rpm, the machine runs at 20000 rpm',
    );
    expect(whyNot(zones, velocity, 30_001)).toMatch(/holds to 30000 rpm/);
    expect(whyNot(zonesFor('iso-10816-1', { class: 'II' }), velocity, 500)).toMatch(/holds from 600 rpm/);
  });

  it('for r.m.s. velocity and displacement, and nothing else', () => {
    for (const quantity of ['acceleration', 'sound-pressure', 'current', 'other'] as const)
      expect(whyNot(zones, { ...velocity, quantity }, 2970)).toMatch(/judges velocity or displacement/);
    expect(
      whyNot(zonesFor('iso-10816-1', { class: 'II' }), { ...velocity, quantity: 'displacement' }, 2970),
    ).toBe('ISO 10816-1 judges velocity, this is displacement');
  });
});
