import { describe, expect, it } from 'vitest';
import { atLeast, findFamily } from '../../src/assessment/families.ts';
import { finerComb } from '../../src/assessment/finer-comb.ts';
import { FreeLines, type StandingLine } from '../../src/assessment/standing-lines.ts';
import { type SeededRandom, seededRandom } from '../signal/random.ts';

const lineSpacingHz = 1;
const shaft = { hz: 25, uncertaintyHz: 0.02, harmonics: Number.POSITIVE_INFINITY };
const line = (frequencyHz: number, aboveFloorDb = 10, level = 1): StandingLine => ({
  frequencyHz,
  level,
  aboveFloorDb,
});
const free = (lines: readonly StandingLine[]) =>
  new FreeLines({ lines, lineSpacingHz, fromHz: 4, toHz: 2400 }, [shaft]);
const comb = (hz: number, sidebandHz: number | null = null) => ({ hz, window: 0.021, sidebandHz });
const bpfo = 3.572 * 25;

describe('a family of lines', () => {
  it('is found where slip has put it, with its harmonics and its fundamental refined by them', () => {
    const seen = 0.993 * bpfo;
    const family = findFamily(free([1, 2, 3, 4].map((k) => line(k * seen))), comb(bpfo));
    expect(family?.hz).toBeCloseTo(seen, 9);
    expect(family?.lines.map(({ harmonic }) => harmonic)).toEqual([1, 2, 3, 4]);
    expect(family?.chance).toBeLessThan(1e-5);
  });

  it('needs two lines, and none beyond the window of slip', () => {
    expect(findFamily(free([line(bpfo)]), comb(bpfo))).toBeNull();
    const beyond = 0.96 * bpfo;
    expect(findFamily(free([1, 2, 3].map((k) => line(k * beyond))), comb(bpfo))).toBeNull();
  });

  it('with sidebands is less likely by accident than without', () => {
    const inner = 5.428 * 25;
    const harmonics = [1, 2].map((k) => line(k * inner));
    const sidebands = [-25, 25].flatMap((beside) => [1, 2].map((k) => line(k * inner + beside)));
    const bare = findFamily(free(harmonics), comb(inner, 25));
    const carried = findFamily(free([...harmonics, ...sidebands]), comb(inner, 25));
    expect(carried?.lines.filter(({ sideband }) => sideband !== 0)).toHaveLength(4);
    expect(carried?.chance).toBeLessThan(1e-3 * (bare?.chance ?? 0));
  });

  it('the more other lines stand about, the likelier is an accident', () => {
    const own = [1, 2, 3].map((k) => line(k * bpfo));
    const random = seededRandom(20261201);
    const others = Array.from({ length: 150 }, () => line(4 + 2396 * random.uniform(), 10));
    const alone = findFamily(free(own), comb(bpfo))?.chance ?? 1;
    const amid = findFamily(free([...others, ...own]), comb(bpfo))?.chance ?? 1;
    expect(amid).toBeGreaterThan(100 * alone);
  });

  it('counts no line within two line spacings of a harmonic of the shaft', () => {
    const lines = free([line(74), line(78), line(126.9), line(127.2)]);
    expect(lines.lines.map(({ frequencyHz }) => frequencyHz)).toEqual([78, 127.2]);
    // 3.04x: the first harmonics of the family stand at 3x, 6x, 9x within their uncertainty, and say nothing.
    expect(findFamily(free([1, 2, 3].map((k) => line(k * 75.5))), comb(76))).toBeNull();
  });

  it('stands for nothing where its fundamental could be seen and is not', () => {
    expect(findFamily(free([2, 3, 4].map((k) => line(k * bpfo))), comb(bpfo))).toBeNull();
  });

  // A cage turns so slowly that one line is several percent of it; its harmonics know better.
  it('lies where its harmonics put it, not where one line might', () => {
    const cage = 0.397 * 25;
    const third = 25 / 3;
    const foreign = [1, 2, 4, 5, 7, 8].map((k) => line(k * third));
    expect(findFamily(free(foreign), comb(1.09 * third))).toBeNull();
    expect(findFamily(free([1, 2, 4, 6].map((k) => line(k * 0.99 * cage))), comb(cage))).not.toBeNull();
  });

  it('is none where only every second or third of its harmonics stands: something faster makes those', () => {
    // Near 4x the fundamental cannot be told from the shaft, so that it cannot be missed either.
    const hz = 101.3;
    expect(findFamily(free([2, 4, 6, 8].map((k) => line(k * hz))), comb(hz))).toBeNull();
    expect(findFamily(free([2, 3, 4, 6].map((k) => line(k * hz))), comb(hz))).not.toBeNull();
  });

  it('is none where the lines of one side are stronger than those between: they are the middle of another', () => {
    const inner = 5.428 * 25;
    const around = (middle: number) =>
      [1, 2].flatMap((k) => [
        line(k * middle, 20, 1),
        line(k * middle - 25, 16, 0.5),
        line(k * middle + 25, 16, 0.5),
      ]);
    expect(findFamily(free(around(inner)), comb(inner, 25))).not.toBeNull();
    expect(findFamily(free([...around(inner + 25), line(2 * inner, 12, 0.2)]), comb(inner, 25))).toBeNull();
  });

  it('is the part of a finer comb of which a shaft hides a line', () => {
    // Half of it, 55.1 Hz: 11x hides its fifth multiple.
    const lines = [1, 2, 3, 4, 6, 7, 8, 9].map((k) => line(k * 55.1));
    expect(finerComb(free(lines), 110.2, null)).toBeCloseTo(55.1, 9);
    expect(finerComb(free([1, 2, 3, 4, 6, 8].map((k) => line(k * 55.1))), 110.2, null)).toBeNull();
  });

  it('is the part of a finer comb where the lines between stand as well', () => {
    const foreign = bpfo / 4;
    const lines = Array.from({ length: 16 }, (_, k) => line((k + 1) * foreign));
    expect(finerComb(free(lines), bpfo, null)).not.toBeNull();
    expect(finerComb(free([1, 2, 3, 4].map((k) => line(k * bpfo))), bpfo, null)).toBeNull();
    // Thirds of a turn, of which BPFI at 19/3 turns is the nineteenth.
    const thirds = Array.from({ length: 60 }, (_, k) => line(((k + 1) * 25) / 3));
    expect(finerComb(free(thirds), (19 * 25) / 3, 25)).not.toBeNull();
    // The cage of the same bearing is no stranger.
    expect(finerComb(free(lines), bpfo, null, [foreign, 2 * foreign])).toBeNull();
  });
});

describe('the chance of accident', () => {
  it('of at least so many of independent events: the binomial tail, by hand', () => {
    expect(atLeast([0.1, 0.1, 0.1], 2)).toBeCloseTo(3 * 0.01 * 0.9 + 0.001, 12);
    expect(atLeast([0.5, 0.2], 1)).toBeCloseTo(0.6, 12);
    expect(atLeast([1e-8, 1e-8, 1e-8], 3)).toBeCloseTo(1e-24, 30);
  });

  // Lines at random places: whatever is found is accident, and must be said to be.
  it.each([
    ['few lines', 20, uniformly],
    ['many lines', 150, uniformly],
    ['lines crowded at low frequencies', 40, crowded],
  ] as const)('is not understated: %s', (_name, count, place) => {
    const random = seededRandom(20261201);
    const trials = 2000;
    const within = { 0.1: 0, 0.01: 0 };
    for (let n = 0; n < trials; n++) {
      const lines = Array.from({ length: count }, () =>
        line(place(random), 3 - 4 * Math.log(1 - random.uniform())),
      );
      const sidebandHz = n % 2 === 0 ? null : shaft.hz;
      const found = findFamily(free(lines), comb(shaft.hz * (2 + 8 * random.uniform()), sidebandHz));
      if ((found?.chance ?? 1) <= 0.1) within[0.1]++;
      if ((found?.chance ?? 1) <= 0.01) within[0.01]++;
    }
    // Three standard deviations above the rate that it says.
    expect(within[0.1]).toBeLessThan(0.1 * trials + 3 * Math.sqrt(0.1 * trials));
    expect(within[0.01]).toBeLessThan(0.01 * trials + 3 * Math.sqrt(0.01 * trials));
    expect(within[0.1]).toBeGreaterThan(0.001 * trials);
  });
});

function uniformly(random: SeededRandom): number {
  return 4 + 2396 * random.uniform();
}

function crowded(random: SeededRandom): number {
  return 4 * 600 ** random.uniform();
}
