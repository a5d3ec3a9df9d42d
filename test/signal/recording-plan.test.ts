import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  handyLength,
  planRecording,
  type RecordingPlan,
  type RecordingWish,
  rateFor,
} from '../../src/signal/recording-plan.ts';
import { recordingReach } from '../../src/signal/recording-reach.ts';
import { longestSegmentSamples, secondsFor } from '../../src/signal/segment-length.ts';

const nothing: RecordingWish = {
  lineSpacingHz: null,
  separate: null,
  confidence: null,
  bands: [],
  slowestHz: null,
  highestHz: null,
  sampleRateHz: null,
  window: 'hann',
  overlapPercent: null,
  skipStartS: 0,
};

function plan(wish: Partial<RecordingWish>): RecordingPlan {
  const made = planRecording({ ...nothing, ...wish });
  if ('refused' in made) throw new Error(made.reason);
  return made;
}

const reachOf = ({ recording }: RecordingPlan, wish: RecordingWish) =>
  recordingReach(recording, {
    confidencePercent: wish.confidence?.percent ?? 95,
    bands: wish.bands,
    mountingHz: null,
    slowestHz: wish.slowestHz,
    envelope: { fromHz: 2000, toHz: 8000 },
  });

describe('a recording plan', () => {
  it('for a line every 1 Hz, levels of a line within 1 dB in 95 of 100, up to 10 kHz', () => {
    const { recording, layout } = plan({
      lineSpacingHz: 1,
      confidence: { db: 1, percent: 95 },
      highestHz: 10_000,
    });
    expect(recording).toMatchObject({ sampleRateHz: 25_600, segmentSamples: 32_768, overlapPercent: 50 });
    // 200 degrees of freedom give +0.90 dB, 100 give +1.29 (chi-square, any table): 1 dB lies between.
    expect(2 * layout.effectiveAverages).toBeGreaterThan(100);
    expect(2 * layout.effectiveAverages).toBeLessThan(200);
    // In a long recording of half overlapped Hann segments one segment length is worth 36/19 averages.
    const lengths = (recording.durationS * 25_600) / 32_768;
    expect(layout.effectiveAverages / lengths).toBeCloseTo(36 / 19, 1);
  });

  it('tells 49.5 Hz from 50 Hz: 3.5 lines of 0.143 Hz, so 0.0977 Hz at 25.6 kHz', () => {
    const { layout, widestSpacingHz, spacingFor } = plan({ separate: { lowHz: 49.5, highHz: 50 } });
    expect(widestSpacingHz).toBeCloseTo(0.5 / 3.5, 9);
    expect(layout.lineSpacingHz).toBe(25_600 / 262_144);
    expect(spacingFor).toBe('separate');
  });

  it('takes the line spacing from the slowest shaft where nothing else is asked', () => {
    const { layout, spacingFor } = plan({ slowestHz: 15 });
    expect(spacingFor).toBe('names');
    expect(layout.lineSpacingHz).toBeLessThanOrEqual(15 / 25);
    expect(layout.lineSpacingHz).toBeGreaterThan(15 / 50);
  });

  it('takes the overlap that suits the window', () => {
    expect(plan({ window: 'flat-top' }).recording.overlapPercent).toBe(75);
    expect(plan({ window: 'flat-top', overlapPercent: 25 }).recording.overlapPercent).toBe(25);
  });

  it('meets what it was asked for when it is fed back, and is not longer than it need be', () => {
    const wishes = fc.record({
      lineSpacingHz: fc.option(fc.double({ min: 0.05, max: 50, noNaN: true })),
      separate: fc.option(
        fc
          .tuple(
            fc.double({ min: 1, max: 2000, noNaN: true }),
            fc.double({ min: 0.2, max: 100, noNaN: true }),
          )
          .map(([lowHz, apart]) => ({ lowHz, highHz: lowHz + apart })),
      ),
      confidence: fc.option(
        fc.record({
          db: fc.double({ min: 0.5, max: 10, noNaN: true }),
          percent: fc.constantFrom(68, 90, 95, 99),
        }),
      ),
      bands: fc.array(
        fc
          .tuple(
            fc.double({ min: 2, max: 500, noNaN: true }),
            fc.double({ min: 5, max: 1000, noNaN: true }),
            fc.constantFrom(0, 1, 2),
          )
          .map(([fromHz, width, integrations]) => ({
            fromHz,
            toHz: fromHz + width,
            integrations: integrations as 0 | 1 | 2,
          })),
        { maxLength: 2 },
      ),
      slowestHz: fc.option(fc.double({ min: 0.5, max: 100, noNaN: true })),
      highestHz: fc.option(fc.double({ min: 20, max: 40_000, noNaN: true })),
      sampleRateHz: fc.option(fc.constantFrom(2048, 12_800, 25_600, 44_100, 51_200)),
      window: fc.constantFrom('hann', 'hamming', 'blackman', 'blackman-harris', 'flat-top'),
      overlapPercent: fc.option(fc.double({ min: 0, max: 95, noNaN: true })),
      skipStartS: fc.constantFrom(0, 1),
    }) as fc.Arbitrary<RecordingWish>;
    let made = 0;
    fc.assert(
      fc.property(wishes, (wish) => {
        const answer = planRecording(wish);
        if ('refused' in answer) {
          expect(answer.reason).not.toBe('');
          return;
        }
        made++;
        const can = reachOf(answer, wish);
        const { recording, layout } = answer;
        expect(can.layout).toEqual(layout);
        expect(layout.averages).toBeGreaterThanOrEqual(5);
        expect(Number.isInteger(Math.log2(recording.segmentSamples))).toBe(true);
        if (wish.lineSpacingHz !== null) expect(layout.lineSpacingHz).toBeLessThanOrEqual(wish.lineSpacingHz);
        if (wish.separate !== null) {
          const apart = wish.separate.highHz - wish.separate.lowHz;
          expect(can.unequalTonesHz).toBeLessThanOrEqual(apart * (1 + 1e-9));
        }
        if (wish.highestHz !== null)
          expect(can.highestHz).toBeGreaterThanOrEqual(wish.highestHz * (1 - 1e-6));
        if (wish.lineSpacingHz === null && wish.separate === null && wish.slowestHz !== null)
          expect(can.leastNamedHz).toBeLessThanOrEqual(wish.slowestHz * (1 + 1e-9));
        for (const [n, band] of wish.bands.entries()) {
          expect(can.bands[n]).toMatchObject({ hindrance: null });
          expect(can.narrowestBandHz).toBeLessThanOrEqual((band.toHz - band.fromHz) * (1 + 1e-9));
          if (band.integrations > 0)
            expect(can.lowestIntegratedHz).toBeLessThanOrEqual(band.fromHz * (1 + 1e-9));
          if (wish.confidence !== null)
            expect(can.bands[n]?.level?.highDb).toBeLessThanOrEqual(wish.confidence.db);
        }
        if (wish.confidence !== null && wish.bands.length === 0)
          expect(can.line?.highDb).toBeLessThanOrEqual(wish.confidence.db);
        // One average fewer than the shortest length needs, where more than five were needed, would not do.
        expect(recording.durationS).toBeGreaterThanOrEqual(secondsFor(layout.averages, recording) - 1e-6);
        if (wish.confidence === null || wish.bands.length > 0) return;
        const shorter = recordingReach(
          { ...recording, durationS: 0.85 * recording.durationS },
          {
            confidencePercent: wish.confidence.percent,
            bands: [],
            mountingHz: null,
            slowestHz: null,
            envelope: { fromHz: 2000, toHz: 8000 },
          },
        );
        if (shorter.layout.averages >= 12 && recording.durationS > 20)
          expect(shorter.line?.highDb).toBeGreaterThan(wish.confidence.db);
      }),
      { seed: 20261201, numRuns: 300 },
    );
    expect(made).toBeGreaterThan(120);
  });

  it('refuses in words what cannot be had', () => {
    const refused = (wish: Partial<RecordingWish>) => planRecording({ ...nothing, ...wish });
    expect(refused({ highestHz: 20_000, sampleRateHz: 25_600 })).toMatchObject({ refused: 'rate' });
    expect(refused({ lineSpacingHz: 0.001 })).toMatchObject({ refused: 'segment' });
    expect(refused({ confidence: { db: 0.001, percent: 95 } })).toMatchObject({ refused: 'length' });
    expect(refused({ window: 'rectangular', separate: { lowHz: 49, highHz: 50 } })).toMatchObject({
      refused: 'window',
    });
    expect(25_600 / longestSegmentSamples).toBeGreaterThan(0.001);
  });

  it('rounds up to what one would set', () => {
    expect([0.64, 3.84, 46.2, 132, 1000].map(handyLength)).toEqual([0.65, 4, 47, 140, 1020]);
    expect([500, 950, 1000, 3000, 8000, 10_000, 20_000].map(rateFor)).toEqual([
      1280, 2560, 2560, 10_240, 20_480, 25_600, 51_200,
    ]);
  });
});
