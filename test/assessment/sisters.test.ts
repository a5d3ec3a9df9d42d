/** When a level leaves those of sister machines. */
import { describe, expect, it } from 'vitest';
import { besideSisters, type MachineDay, sisterRules } from '../../src/assessment/sisters.ts';
import { seededRandom } from '../signal/random.ts';
import { shareNamed } from './sisters-figures.ts';

/** Thirty days about a level, 5 % from day to day, with what a course makes of it. */
function days(level: number, seed: number, course: (day: number) => number = () => 1): MachineDay[] {
  const random = seededRandom(seed);
  return Array.from({ length: 30 }, (_, day) => ({
    day,
    level: level * Math.exp(0.05 * random.gaussian()) * course(day),
  }));
}

const from = (first: number, factor: number) => (day: number) => (day < first ? 1 : factor);

describe('a machine beside its sisters', () => {
  it('leaves them when its level alone doubles, and says by how much', () => {
    const beside = besideSisters(days(1, 1, from(26, 2)), [days(1, 2), days(1.1, 3)]);
    expect(beside).toMatchObject({ hasMoved: true, hasRisen: true, isApart: true });
    expect(beside?.ratio).toBeCloseTo(1.9, 0);
    expect(beside?.usualRatio).toBeCloseTo(0.95, 1);
  });

  it('does not when all of them do: that is load or weather', () => {
    const all = from(26, 2);
    const beside = besideSisters(days(1, 1, all), [days(1, 2, all), days(1.1, 3, all)]);
    expect(beside).toMatchObject({ hasMoved: false, isApart: false });
  });

  it('lies apart from them, which is not leaving, when it always read more', () => {
    const beside = besideSisters(days(3, 1), [days(1, 2), days(1.1, 3)]);
    expect(beside).toMatchObject({ hasMoved: false, hasRisen: false, isApart: true });
    expect(beside?.usualRatio).toBeCloseTo(beside?.ratio ?? 0, 0);
  });

  it('is not worse for a sister that fell', () => {
    expect(besideSisters(days(1, 1), [days(1, 2, from(26, 0.3))])?.hasMoved).toBe(false);
    const twoFell = [days(1, 2, from(26, 0.3)), days(1, 3, from(26, 0.3))];
    expect(besideSisters(days(1, 1), twoFell)).toMatchObject({ hasMoved: false, hasRisen: false });
  });

  it('needs both of the newest days, so that one odd day leaves nobody', () => {
    const sisters = [days(1, 2), days(1.1, 3)];
    expect(besideSisters(days(1, 1, from(29, 3)), sisters)?.hasMoved).toBe(false);
    expect(besideSisters(days(1, 1, from(28, 3)), sisters)?.hasMoved).toBe(true);
  });

  it('beside one sister alone needs a larger margin, for either may be the odd one', () => {
    const grown = days(1, 1, from(20, 1.65));
    expect(besideSisters(grown, [days(1, 2), days(1, 3)])?.hasMoved).toBe(true);
    expect(besideSisters(grown, [days(1, 2)])?.hasMoved).toBe(false);
    expect(besideSisters(days(1, 1, from(20, 2.1)), [days(1, 2)])?.hasMoved).toBe(true);
  });

  it('waits for as much as sisters differ from day to day among themselves', () => {
    const restless = (seed: number) =>
      days(1, seed).map(({ day, level }, n) => ({ day, level: level * (n % 2 === 0 ? 0.6 : 1.7) }));
    expect(besideSisters(days(1, 1, from(26, 2)), [restless(2), days(1, 3), restless(4)])?.hasMoved).toBe(
      false,
    );
  });

  it('says nothing with fewer than ten days together, of an old day, or of nobody beside', () => {
    const own = days(1, 1, from(26, 2));
    expect(besideSisters(own, [])).toBeNull();
    expect(besideSisters(own, [[], []])).toBeNull();
    const late = days(1, 2).slice(30 - sisterRules.leastDays + 1);
    expect(besideSisters(own, [late, late])).toBeNull();
    const gone = days(1, 2).slice(0, 29);
    expect(besideSisters(own, [gone, gone])).toBeNull();
    expect(besideSisters(own, [days(1, 2).slice(20), days(1, 3).slice(20)])).not.toBeNull();
  });
});

describe('with levels as plants have them', () => {
  it('names nobody of whom nothing is the matter, and most whose level doubled five days ago', () => {
    expect(shareNamed(25, 2, () => 0)).toBe(0);
    expect(shareNamed(10, 2, (day) => (day < 25 ? 0 : Math.LN2))).toBeGreaterThan(0.8);
  }, 60_000);
});
