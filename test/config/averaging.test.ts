/** Pools of bursts, medians, held peaks, octave bands, decibels: what the site file may ask for, and what is refused. */
import { describe, expect, test } from 'vitest';
import { levelEveryMs, poolSizeOf } from '../../src/config/meaning.ts';
import { inDisplayUnit, printLevel } from '../../src/config/print-value.ts';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const spacing = '  line_spacing: 1.6 Hz\n';
const analysis = (...lines: string[]): [string, string] => [
  spacing,
  [...lines.map((line) => `  ${line}`), ''].join('\n'),
];
const highBand = '      - id: bearing\n        from: 2 kHz\n        to: 8 kHz\n';
const inPlaceOfHigh = (...lines: string[]): [string, string] => [
  highBand,
  `${highBand}${lines.map((line) => `      ${line}\n`).join('')}`,
];
const first = (...changes: [string, string][]) => siteOf(exampleWith(...changes)).machines[0].points[0];
/** Without the place. */
const told = (...changes: [string, string][]) =>
  complaints(exampleWith(...changes)).map((line) => line.replace(/^(warning )?site.yaml:\d+:\d+: /, '$1'));

describe('what is made of the segments', () => {
  test('stays what it was where nothing is said, and where the usual is said', () => {
    expect(first(analysis('line_spacing: 1.6 Hz', 'averaging: power', 'detrend: mean')).analysis).toEqual(
      first().analysis,
    );
  });

  test('median, held peaks, straight lines, a pool of recordings or of a time', () => {
    expect(first(analysis('averaging: median', 'detrend: linear')).analysis).toMatchObject({
      averaging: 'median',
      detrend: 'linear',
    });
    expect(first(analysis('averaging: peak-hold')).analysis.averaging).toBe('peak-hold');
    const ten = first(analysis('line_spacing: 1.6 Hz', 'average_over: 10 recordings'));
    expect(ten.analysis.averageOver).toEqual({ recordings: 10 });
    expect(levelEveryMs(ten)).toBe(10 * 3_600_000);
    const day = first(analysis('line_spacing: 1.6 Hz', 'average_over: 24 h'));
    expect(poolSizeOf(day.analysis, day.recordings.expectedEveryMs)).toBe(24);
    expect(levelEveryMs(first())).toBe(3_600_000);
  });

  test('a median of segments that overlap by more than half is refused, with the overlap that would do', () => {
    expect(told(['  overlap: 50 %', '  overlap: 67 %'], analysis('averaging: median'))[0]).toBe(
      'averaging: median is right for segments that overlap by at most 50 %, those of blower-1/de-h overlap by 67 %; write: overlap: 50 %',
    );
  });

  test('a pool needs a rate, more than one recording, segments of bounded length, and no other average', () => {
    const pool = (text: string) => analysis('line_spacing: 1.6 Hz', text);
    expect(told(pool('average_over: 1 recordings'))[0]).toContain('write: average_over: 2 recordings');
    expect(told(pool('average_over: 90 min'))).toEqual([]);
    expect(told(pool('average_over: 1 h'))[0]).toBe(
      'average_over holds fewer than 2 recordings: a recording of blower-1/de-h comes every 1 h; write: average_over: 2 h, or give a number of recordings',
    );
    expect(told(pool('average_over: 365 d'))[0]).toContain('more than 1000 recordings');
    expect(told(['  sample_rate: 25.6 kHz\n', ''], pool('average_over: 5 recordings'))[0]).toContain(
      'average_over needs sample_rate',
    );
    expect(
      told(['  duration: 10 s\n', ''], analysis('line_spacing: 0.1 Hz', 'average_over: 5 recordings'))[0],
    ).toMatch(
      /average_over pools segments of at most 131072 samples, .* pooling adds averages, never resolution/,
    );
    expect(told(analysis('averaging: median', 'average_over: 5 recordings'))[0]).toContain(
      'keep one of the two',
    );
  });

  test('the segment of a burst shrinks to it, and no line spacing can ask for more', () => {
    const burst: [string, string] = ['  duration: 10 s\n', '  duration: 0.1 s\n'];
    const velocity = [/begins 0.8 lines of 12.5 Hz above 0, hann needs 3/, /the running speed/];
    expect(told(burst, analysis('average_over: 30 recordings'))[0]).toMatch(velocity[0]);
    const fine: [string, string] = ['        from: 10 Hz\n', '        from: 40 Hz\n'];
    expect(first(burst, fine, analysis('average_over: 30 recordings')).analysis.lineSpacingHz).toBe(12.5);
    const asked = told(burst, fine, analysis('line_spacing: 1.6 Hz', 'average_over: 30 recordings'));
    expect(asked[0]).toContain('average_over adds averages, never resolution; write: line_spacing: 12.5 Hz');
  });

  test('a band of pooled bursts that begins below three lines is refused, of accelerations too', () => {
    const low = ['- id: low', '  quantity: acceleration', '  from: 30 Hz', '  to: 400 Hz'];
    const burst: [string, string] = ['  duration: 10 s\n', '  duration: 0.1 s\n'];
    const fine: [string, string] = ['        from: 10 Hz\n', '        from: 40 Hz\n'];
    expect(told(burst, fine, inPlaceOfHigh(...low), analysis('average_over: 30 recordings'))[0]).toContain(
      "acceleration band 'low' of blower-1/de-h begins 2.4 lines of 12.5 Hz above 0",
    );
    expect(told(burst, fine, inPlaceOfHigh(...low), analysis()).join()).not.toContain('above 0');
  });
});

describe('octave bands', () => {
  const thirds = ['- octaves: 1/3', '  from: 31.5 Hz', '  to: 1 kHz'];

  test('are bands of their own, named by their nominal mid-bands, with exact edges', () => {
    const { bands } = first(inPlaceOfHigh(...thirds));
    const made = bands.filter(({ id }) => id.startsWith('third-'));
    expect(made.map(({ id }) => id)).toEqual(
      [31.5, 40, 50, 63, 80, 100, 125, 160, 200, 250, 315, 400, 500, 630, 800, 1000].map(
        (hz) => `third-${hz}Hz`,
      ),
    );
    expect(made[0].from).toBeCloseTo(28.18383, 5);
    expect(made[15]).toMatchObject({ quantity: 'acceleration', inOrders: false, formerly: [] });
    expect(made[15].to).toBeCloseTo(1122.01845, 5);
  });

  test('take an id before theirs, and limits by their ids', () => {
    const { bands } = first(
      inPlaceOfHigh('- octaves: 1/1', '  id: v', '  from: 63 Hz', '  to: 500 Hz', '  unit: mm/s'),
    );
    expect(bands.slice(-4).map(({ id }) => id)).toEqual([
      'v-octave-63Hz',
      'v-octave-125Hz',
      'v-octave-250Hz',
      'v-octave-500Hz',
    ]);
    expect(bands.at(-1)?.quantity).toBe('velocity');
    const limited = first(inPlaceOfHigh('- octaves: 1/1', '  from: 63 Hz', '  to: 500 Hz'), [
      '    limits:\n',
      '    limits:\n      - band: octave-500Hz\n        alert: 2 m/s2\n',
    ]);
    expect(limited.limits[0]).toMatchObject({ bandId: 'octave-500Hz', alert: 2 });
  });

  test('are refused where a range holds none, in orders, and where lines are too coarse', () => {
    const asked = (...lines: string[]) => told(inPlaceOfHigh(...lines))[0];
    expect(asked('- octaves: 1/3', '  from: 1001 Hz', '  to: 1200 Hz')).toContain(
      'no nominal mid-band of 1/3 octaves',
    );
    expect(asked('- octaves: 1/3', '  from: 0.5x', '  to: 8x')).toContain('give from and to in Hz');
    expect(asked('- octaves: 1/6', '  from: 100 Hz', '  to: 200 Hz')).toContain('none of 1/3, 1/1');
    expect(asked('- octaves: 1/3', '  from: 10 Hz', '  to: 100 Hz')).toMatch(
      /band 'third-10Hz' .* is 1.48 lines .* or begin the octave bands higher$/,
    );
    expect(asked('- octaves: 1/3', '  from: 5 kHz', '  to: 12.5 kHz')).toMatch(
      /above the sample rate \/ 2.56 = 10 kHz; end the octave bands at 8 kHz$/,
    );
    expect(asked('- octaves: 1/1', '  from: 1 kHz', '  to: 8 kHz')).toMatch(
      /; end the octave bands at 4 kHz$/,
    );
    expect(asked('- octaves: 1/3', '  to: 1 kHz')).toContain('from');
    expect(
      asked(
        '- octaves: 1/3',
        '  from: 100 Hz',
        '  to: 200 Hz',
        '- id: third-100Hz',
        '  from: 50 Hz',
        '  to: 90 Hz',
      ),
    ).toContain("band 'third-100Hz' stands twice");
  });
});

describe('levels in decibels, re the references of ISO 1683', () => {
  const shown = (quantity: string, unit = 'dB') =>
    first(
      inPlaceOfHigh(
        '- id: more',
        `  quantity: ${quantity}`,
        '  from: 20 Hz',
        '  to: 500 Hz',
        `  unit: ${unit}`,
      ),
    ).bands.find(({ id }) => id === 'more')?.display;

  test.each([
    ['acceleration', 1, '120 dB re 1 µm/s²'],
    ['acceleration', 9.80665, '139.8 dB re 1 µm/s²'],
    ['velocity', 0.0045, '133.1 dB re 1 nm/s'],
    ['velocity', 0.001, '120 dB re 1 nm/s'],
    ['displacement', 1e-6, '120 dB re 1 pm'],
  ])('%s of %d is %s', (quantity, si, text) => {
    const display = shown(quantity);
    if (display === undefined) throw new Error('no such band');
    expect(printLevel(si, display)).toBe(text);
    expect(inDisplayUnit(9.80665, { ...display, decibelReference: 1e-6 })).toBeCloseTo(139.8304, 4);
  });

  test('the reference may be written; another one is refused', () => {
    expect(shown('velocity', 'dB re 1e-9 m/s')).toEqual(shown('velocity'));
    expect(shown('acceleration', 'dB re 1 um/s2')).toEqual(shown('acceleration'));
    const unit = (text: string) =>
      told(
        inPlaceOfHigh(
          '- id: more',
          '  quantity: velocity',
          '  from: 20 Hz',
          '  to: 500 Hz',
          `  unit: ${text}`,
        ),
      )[0];
    expect(unit('dB re 50 nm/s')).toContain('none of the references of ISO 1683');
    expect(unit('dB re 1 pm')).toContain("band 'more' is velocity, its unit dB re 1 pm is displacement");
    const volts = told(
      inPlaceOfHigh('- id: more', '  quantity: current', '  from: 20 Hz', '  to: 500 Hz', '  unit: dB'),
    );
    expect(volts[0]).toContain('current, of which there are no decibels');
  });

  test('limits are written in decibels or in the unit, whichever way the band is shown', () => {
    const { limits } = first(
      ['            alert: 2.8 mm/s', '            alert: 128.943 dB'].map((x) => x.trim()) as [
        string,
        string,
      ],
    );
    const overall = limits.find(({ bandId }) => bandId === 'overall');
    expect(overall?.alert).toBeCloseTo(0.0028, 6);
    expect(told(['alert: 2.8 mm/s', 'alert: 129 dB re 50 nm/s'])[0]).toContain('is not re 1 nm/s');
    expect(told(['alert: 2.8 mm/s', 'alert: 140 dB'])[0]).toContain('alert 140 dB is not below danger');
  });
});
