import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { PointEnvelope } from '../../src/config/envelope-settings.ts';
import {
  choiceAmong,
  choiceStep,
  chosenBand,
  type EnvelopeChoice,
} from '../../src/manipulation/envelope-choice.ts';
import type { EnvelopeCandidate } from '../../src/manipulation/envelope-measured.ts';
import { testPoint } from './point.ts';

const candidate = (fromHz: number, passes = true): EnvelopeCandidate => ({
  fromHz,
  toHz: fromHz + 1600,
  kurtosis: passes ? 0.9 : 0.05,
  noisePoint: 0.1,
  passes,
});
const play = (candidates: readonly EnvelopeCandidate[], before: EnvelopeChoice | null = null, among = 'a') =>
  candidates.reduce<EnvelopeChoice | null>((state, one, n) => choiceStep(state, among, one, n), before);
const times = (count: number, one: EnvelopeCandidate) => Array.from({ length: count }, () => one);

describe('the band that is demodulated', () => {
  it('is chosen by the fifth recording in which it wins, not by the fourth', () => {
    expect(play(times(4, candidate(3200)))?.chosen).toBeNull();
    expect(play(times(5, candidate(3200)))?.chosen).toEqual({
      fromHz: 3200,
      toHz: 4800,
      kurtosis: 0.9,
      sinceUsedMs: 4,
    });
  });

  it('C1: is never one that noise may show as well', () => {
    expect(play(times(50, candidate(3200, false)))?.chosen).toBeNull();
  });

  it('C2: is told from others that win now and then, but not by five wins among many more', () => {
    const mixed = [3200, 4800, 3200, 6400, 3200, 3200, 4800, 3200].map((hz) => candidate(hz));
    expect(play(mixed)?.chosen?.fromHz).toBe(3200);
    const seldom = Array.from({ length: 60 }, (_, n) => candidate(n % 3 === 0 ? 3200 : 8000 + 100 * n));
    expect(play(seldom)?.chosen).toBeNull();
  });

  it('C3: stays what it is, whatever stands out later', () => {
    const chosen = play(times(5, candidate(3200)));
    expect(play(times(50, candidate(6400)), chosen)).toBe(chosen);
  });

  it('C4: is looked for anew among other bands', () => {
    const chosen = play(times(5, candidate(3200)));
    const anew = play([candidate(6400)], chosen, 'b');
    expect(anew).toEqual({ among: 'b', winners: [{ fromHz: 6400, toHz: 8000 }], chosen: null });
  });

  it('is, whatever comes, one that won five of ten recordings in a row, and the state stays small', () => {
    const any = fc.record({ hz: fc.constantFrom(1600, 3200, 4800), passes: fc.boolean() });
    fc.assert(
      fc.property(fc.array(any, { maxLength: 60 }), (list) => {
        let state: EnvelopeChoice | null = null;
        for (const [n, { hz, passes }] of list.entries()) {
          state = choiceStep(state, 'a', candidate(hz, passes), n);
          expect(state.winners.length).toBeLessThanOrEqual(10);
          if (state.chosen === null) continue;
          const { fromHz, sinceUsedMs } = state.chosen;
          const looked = list.slice(Math.max(0, sinceUsedMs - 9), sinceUsedMs + 1);
          expect(looked.filter((one) => one.passes && one.hz === fromHz).length).toBe(5);
          return;
        }
        for (let end = 1; end <= list.length; end++) {
          const looked = list.slice(Math.max(0, end - 10), end);
          for (const hz of [1600, 3200, 4800])
            expect(looked.filter((one) => one.passes && one.hz === hz).length).toBeLessThan(5);
        }
      }),
      { seed: 20261201, numRuns: 300 },
    );
  });
});

describe('a choice holds', () => {
  const envelope: PointEnvelope = { band: null, choose: 'kurtosis', lineSpacingHz: 1.6, highestHz: 400 };
  const point = testPoint({ envelope });
  const among = choiceAmong(point, 25_600) as string;
  const choice = play(times(5, candidate(3200)), null, among);

  it('for recordings of the rate at which it was made', () => {
    expect(chosenBand(choice, point, 25_600)).toEqual({ fromHz: 3200, toHz: 4800 });
    expect(chosenBand(choice, point, 25_600.4)).toEqual({ fromHz: 3200, toHz: 4800 });
    expect(chosenBand(choice, point, 51_200)).toBeNull();
    expect(chosenBand(choice, point, null)).toBeNull();
  });

  it('until the sensor is fixed another way, or a band of the envelope reaches higher', () => {
    expect(chosenBand(choice, { ...point, mounting: 'glue' }, 25_600)).toBeNull();
    expect(chosenBand(choice, { ...point, envelope: { ...envelope, highestHz: 900 } }, 25_600)).toBeNull();
    expect(
      chosenBand(choice, { ...point, envelope: { ...envelope, lineSpacingHz: 0.5 } }, 25_600),
    ).not.toBeNull();
  });

  it('only where the site file lets recordings choose', () => {
    expect(chosenBand(choice, { ...point, envelope: { ...envelope, choose: 'fixed' } }, 25_600)).toBeNull();
    expect(choiceAmong(testPoint(), 25_600)).toBeNull();
    expect(chosenBand(null, point, 25_600)).toBeNull();
  });
});
