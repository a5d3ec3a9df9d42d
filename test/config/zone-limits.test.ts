/**
 * Limits from zones. The check values are those worked out from ISO 10816-1 and -3, 5.4.1 and 5.4.2: ALARM = baseline
 * + 25 % of B/C, at most 1.25 x B/C; TRIP within C or D, at most 1.25 x C/D.
 */
import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { type ZoneChoice, zonesOfMachine } from '../../src/config/machine-zones.ts';
import { usualDisplayUnit } from '../../src/config/units.ts';
import { alertByZone, dangerByZone } from '../../src/config/zone-limits.ts';
import { readZoneTable } from '../../src/config/zone-tables.ts';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const table = readZoneTable(
  readFileSync(new URL('../../config/zones/iso-10816-3.json', import.meta.url), 'utf8'),
);
const velocity = (support: 'rigid' | 'flexible', kw: number) => {
  const choice: ZoneChoice = { powerW: kw * 1000, shaftHeightM: null, support, category: null, class: null };
  const [row] = zonesOfMachine(table, choice).boundaries;
  if (row === undefined) throw new Error('no row');
  return row;
};
const mmPerS = usualDisplayUnit('velocity');
const inMm = (value: number) => Number((value * 1000).toPrecision(12));

describe('alert and danger by zones', () => {
  it.each([
    ['group 1 rigid', 'rigid', 1000, 2, 3.125],
    ['group 1 rigid, capped', 'rigid', 1000, 4.8, 5.625],
    ['group 1 flexible', 'flexible', 1000, 2, 3.775],
    ['group 2 rigid', 'rigid', 110, 1, 1.7],
    ['group 2 flexible', 'flexible', 110, 2, 3.125],
  ] as const)('%s: baseline %3$s kW', (_what, support, kw, baseline, alert) => {
    const value = alertByZone('X', velocity(support, kw), baseline / 1000, mmPerS).value;
    expect(inMm(value)).toBe(alert);
  });

  it.each([
    ['rigid', 1000, 5.625, 8.875],
    ['flexible', 1000, 8.875, 13.75],
    ['rigid', 110, 3.5, 5.625],
    ['flexible', 110, 5.625, 8.875],
  ] as const)('ceilings, %s, %d kW', (support, kw, alarm, trip) => {
    const row = velocity(support, kw);
    expect([inMm(row.alarmAtMost), inMm(row.tripAtMost)]).toEqual([alarm, trip]);
    for (const baseline of [0.1, 1, 3, 9, 50])
      expect(alertByZone('X', row, baseline / 1000, mmPerS).value).toBeLessThanOrEqual(row.alarmAtMost);
  });

  it('without a baseline stand where zones C and D begin, and say so', () => {
    const row = velocity('rigid', 110);
    const name = 'ISO 10816-3 (group 2, rigid)';
    expect(alertByZone(name, row, null, mmPerS)).toEqual({
      value: 0.0028,
      why: 'B/C of ISO 10816-3 (group 2, rigid), as there is no baseline',
    });
    expect(dangerByZone(name, row)).toEqual({ value: 0.0045, why: 'C/D of ISO 10816-3 (group 2, rigid)' });
  });

  it('say of a baseline in zone C or D that it lies there', () => {
    const row = velocity('rigid', 110);
    expect(alertByZone('X', row, 0.0028, mmPerS).why).not.toMatch(/lies in zone/);
    expect(alertByZone('X', row, 0.0029, mmPerS).why).toMatch(/baseline lies in zone C$/);
    expect(alertByZone('X', row, 0.005, mmPerS).why).toMatch(/baseline lies in zone D$/);
  });
});

/** As the example has them. */
const zones = `      standard: iso-20816-3         # or iso-10816-7 with category and power, iso-10816-1 with class
      power: 110 kW
      support: rigid`;
const zonesKey = '    zones:                          # then, in place of a list: limits: from zones';
const typed = `    limits:
      - band: overall
        alert: 2.8 mm/s
        danger: 4.5 mm/s
        on_delay: 2 recordings`;
const fromZones = [
  '    points:\n      - id: de-h',
  '    limits: from zones\n    points:\n      - id: de-h',
] as const;

/** The example, its first machine with limits from zones. */
const withZones = (...changes: readonly (readonly [string, string])[]) => exampleWith(fromZones, ...changes);
const limitsOf = (text: string) =>
  siteOf(text).machines[0]?.points[0]?.limits.map(({ id, kind, alert, danger }) => [id, kind, alert, danger]);

describe('limits: from zones', () => {
  it('gives each band of the table alert and danger, with the action of the limit whose place they take', () => {
    const [first, second] = siteOf(withZones()).machines;
    for (const point of first?.points ?? []) {
      expect(point.limits).toMatchObject([
        {
          id: 'overall-zone-upper',
          bandId: 'overall',
          kind: 'zone',
          alert: 0.0028,
          danger: 0.0045,
          onDelay: { recordings: 2 },
          respondWithinMs: 2 * 86_400_000,
          action: 'Check base bolts and coupling, look for build-up on the impeller',
          reasons: {
            alert: 'B/C of ISO 20816-3 (group 2, rigid), as there is no baseline',
            danger: 'C/D of ISO 20816-3 (group 2, rigid)',
          },
        },
      ]);
    }
    expect(second?.points[0]?.limits).toMatchObject([{ kind: 'fixed', reasons: null }]);
  });

  it('follows the group of each machine, and the range of a slow one', () => {
    expect(limitsOf(withZones(['power: 110 kW', 'power: 400 kW']))).toEqual([
      ['overall-zone-upper', 'zone', 0.0045, 0.0071],
    ]);
    const slow = withZones(
      ['running_speed: 2970 rpm', 'running_speed: 300 rpm'],
      ['from: 10 Hz', 'from: 2 Hz'],
      ['line_spacing: 1.6 Hz', 'line_spacing: 0.4 Hz'],
    );
    expect(limitsOf(slow)).toEqual([['overall-zone-upper', 'zone', 0.0028, 0.0045]]);
  });

  it('judges pumps by their own part', () => {
    const pump = withZones([zones, '      standard: iso-10816-7\n      category: II\n      power: 110 kW']);
    expect(limitsOf(pump)).toEqual([['overall-zone-upper', 'zone', 0.0051, 0.0085]]);
  });

  it('lets the site choose its own alert or baseline under the ceilings', () => {
    const own = (more: string) =>
      exampleWith(
        [typed, `    limits:\n      - band: overall\n        kind: zone\n${more}`],
        [
          '    points:\n      - id: de-h\n        name: drive end, horizontal\n        direction: horizontal\n        mounting: glue',
          '    zones:\n      standard: iso-20816-3\n      power: 110 kW\n      support: rigid\n    points:\n      - id: de-h\n        mounting: glue',
        ],
      );
    expect(limitsOf(own('        baseline: 1 mm/s'))).toEqual([
      ['overall-zone-upper', 'zone', 0.0017, 0.0045],
    ]);
    expect(limitsOf(own('        alert: 3.5 mm/s\n        danger: 5.625 mm/s'))).toEqual([
      ['overall-zone-upper', 'zone', 0.0035, 0.005625],
    ]);
    expect(complaints(own('        alert: 3.6 mm/s'))).toEqual([
      expect.stringMatching(
        /^site.yaml:\d+:16: alert 3.6 mm\/s is above the ceiling 3.5 mm\/s \(1.25 x B\/C\); write: alert: 3.5 mm\/s at most, or kind: fixed$/,
      ),
    ]);
    expect(complaints(own('        danger: 6 mm/s'))[0]).toMatch(
      /danger 6 mm\/s is above the ceiling 5.625 mm\/s/,
    );
    expect(complaints(own('        danger: 2 mm/s'))[0]).toMatch(
      /alert 2.8 mm\/s is not below danger 2 mm\/s/,
    );
    expect(complaints(own('        alert: 2 mm/s\n        baseline: 1 mm/s'))[0]).toMatch(
      /leave one of the two out/,
    );
    expect(complaints(own('        side: lower'))[0]).toMatch(
      /a limit of kind zone is an upper one; write: side: upper/,
    );
    expect(complaints(own('        baseline: 1 m/s2'))[0]).toMatch(/baseline: '1 m\/s2' is an acceleration/);
  });
});

describe('limits from zones are refused, and why', () => {
  const first = (text: string) => complaints(text)[0];

  it('where the machine has no zones, no speed, or lies outside its table', () => {
    expect(first(withZones([`${zonesKey}\n${zones}\n`, '']))).toMatch(
      /there are no limits from zones for machine 'blower-1': machine 'blower-1' has no zones; add zones:/,
    );
    expect(complaints(withZones(['power: 110 kW', 'power: 11 kW']))).toEqual([
      expect.stringMatching(
        /machine 'blower-1': ISO 20816-3 holds above 15 kW to 50 MW, this machine has 11 kW; give alert and danger by limits of kind fixed$/,
      ),
    ]);
    expect(first(withZones(['    running_speed: 2970 rpm\n', '']))).toMatch(
      /depends on the running speed, and machine 'blower-1' does not say it; add to the machine: running_speed: 2970 rpm$/,
    );
  });

  it('where no band is over the range, and for sensors that do not sit on a bearing housing', () => {
    expect(first(withZones(['from: 10 Hz', 'from: 20 Hz']))).toMatch(
      /blower-1\/de-h has no limit from zones: none of its bands is one: ISO 20816-3 \(group 2, rigid\) judges a band of velocity or displacement from 10 Hz to 1000 Hz; add such a band/,
    );
    const elsewhere = withZones([
      '        mounting: stud',
      '        mounting: stud\n        sensor_on: elsewhere',
    ]);
    expect(complaints(elsewhere)).toEqual([
      expect.stringMatching(
        /^warning .*blower-1\/de-h has no limit from zones: the sensor sits elsewhere than on a bearing/,
      ),
    ]);
    expect(limitsOf(elsewhere)).toEqual([['overall-fixed-upper', 'fixed', 0.0028, 0.0045]]);
    const probe = withZones([
      '        quantity: acceleration\n        sensitivity: 100 mV/g\n      - id: nde-h',
      '        quantity: displacement\n        sensitivity: 8 V/mm\n      - id: nde-h',
    ]);
    expect(
      complaints(probe).some((text) => /looks at the shaft.*say sensor_on: bearing-housing/.test(text)),
    ).toBe(true);
  });

  it('when misspelt, or given a list', () => {
    expect(first(exampleWith([fromZones[0], fromZones[1].replace('from zones', 'from zone')]))).toMatch(
      /'from zone' is none of from zones; write: limits: from zones$/,
    );
    expect(first(exampleWith([fromZones[0], fromZones[1].replace('from zones', 'none')]))).toMatch(
      /limits is a list/,
    );
  });
});

describe('zones in the site file', () => {
  it('need what their standard asks for, and nothing else', () => {
    const withStandard = (...lines: string[]) =>
      complaints(exampleWith([zones, lines.map((l) => `      ${l}`).join('\n')]));
    expect(withStandard('standard: iso-20816-3')).toEqual([
      expect.stringMatching(/iso-20816-3 needs power or shaft_height; add: power: 110 kW$/),
      expect.stringMatching(/iso-20816-3 needs support; add: support: rigid$/),
    ]);
    expect(withStandard('standard: iso-10816-7', 'power: 5 kW', 'category: I', 'support: rigid')).toEqual([
      expect.stringMatching(/support has no meaning in iso-10816-7; it takes category, and power$/),
    ]);
    expect(withStandard('standard: iso-10816-1', 'class: V')[0]).toMatch(/'V' is none of I, II, III, IV/);
    expect(withStandard('standard: iso-20816-3', 'shaft_height: 280 mm', 'support: flexible')).toEqual([]);
    expect(
      withStandard('standard: iso-20816-3', 'power: 400 kW', 'shaft_height: 280 mm', 'support: rigid'),
    ).toEqual([
      expect.stringMatching(
        /^warning .*by its power the machine is in group 1, rigid, by its shaft height in group 2, rigid/,
      ),
    ]);
  });

  it('warn where a pump is held against a table that is not made for pumps', () => {
    expect(complaints(exampleWith(['- id: blower-1', '- id: raw-pump-1']))).toEqual(
      expect.arrayContaining([
        expect.stringMatching(
          /^warning .*'raw-pump-1' is called a pump, and rotodynamic pumps belong to ISO 10816-7, not to ISO 20816-3/,
        ),
      ]),
    );
  });

  it('warn of a machine outside its table, and of fixed limits above the ceilings', () => {
    expect(complaints(exampleWith(['power: 110 kW', 'power: 75 MW']))).toEqual([
      expect.stringMatching(
        /^warning .*machine 'blower-1' is in no zone: ISO 20816-3 holds above 15 kW to 50 MW/,
      ),
    ]);
    expect(
      complaints(exampleWith(['alert: 2.8 mm/s', 'alert: 3.6 mm/s'], ['danger: 4.5 mm/s', 'danger: 6 mm/s'])),
    ).toEqual([
      expect.stringMatching(
        /^warning .*alert 3.6 mm\/s of blower-1\/de-h stands above 3.5 mm\/s, the most that ISO 20816-3 \(group 2, rigid\) advises \(1.25 x B\/C\)$/,
      ),
      expect.stringMatching(/^warning .*danger 6 mm\/s of blower-1\/de-h stands above 5.625 mm\/s/),
    ]);
    expect(complaints(exampleWith(['alert: 2.8 mm/s', 'alert: 3.5 mm/s']))).toEqual([]);
  });

  it('are no baseline for a fixed limit', () => {
    expect(
      complaints(
        exampleWith(['        alert: 2.8 mm/s', '        alert: 2.8 mm/s\n        baseline: 1 mm/s']),
      ),
    ).toEqual([
      expect.stringMatching(
        /baseline has no meaning in a limit of kind fixed; leave it out, or write kind: zone$/,
      ),
    ]);
  });
});
