import { describe, expect, it } from 'vitest';
import { chartSvg } from '../../../src/advisory/charts/chart-svg.ts';
import { type SpectrumChartFacts, spectrumChart } from '../../../src/advisory/charts/spectrum-chart.ts';
import { niceTop, type TrendChartFacts, trendChart } from '../../../src/advisory/charts/trend-chart.ts';
import { chartPng } from '../../../src/service/chart-png.ts';

const size = { widthPx: 400, heightPx: 260 };
const display = { text: 'mm/s', quantity: 'velocity', inSi: 0.001, detector: 'rms' } as const;
const hour = 3_600_000;
const begin = Date.UTC(2026, 2, 1);

const trend: TrendChartFacts = {
  title: 'blower-1/de-h, overall',
  timeZone: 'Europe/Dublin',
  display,
  fromMs: begin,
  toMs: begin + 10 * 24 * hour,
  levels: Array.from({ length: 200 }, (_, n) => ({
    usedMs: begin + n * hour,
    level: 0.001 + n * 1e-5,
    low: 0.0009 + n * 1e-5,
    high: 0.0012 + n * 1e-5,
    kind: n === 50 ? 'flagged' : 'plain',
  })),
  alert: 0.0028,
  danger: 0.0045,
  baseline: 0.001,
  marks: [{ atMs: begin + 100 * hour, text: 'repair', breaks: true }],
  projection: null,
};

/** Words of an SVG, as they can be read in it. */
const wordsOf = (svg: string) => [...svg.matchAll(/<text[^>]*>([^<]*)</g)].map(([, text]) => text);

describe('the chart of a trend', () => {
  it('names its unit with the detector, the limits with their values, and every mark', () => {
    const words = wordsOf(chartSvg(trendChart(trend, size), size));
    for (const word of [
      'blower-1/de-h, overall',
      'mm/s r.m.s.',
      'alert 2.8',
      'danger 4.5',
      'usual 1',
      'repair',
    ])
      expect(words).toContain(word);
    expect(words.join(' ')).toContain('\u25b3 flagged');
    expect(words.filter((word) => /^\d+ Mar$/.test(word)).length).toBeGreaterThanOrEqual(3);
  });

  it('draws no level line across a repair', () => {
    const paths = (marks: TrendChartFacts['marks']) =>
      chartSvg(trendChart({ ...trend, marks }, size), size).match(/stroke="#1f4e79"[^>]*/g)?.length ?? 0;
    const [line] = chartSvg(trendChart(trend, size), size).match(/<path d="[^"]*"[^>]*stroke="#1f4e79"/) ?? [
      '',
    ];
    expect(line.match(/M/g)?.length).toBe(2);
    expect(paths([])).toBeGreaterThan(0);
  });

  it('is a picture with the shipped font, small enough for a mail', () => {
    const png = chartPng(chartSvg(trendChart(trend, size), size));
    expect([...png.subarray(0, 8)]).toEqual([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]);
    expect(new DataView(png.buffer, png.byteOffset).getUint32(16)).toBe(2 * size.widthPx);
    expect(png.length).toBeLessThan(100_000);
  });

  it('has a top above its highest value, at a round number', () => {
    expect([0, 0.9, 1, 1.42, 2.8, 4.5, 7.3, 9.6, 950].map(niceTop)).toEqual([
      1, 1, 1.5, 1.5, 3, 5, 8, 15, 1000,
    ]);
  });

  it('makes names from files harmless', () => {
    const svg = chartSvg(trendChart({ ...trend, title: '<script>alert(1)</script>' }, size), size);
    expect(svg).not.toContain('<script');
  });
});

describe('the chart of a spectrum', () => {
  const density = new Float64Array(2000).fill(1e-6);
  density[100] = 0.04;
  const spectrum: SpectrumChartFacts = {
    title: 'blower-1/de-h',
    display: { text: 'm/s²', quantity: 'acceleration', inSi: 1, detector: 'rms' },
    now: { lineSpacingHz: 1, density },
    before: null,
    toHz: 1000,
    ordersOfHz: null,
    scale: 'linear',
    peaks: [{ frequencyHz: 100, level: 0.2, name: 'BPFO' }],
    families: [{ text: 'BPFO drive end', hz: 100, multiples: 3 }],
  };

  it('names the unit of a line, the peaks, and where a damaged part would show', () => {
    const words = wordsOf(chartSvg(spectrumChart(spectrum, size), size));
    for (const word of ['m/s² r.m.s. a line of 1 Hz', 'Hz', 'BPFO', 'BPFO drive end'])
      expect(words).toContain(word);
  });

  it('counts in orders of the running speed where people do', () => {
    const words = wordsOf(
      chartSvg(
        spectrumChart(
          { ...spectrum, ordersOfHz: 50, peaks: [{ frequencyHz: 100, level: 0.2, name: null }] },
          size,
        ),
        size,
      ),
    );
    expect(words).toContain('orders of 50 Hz');
    expect(words).toContain('2x');
  });

  it('loses no peak however narrow the picture: the greatest of the lines that share a dot stands', () => {
    const narrow = { widthPx: 200, heightPx: 200 };
    const many = new Float64Array(200_001).fill(1e-9);
    many[77_777] = 1;
    const option = spectrumChart(
      { ...spectrum, now: { lineSpacingHz: 0.01, density: many }, toHz: 2000 },
      narrow,
    ) as {
      series: { data: [number, number][] }[];
    };
    const drawn = option.series[0].data;
    expect(drawn.length).toBeLessThan(400);
    expect(drawn.some(([hz, level]) => Math.abs(hz - 777.77) < 1e-9 && Math.abs(level - 0.1) < 1e-12)).toBe(
      true,
    );
  });

  it('is drawn on a logarithmic scale where asked, silence included', () => {
    expect(chartSvg(spectrumChart({ ...spectrum, scale: 'log' }, size), size)).toContain('0.001');
    const silent = {
      ...spectrum,
      scale: 'log',
      now: { lineSpacingHz: 1, density: new Float64Array(100) },
    } as const;
    expect(chartSvg(spectrumChart(silent, size), size)).toContain('</svg>');
  });
});
