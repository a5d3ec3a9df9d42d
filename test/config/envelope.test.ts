import { describe, expect, test } from 'vitest';
import {
  canDemodulate,
  envelopeSpacingHz,
  fixedDemodulation,
  usualDemodulation,
} from '../../src/config/envelope-settings.ts';
import { demodulationOf } from '../../src/signal/demodulation.ts';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const bandLines = `      - id: bearing-shocks
        of: envelope
        from: 0.5x
        to: 8x
`;
const highBand = '      - id: bearing\n        from: 2 kHz\n        to: 8 kHz\n';
const withBand: [string, string] = [highBand, `${highBand}${bandLines}`];
const analysis = (...lines: string[]): [string, string] => [
  '  line_spacing: 1.6 Hz\n',
  ['  line_spacing: 1.6 Hz', '  envelope:', ...lines.map((line) => `    ${line}`), ''].join('\n'),
];
const plainEnvelope = (...changes: [string, string][]) =>
  siteOf(exampleWith(...changes)).machines[0].points[0].envelope;
const envelopeOf = (...changes: [string, string][]) => plainEnvelope(withBand, ...changes);
const complaintsOf = (...changes: [string, string][]) =>
  complaints(exampleWith(withBand, ...changes)).filter((text) => /envelope|kurtosis/.test(text));

describe('an envelope is made where the site file asks for it', () => {
  test('by a band of it', () => {
    expect(envelopeOf()).toEqual({
      band: null,
      choose: 'fixed',
      lineSpacingHz: 1.6,
      highestHz: 8 * 49.5,
    });
    expect(plainEnvelope()).toBeUndefined();
  });

  test('by its own settings', () => {
    expect(plainEnvelope(analysis('from: 3 kHz', 'to: 6 kHz', 'choose: by kurtosis'))).toMatchObject({
      band: { fromHz: 3000, toHz: 6000 },
      choose: 'kurtosis',
      highestHz: 0,
    });
    expect(plainEnvelope(analysis('choose: by kurtosis'))).toMatchObject({
      band: null,
      choose: 'kurtosis',
    });
  });

  test('by a rolling bearing that the point hears, at 1/25 of the slowest shaft', () => {
    const bearing: [string, string] = [
      '    points:\n      - id: de-h',
      `    parts:
      - id: gear-end
        kind: rolling-bearing
        at: [nde-h]
        shaft: 0.5x
        rolling_elements: 8
        element_diameter: 12 mm
        pitch_diameter: 60 mm
    points:
      - id: de-h`,
    ];
    const [deH, ndeH] = siteOf(exampleWith(bearing)).machines[0].points;
    expect(deH.envelope).toBeUndefined();
    expect(ndeH.envelope?.lineSpacingHz).toBeCloseTo((0.5 * 49.5) / 25, 12);
    expect(ndeH.envelope?.faultsToHz).toBeCloseTo(20 * 0.5 * 49.5, 9);
  });

  test('not of a quantity that does not ring', () => {
    const changes: [string, string][] = [
      [
        'quantity: acceleration\n        sensitivity: 100 mV/g',
        'quantity: displacement\n        sensitivity: 8 V/mm',
      ],
      ['quantity: velocity', 'quantity: displacement'],
      ['unit: mm/s', 'unit: um rms'],
      ['alert: 2.8 mm/s', 'alert: 28 um rms'],
      ['danger: 4.5 mm/s', 'danger: 45 um rms'],
    ];
    expect(complaintsOf(...changes)).toEqual([
      expect.stringContaining(
        "band 'bearing-shocks' is left out at blower-1/de-h: displacement has no envelope, only acceleration, velocity and sound pressure",
      ),
    ]);
    expect(envelopeOf(...changes)).toBeUndefined();
  });
});

describe('check refuses', () => {
  test.each([
    [['from: 3 kHz'], 'envelope has one edge of its band only; add: to: 8 kHz'],
    [['from: 6 kHz', 'to: 3 kHz'], 'the envelope band does not end above its begin; compare from and to'],
    [
      ['from: 3 kHz', 'to: 11 kHz'],
      'a sensor fixed by stud is usable to about 10 kHz (common practice); write: to: 10 kHz',
    ],
    [
      ['from: 9 kHz', 'to: 9010 Hz'],
      'cannot be demodulated at 25.6 kHz; take a wider band that begins higher above 0',
    ],
    [
      ['from: 10 Hz', 'to: 8 kHz'],
      'cannot be demodulated at 25.6 kHz; take a wider band that begins higher above 0',
    ],
    [['choose: by hand'], "choose: 'by hand' is none of by kurtosis; write for example: choose: by kurtosis"],
    [['chose: by kurtosis'], "unknown key 'chose' in envelope; write: choose"],
    [
      ['from: 3 kHz', 'to: 3600 Hz'],
      "envelope band 'bearing-shocks' of blower-1/de-h ends at 396 Hz, above half the width of the demodulated band from 3 kHz to 3.6 kHz; write: to: 6.06x",
    ],
  ])('%s', (lines, text) => {
    expect(complaintsOf(analysis(...(lines as string[])))[0]).toContain(text);
  });

  test('a band above sample rate / 2.56, with the highest edge that would do', () => {
    const slow: [string, string] = ['sample_rate: 25.6 kHz', 'sample_rate: 12.8 kHz'];
    const narrow: [string, string] = ['to: 8 kHz', 'to: 5 kHz'];
    expect(complaintsOf(slow, narrow, analysis('from: 2 kHz', 'to: 6 kHz'))[0]).toMatch(
      /:\d+:9: the envelope band of blower-1\/de-h ends at 6 kHz, above the sample rate \/ 2.56 = 5 kHz; write: to: 5 kHz$/,
    );
    expect(complaintsOf(slow, narrow)).toEqual([]);
  });

  test('a band of the envelope that is too narrow, begins too low, or is of another quantity', () => {
    const edges = (from: string, to: string): [string, string] => [
      '        from: 0.5x\n        to: 8x',
      `        from: ${from}\n        to: ${to}`,
    ];
    expect(complaintsOf(edges('100 Hz', '104 Hz'))[0]).toContain('2.56 lines of 1.563 Hz wide, hann needs 3');
    expect(complaintsOf(edges('3 Hz', '100 Hz'))[0]).toContain(
      'begins 1.92 lines of 1.563 Hz above 0, hann needs 3; write: from: 4.688 Hz',
    );
    expect(complaintsOf(edges('0.01x', '2x'))[0]).toContain('write: from: 0.0947x');
    const velocity: [string, string] = [
      '        of: envelope',
      '        of: envelope\n        quantity: velocity',
    ];
    expect(complaintsOf(velocity)[0]).toContain('the envelope of acceleration is acceleration, not velocity');
  });

  test('recordings too short for a segment of 25 turns; pooled bursts take as long a one as they hold, and are warned of', () => {
    const slow: [string, string] = ['running_speed: 2970 rpm', 'running_speed: 100 rpm'];
    const fitting: [string, string] = ['from: 0.5x', 'from: 3x'];
    expect(complaintsOf(slow, fitting)[0]).toContain(
      'the envelope of blower-1/de-h needs recordings of 20.5 s for a line every 0.06667 Hz, a segment of 25 turns of its slowest shaft; they are 10 s long; record for longer, or leave the envelope out',
    );
    const burst: [string, string] = ['duration: 10 s', 'duration: 0.3 s'];
    const widths: [string, string][] = [
      ['  line_spacing: 1.6 Hz\n', '  line_spacing: 12.5 Hz\n  average_over: 30 recordings\n'],
      ['from: 10 Hz\n        to: 1000 Hz', 'from: 60 Hz\n        to: 1000 Hz'],
      ['from: 0.5x', 'from: 2x'],
    ];
    const warned = complaintsOf(burst, ...widths);
    expect(warned[0]).toMatch(
      /^warning .* lines at most 7.92 Hz apart are used, at which no fault is named$/,
    );
    expect(envelopeOf(burst, ...widths)?.lineSpacingHz).toBeCloseTo(8 * 0.99, 9);
  });
});

test('the usual band is 2 to 8 kHz, and what rate and mounting leave of it', () => {
  expect(usualDemodulation(25_600, null)).toEqual({ fromHz: 2000, toHz: 8000 });
  expect(usualDemodulation(12_800, 'stud')).toEqual({ fromHz: 1250, toHz: 5000 });
  expect(usualDemodulation(51_200, 'magnet')).toEqual({ fromHz: 500, toHz: 2000 });
  for (const rate of [64, 1000, 2560, 20_000, 10e6]) {
    const band = fixedDemodulation({ band: null }, rate, null);
    // At 10 MHz a band of 6 kHz would ring for longer than a block holds.
    if (rate === 10e6) expect(band).toBeNull();
    else demodulationOf({ ...(band as NonNullable<typeof band>), sampleRateHz: rate, highestHz: 0 });
  }
  expect(canDemodulate({ fromHz: 2000, toHz: 12_500 }, 25_600)).toBe(false);
});

test('a line every 1/25 of the shaft speed, never wider than the plain spectrum has', () => {
  expect(envelopeSpacingHz(1.6, 10)).toBe(0.4);
  expect(envelopeSpacingHz(1.6, 50)).toBe(1.6);
  expect(envelopeSpacingHz(0.8, null)).toBe(0.8);
});
