import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parseLevel, parseSampleUnit } from '../../src/config/level.ts';
import {
  inDisplayUnit,
  printDuration,
  printFrequency,
  printLevel,
  printNumber,
  printSeconds,
} from '../../src/config/print-value.ts';
import { type Parsed, parseDuration, parseFrequency, parsePercent } from '../../src/config/quantity.ts';
import { parseSensitivity } from '../../src/config/sensitivity.ts';
import { plainSpelling, units } from '../../src/config/units.ts';
import { readList } from './site-parts.ts';

function map<T>(parsed: Parsed<T>, value: (of: T) => number): Parsed<number> {
  return parsed.ok ? { ok: true, value: value(parsed.value) } : parsed;
}

const kinds: Readonly<Record<string, (text: string) => Parsed<number>>> = {
  level: (text) => map(parseLevel(text), ({ value }) => value),
  time: (text) => parseDuration(text),
  frequency: (text) => parseFrequency(text),
  percent: (text) => parsePercent(text),
  sensitivity: (text) => map(parseSensitivity(text), ({ voltsPerSi }) => voltsPerSi),
};

function rows(name: string): (readonly [string, string, string])[] {
  return readList(name)
    .split('\n')
    .filter((line) => line !== '' && !line.startsWith('#'))
    .map((line) => line.split(' | ') as unknown as readonly [string, string, string]);
}

it('a bare number of a hundred or more is hertz, whatever the example is in', () => {
  expect(parseFrequency('2000', 'kHz')).toMatchObject({ ok: false, instead: '2000 Hz' });
  expect(parseFrequency('25.6', 'kHz')).toMatchObject({ ok: false, instead: '25.6 kHz' });
});

function levelOf(text: string): number {
  const parsed = parseLevel(text);
  if (!parsed.ok) throw new Error(parsed.what);
  return parsed.value.value;
}

describe('a value with its unit', () => {
  it.each(rows('quantities.txt'))('%s: %s is read', (kind, text, si) => {
    const parsed = kinds[kind](text);
    expect(parsed).toMatchObject({ ok: true });
    if (parsed.ok) expect(parsed.value / Number(si)).toBeCloseTo(1, 8);
  });

  it.each(rows('not-quantities.txt'))(
    '%s: %s is refused, with what would be right',
    (kind, text, instead) => {
      const parsed = kinds[kind](text);
      expect(parsed).toMatchObject({ ok: false, instead: instead === '-' ? null : instead });
      // What is offered must itself be understood.
      if (instead !== '-') expect(kinds[kind](instead).ok).toBe(true);
    },
  );

  it('says why in/s must say how it was measured', () => {
    expect(parseLevel('0.3 in/s')).toMatchObject({ what: expect.stringContaining('alarms 41 % too late') });
    // sqrt 2 = 1.41: a peak limit read as r.m.s. stands 41 % too high.
    expect(0.3 * 0.0254).toBeCloseTo(levelOf('0.3 in/s peak') * Math.SQRT2, 12);
  });

  it('knows the published facts of its units', () => {
    expect(levelOf('1 g')).toBe(9.80665); // 3rd CGPM 1901; ISO 80000-3
    expect(levelOf('1 mil rms')).toBeCloseTo(25.4e-6, 15); // international inch of 1959: 25.4 mm
    expect(levelOf('1 in/s rms')).toBeCloseTo(25.4e-3, 15);
    expect(levelOf('1 mm/s peak') / levelOf('1 mm/s rms')).toBeCloseTo(Math.SQRT1_2, 12); // sinusoid
    expect(levelOf('1 um pp') / levelOf('1 um rms')).toBeCloseTo(0.35355339, 8); // sinusoid
    expect(levelOf('1 in/s peak')).toBeCloseTo(17.960512e-3, 9);
    expect(levelOf('0.3 in/s peak')).toBeCloseTo(5.388154e-3, 9);
    const inchPeak = parseLevel('1 in/s peak');
    if (inchPeak.ok) expect(inDisplayUnit(7.1e-3, inchPeak.value.display)).toBeCloseTo(0.395312, 6);
    expect(parseFrequency('60 rpm')).toMatchObject({ value: 1 });
    // 1 g r.m.s. at 159.154943 Hz (1000 rad/s) is 9.80665 mm/s and 9.80665 um r.m.s.
    expect(levelOf('1 g') / 1000).toBeCloseTo(levelOf('9.80665 mm/s'), 12);
    expect(levelOf('1 g') / 1000 ** 2).toBeCloseTo(levelOf('9.80665 um rms'), 15);
  });

  it('knows no spelling twice', () => {
    const spellings = units.flatMap(({ text, also }) => [text, ...(also ?? [])].map(plainSpelling));
    expect(new Set(spellings).size).toBe(spellings.length);
  });

  it('takes samples as momentary values, without a detector', () => {
    expect(parseSampleUnit('um')).toMatchObject({ value: { quantity: 'displacement', inSi: 1e-6 } });
    expect(parseSampleUnit('g')).toMatchObject({ value: { quantity: 'acceleration', inSi: 9.80665 } });
    expect(parseSampleUnit('mm/s rms')).toMatchObject({ ok: false, instead: 'mm/s' });
  });

  it('survives printing and reading again', () => {
    const shown = units.filter(({ dimension }) =>
      ['acceleration', 'velocity', 'displacement', 'sound-pressure', 'voltage', 'current'].includes(
        dimension,
      ),
    );
    const anyLevel = fc.record({
      unit: fc.constantFrom(...shown),
      word: fc.constantFrom('rms', 'peak', 'pp'),
      number: fc.double({ min: 1e-3, max: 1e4, noNaN: true }),
    });
    fc.assert(
      fc.property(anyLevel, ({ unit, word, number }) => {
        const first = parseLevel(`${number} ${unit.text} ${word}`);
        if (!first.ok) throw new Error(first.what);
        const again = parseLevel(printLevel(first.value.value, first.value.display, 15));
        if (!again.ok) throw new Error(again.what);
        expect(again.value.display).toEqual(first.value.display);
        expect(again.value.value / first.value.value).toBeCloseTo(1, 12);
      }),
      { seed: 20261201, numRuns: 500 },
    );
    fc.assert(
      fc.property(fc.integer({ min: 0, max: 10 ** 11 }), (ms) => {
        expect(parseDuration(printDuration(ms))).toEqual({ ok: true, value: ms });
      }),
      { seed: 20261201, numRuns: 500 },
    );
  });

  it('never fails on any text', () => {
    const text = fc.oneof(fc.string(), fc.stringMatching(/^[0-9.,+-]{0,6} ?[a-zµ/²^()%]{0,8}$/));
    fc.assert(
      fc.property(text, (any) => {
        for (const parse of Object.values(kinds)) expect(typeof parse(any).ok).toBe('boolean');
      }),
      { seed: 20261201, numRuns: 2000 },
    );
  });
});

describe('numbers for people', () => {
  it('have three significant figures and no exponent where one can read it', () => {
    const printed = [0.0028349, 12_345.6, 2.8, 0, -0.5678, 999.96, 1e-9, 100].map((value) =>
      printNumber(value),
    );
    expect(printed).toEqual(['0.00283', '12300', '2.8', '0', '-0.568', '1000', '1e-9', '100']);
  });

  it('carry their unit', () => {
    const peak = parseLevel('0.3 in/s peak');
    if (peak.ok) expect(printLevel(peak.value.value, peak.value.display)).toBe('0.3 in/s peak (derived)');
    expect([950, 1999, 2000, 25_600].map((hz) => printFrequency(hz))).toEqual([
      '950 Hz',
      '1999 Hz',
      '2 kHz',
      '25.6 kHz',
    ]);
    expect([0, 250, 5000, 90_000, 7_200_000, 172_800_000].map(printDuration)).toEqual([
      '0 ms',
      '250 ms',
      '5 s',
      '90 s',
      '2 h',
      '2 d',
    ]);
  });

  it('say minutes and hours where there are as many', () => {
    expect([0.64, 10.24, 60, 119, 120, 140, 600, 5400, 5425, 90_000].map(printSeconds)).toEqual([
      '0.64 s',
      '10.2 s',
      '60 s',
      '119 s',
      '2 min',
      '2 min 20 s',
      '10 min',
      '1 h 30 min',
      '1 h 30 min',
      '25 h',
    ]);
  });
});
