import { describe, expect, it } from 'vitest';
import { averagingMeaning, pointMeaning, secondsFor, segmentSamplesFor } from '../../src/config/meaning.ts';
import type { AnalysisSettings } from '../../src/config/site.ts';
import { windowNames } from '../../src/signal/window.ts';
import { complaints, exampleText, exampleWith, siteOf } from './site-parts.ts';

const hann: AnalysisSettings = {
  window: 'hann',
  overlapPercent: 50,
  lineSpacingHz: 1.6,
  segmentSamples: null,
  skipStartS: 0,
  confidencePercent: 95,
  falsePeaksPerSpectrum: 0.1,
};

describe('what a site file amounts to', () => {
  it('is the smallest power of two whose lines are no wider than asked', () => {
    const cases = [
      [25_600, 1.6, 16_384],
      [25_600, 1.5625, 16_384],
      [25_600, 1.5624, 32_768],
      [12_800, 1.6, 8192],
      [1, 100, 2],
    ] as const;
    for (const [rate, spacing, samples] of cases) expect(segmentSamplesFor(rate, spacing)).toBe(samples);
    for (let spacing = 0.1; spacing < 50; spacing *= 1.37) {
      const samples = segmentSamplesFor(25_600, spacing);
      expect(25_600 / samples).toBeLessThanOrEqual(spacing);
      expect(25_600 / (samples / 2)).toBeGreaterThan(spacing);
    }
  });

  it('counts averages, and what overlapped ones are worth (Welch 1967)', () => {
    // 20 segment lengths, Hann, 50 %: 39 segments worth 36.9973 independent ones, all samples used.
    const meaning = averagingMeaning({ ...hann, lineSpacingHz: 1 }, 1024, 20);
    expect(meaning).toMatchObject({ segmentSamples: 1024, hopSamples: 512, averages: 39, usedPercent: 100 });
    expect(meaning.effectiveAverages).toBeCloseTo(36.9973, 3);
    // A segment of any length is worth the same at the same overlap.
    const long = averagingMeaning({ ...hann, lineSpacingHz: 1 }, 65_536, 20);
    expect(long.effectiveAverages).toBeCloseTo(36.9973, 3);
  });

  it('says so when a recording is too short for one segment', () => {
    expect(averagingMeaning(hann, 25_600, 0.5)).toMatchObject({
      averages: 0,
      effectiveAverages: 0,
      usedPercent: 0,
    });
    expect(averagingMeaning({ ...hann, skipStartS: 9.5 }, 25_600, 10).averages).toBe(0);
  });

  it('is known for each point of the example: 16384 samples, 1.5625 Hz, 30 averages', () => {
    const [point] = siteOf(exampleText).machines[0].points;
    expect(pointMeaning(point)).toMatchObject({
      segmentSamples: 16_384,
      lineSpacingHz: 1.5625,
      averages: 30,
    });
    const unknown = siteOf(exampleWith(['  sample_rate: 25.6 kHz\n', ''])).machines[0].points[0];
    expect(pointMeaning(unknown)).toBeNull();
  });

  it('needs the recording length that it advises', () => {
    const facts = { sampleRateHz: 25_600, segmentSamples: 16_384, overlapPercent: 50, skipStartS: 1 };
    const seconds = secondsFor(5, facts);
    expect(averagingMeaning({ ...hann, skipStartS: 1 }, 25_600, seconds).averages).toBe(5);
    expect(averagingMeaning({ ...hann, skipStartS: 1 }, 25_600, seconds - 1 / 25_600).averages).toBe(4);
  });
});

describe('the bands of a site file', () => {
  const spacingHz = 25_600 / 16_384;
  const withBand = (window: string, from: number, to: number, quantity: string) =>
    complaints(
      exampleWith(
        ['  window: hann', `  window: ${window}`],
        [
          'quantity: velocity\n        from: 10 Hz\n        to: 1000 Hz\n        unit: mm/s',
          `quantity: ${quantity}\n        from: ${from} Hz\n        to: ${to} Hz`,
        ],
        [
          '      - band: overall\n        alert: 2.8 mm/s\n        danger: 4.5 mm/s',
          '      - band: bearing\n        alert: 3 g',
        ],
      ),
    ).filter((line) => !line.startsWith('warning'));

  it.each(windowNames)('begin and end as many lines apart as %s needs', (window) => {
    const least = { rectangular: 3, hann: 3, hamming: 3, blackman: 4, 'blackman-harris': 5, 'flat-top': 6 }[
      window
    ];
    const wide = least * spacingHz;
    expect(withBand(window, 200, 200 + wide, 'acceleration')).toEqual([]);
    expect(withBand(window, 200, 200 + wide * 0.999, 'acceleration')[0]).toContain(
      `${window} needs ${least}`,
    );
    expect(withBand(window, wide, 1000, 'velocity')).toEqual([]);
    expect(withBand(window, wide * 0.999, 1000, 'velocity')[0]).toContain('above 0');
    expect(withBand(window, wide * 0.999, 1000, 'displacement')[0]).toContain('above 0');
    // Acceleration is not weighted towards its lowest lines.
    expect(withBand(window, 0, 1000, 'acceleration')).toEqual([]);
  });

  it('may end at the sample rate / 2.56, not above', () => {
    expect(withBand('hann', 200, 10_000, 'acceleration')).toEqual([]);
    expect(withBand('hann', 200, 10_001, 'acceleration')[0]).toContain(
      'above the sample rate / 2.56 = 10 kHz; write: to: 10 kHz',
    );
  });

  it('can be mended by the spacing and the length that the message gives', () => {
    const broken = exampleWith(['from: 10 Hz', 'from: 2 Hz'], ['duration: 10 s', 'duration: 1 s']);
    const told = /line_spacing: (\S+) Hz, with recordings of at least (\S+) s/.exec(complaints(broken)[0]);
    expect(told).not.toBeNull();
    const [, spacing, seconds] = told ?? [];
    const mended = exampleWith(
      ['from: 10 Hz', 'from: 2 Hz'],
      ['duration: 10 s', `duration: ${seconds} s`],
      ['line_spacing: 1.6 Hz', `line_spacing: ${spacing} Hz`],
    );
    expect(complaints(mended)).toEqual([]);
    expect(pointMeaning(siteOf(mended).machines[0].points[0])?.averages).toBe(5);
  });

  it('in orders are judged at the nominal speed, and need one', () => {
    const orders = ['from: 2 kHz\n        to: 8 kHz', 'from: 0.5x\n        to: 300x'] as const;
    expect(complaints(exampleWith(orders))[0]).toContain(
      "band 'bearing' of blower-1/de-h ends at 14.85 kHz, above",
    );
    expect(complaints(exampleWith(orders))[0]).toContain('write: to: 202x');
    const calm = ['from: 2 kHz\n        to: 8 kHz', 'from: 0.5x\n        to: 3.5x'] as const;
    expect(siteOf(exampleWith(calm)).machines[0].points[0].bands[1]).toMatchObject({
      from: 0.5,
      to: 3.5,
      inOrders: true,
    });
    const noSpeed = complaints(exampleWith(calm, ['    running_speed: 2970 rpm\n', '']));
    expect(noSpeed).toEqual([
      "site.yaml:43:15: band 'bearing' is in orders, and nothing says the speed of blower-1/de-h; add to the machine: running_speed: 2970 rpm, or sidecar: expected under recordings",
    ]);
    expect(complaints(exampleWith(['to: 8 kHz', 'to: 3.5x']))[0]).toContain(
      'begins and ends in different units',
    );
  });

  it('warn of a running speed within two lines of an edge, four with a flat-top window', () => {
    const edge = (window: string, lines: number) =>
      complaints(
        exampleWith(
          ['window: hann', `window: ${window}`],
          ['from: 10 Hz', `from: ${49.5 + lines * spacingHz} Hz`],
        ),
      ).length;
    expect([edge('hann', 1.9), edge('hann', 2.1), edge('flat-top', 3.9), edge('flat-top', 4.1)]).toEqual([
      1, 0, 1, 0,
    ]);
  });

  it('shrink the usual line spacing to what short recordings give, and say so', () => {
    const text = exampleWith(
      ['  line_spacing: 1.6 Hz\n', ''],
      ['duration: 10 s', 'duration: 300 ms'],
      ['from: 10 Hz', 'from: 20 Hz'],
    );
    const site = siteOf(text);
    expect(site.machines[0].points[0].analysis.lineSpacingHz).toBe(6.25);
    expect(site.warnings[0].text).toBe(
      'recordings of blower-1/de-h are too short for the usual line spacing of 1.6 Hz; 6.25 Hz is used',
    );
  });
});
