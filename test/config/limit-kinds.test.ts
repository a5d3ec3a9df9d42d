/** Kinds of limits in the site file: what each takes, what is refused with its remedy, what the values become. */
import { describe, expect, it } from 'vitest';
import { complaints, exampleWith, listedCases, readList, siteOf } from './site-parts.ts';

describe('a kind of limit', () => {
  const cases = listedCases(readList('limit-kinds.txt'));

  it.each(
    cases.map(
      (one) => [one.remark, one.changes[0][1].trim().split('\n').slice(0, 3).join(', '), one] as const,
    ),
  )('%s (%s)', (_remark, _text, { changes, expected }) => {
    expect(complaints(exampleWith(...changes))).toEqual(expected);
  });
});

const typed = '        alert: 2.8 mm/s\n        danger: 4.5 mm/s\n        on_delay: 2 recordings';
const limitOf = (lines: readonly string[], machine = 0) => {
  const text = exampleWith([typed, lines.map((line) => `        ${line}`).join('\n')]);
  return siteOf(text).machines[machine]?.points[0]?.limits[0];
};

describe('operating conditions in their order', () => {
  const warned = (...conditions: string[]) => {
    const lines = conditions.map((one, n) => `      - id: c${n + 1}\n        ${one}`).join('\n');
    const text = exampleWith(['    like: [blower-1]', `    conditions:\n${lines}\n    like: [blower-1]`]);
    return complaints(text).filter((line) => line.includes('condition'));
  };

  it('that can never hold are warned of: an earlier one fits all that they fit', () => {
    expect(warned('load: 60 %..100 %', 'load: 70 %..90 %')).toEqual([
      expect.stringContaining("condition 'c2' never holds: 'c1' stands before it and fits all that it fits"),
    ]);
    expect(warned('load: 60 %..100 %', 'load: 60 %..90 %\n        speed: 500 rpm..900 rpm')).toHaveLength(1);
    expect(warned('load: 70 %..90 %', 'load: 60 %..100 %')).toEqual([]);
    expect(warned('load: 60 %..100 %\n        speed: 500 rpm..900 rpm', 'load: 70 %..90 %')).toEqual([]);
  });
});

describe('a slip of the pen is told with what was meant, once', () => {
  const told = (...lines: string[]) =>
    complaints(exampleWith([typed, lines.map((line) => `        ${line}`).join('\n')]));

  it('a multiple without its x', () => {
    expect(told('kind: baseline', 'alert: 2.5')).toEqual([
      "site.yaml:48:16: alert: '2.5' has no unit; write: alert: 2.5x",
    ]);
    expect(told('kind: fixed', 'alert: 2.5')).toEqual([
      "site.yaml:48:16: alert: '2.5' has no unit; write: alert: 2.5 mm/s",
    ]);
  });

  it('a kind that is not known, whatever it would have taken', () => {
    expect(told('kind: statistic')).toEqual([expect.stringMatching(/; write: kind: statistical$/)]);
  });

  it('a range without units', () => {
    const criticality = '    criticality: A                  # A | B | C';
    const conditions = '\n    conditions:\n      - id: full\n        speed: 2800..3000';
    expect(complaints(exampleWith([criticality, `    criticality: A${conditions}`]))).toEqual([
      "site.yaml:66:16: speed: '2800' has no unit; write: speed: 2800 rpm..3000 rpm",
    ]);
  });
});

describe('the values of a limit', () => {
  it('are multiples of the baseline, decibels as 20 lg', () => {
    const limit = limitOf(['kind: baseline', 'alert: +6 dB', 'danger: 4x'], 1);
    expect(limit).toMatchObject({ id: 'overall-baseline-upper', alert: null, danger: null });
    expect(limit?.rule).toEqual({ by: 'baseline', alert: expect.closeTo(1.99526, 5), danger: 4 });
  });

  it('are 4.5 spreads and three recordings in a row unless the site says otherwise', () => {
    expect(limitOf(['kind: statistical', 'danger: 4.5 mm/s'])).toMatchObject({
      alert: null,
      danger: 0.0045,
      rule: { by: 'spread', alert: 4.5, danger: null },
      onDelay: { recordings: 3 },
    });
  });

  it('may not pass what the standard of the machine advises, else the fixed limit of the band', () => {
    const learned = limitOf(['kind: statistical']);
    expect(learned?.ceilings).toMatchObject({
      alert: { value: 0.0035, why: 'the most that ISO 20816-3 (group 2, rigid) advises (1.25 x B/C)' },
      danger: { value: 0.005625 },
    });
    const both = ['kind: statistical', '', 'danger: 4.5 mm/s'].filter((line) => line !== '');
    const text = exampleWith([
      typed,
      `${both.map((line) => `        ${line}`).join('\n')}\n      - band: overall\n${typed}`,
    ]);
    const [, second] = siteOf(text).machines;
    expect(second?.points[0]?.limits[0]?.ceilings).toEqual({
      alert: { value: 0.0028, why: "the site's fixed limit" },
      danger: { value: 0.0045, why: "the site's fixed limit" },
    });
    expect(limitOf(['kind: statistical'], 1)?.ceilings).toBeUndefined();
  });

  it('may pass a fixed limit that holds in other operating conditions only', () => {
    const ceilingsWith = (learnedIn: string, fixedIn: string) => {
      const within = (ids: string) => (ids === '' ? '' : `\n        conditions: [${ids}]`);
      const text = exampleWith(
        [
          '    like: [blower-1]',
          '    conditions:\n      - id: full\n        load: 60 %..100 %\n      - id: part\n        load: 0 %..50 %',
        ],
        [typed, `        kind: statistical`],
      );
      const own = `    limits:\n      - id: learned\n        band: overall\n        kind: statistical${within(learnedIn)}\n      - band: overall\n        alert: 1 mm/s${within(fixedIn)}\n    conditions:`;
      const [, second] = siteOf(text.replace('    conditions:', own)).machines;
      return second?.points[0]?.limits.find(({ id }) => id === 'learned')?.ceilings?.alert?.value;
    };
    expect(ceilingsWith('', 'part')).toBeUndefined();
    expect(ceilingsWith('full', 'part')).toBeUndefined();
    expect(ceilingsWith('full, part', 'part')).toBeUndefined();
    expect(ceilingsWith('part', 'full, part')).toBe(0.001);
    expect(ceilingsWith('part', '')).toBe(0.001);
  });

  it('of a change are 25 % of B/C where the machine has zones', () => {
    const zones = exampleWith([
      '    like: [blower-1]',
      '    zones:\n      standard: iso-20816-3\n      power: 110 kW\n      support: rigid\n    like: [blower-1]',
    ]).replace(typed, '        kind: change');
    expect(siteOf(zones).machines[1]?.points[0]?.limits[0]?.rule).toEqual({ by: 'change', alert: 0.0007 });
  });

  it('of a curve are kept in Hz or percent, in order', () => {
    const curve = [
      'kind: curve',
      'curve:',
      '  - speed: 1500 rpm',
      '    alert: 1.8 mm/s',
      '  - speed: 50 Hz',
      '    danger: 4.5 mm/s',
    ];
    expect(limitOf(curve)?.rule).toEqual({
      by: 'curve',
      over: 'speed',
      values: [
        { at: 25, alert: 0.0018, danger: null },
        { at: 50, alert: null, danger: 0.0045 },
      ],
    });
  });
});

describe('operating conditions', () => {
  it('are read in order, in Hz and percent, and limits name them', () => {
    const text = exampleWith([
      '    criticality: A                  # A | B | C',
      '    criticality: A\n    conditions:\n      - id: full\n        speed: 2800 rpm..3000 rpm\n      - id: part\n        load: 0 %..60 %',
    ]);
    expect(siteOf(text).machines[0]?.conditions).toEqual([
      { id: 'full', speedHz: { from: expect.closeTo(46.667, 3), to: 50 }, loadPercent: null },
      { id: 'part', speedHz: null, loadPercent: { from: 0, to: 60 } },
    ]);
  });
});
