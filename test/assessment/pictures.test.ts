import { describe, expect, it } from 'vitest';
import { findPicture } from '../../src/assessment/pictures.ts';
import { sidebandPicture } from '../../src/assessment/sidebands.ts';
import type { StandingLine } from '../../src/assessment/standing-lines.ts';
import { type SeededRandom, seededRandom } from '../signal/random.ts';

const line = (frequencyHz: number, level = 1, aboveFloorDb = 12): StandingLine => ({
  frequencyHz,
  level,
  aboveFloorDb,
});
const spectrumOf = (lines: readonly StandingLine[]) => ({ lines, lineSpacingHz: 1, fromHz: 4, toHz: 3000 });
const meshHz = 575;
const mesh = [1, 2, 3].map((harmonic) => ({ hz: harmonic * meshHz, level: 10, harmonic }));
const picture = (more: { readonly windowHz?: number; readonly stepHz?: number } = {}) => {
  const usual = {
    betweenHz: meshHz,
    stepHz: 25,
    windowHz: 0.1,
    mostOrders: 5,
    firstPart: 0.25,
    leastPart: 0.03,
  };
  const found = sidebandPicture({ carriers: mesh, counts: () => true, ...usual, ...more });
  if (found === null) throw new Error('no room');
  return found;
};
const carriers = mesh.map(({ hz, level }) => line(hz, level, 30));
const beside = (orders: readonly number[], level = 1) =>
  mesh.flatMap(({ hz }) => orders.flatMap((n) => [line(hz - n * 25, level), line(hz + n * 25, level)]));

describe('sidebands of a line', () => {
  it('are found, with their spacing as it was observed', () => {
    const seen = mesh.flatMap(({ hz }) =>
      [1, 2].flatMap((n) => [line(hz - n * 25.06, 4), line(hz + n * 25.06, 4)]),
    );
    const shown = findPicture(spectrumOf([...carriers, ...seen]), picture());
    expect(shown?.lines).toHaveLength(12);
    expect(shown?.stepHz).toBeCloseTo(25.06, 9);
    expect(shown?.chance).toBeLessThan(1e-8);
  });

  it('are none where the line stands alone, or with the weak first pair that sound gears have', () => {
    expect(findPicture(spectrumOf(carriers), picture())).toBeNull();
    expect(findPicture(spectrumOf([...carriers, ...beside([1], 2)]), picture())).toBeNull();
    expect(findPicture(spectrumOf([...carriers, ...beside([1], 3)]), picture())?.lines).toHaveLength(6);
    // Less than 3 % of the mesh counts for nothing at any order.
    expect(findPicture(spectrumOf([...carriers, ...beside([1, 2, 3], 0.2)]), picture())).toBeNull();
  });

  it('take a pair around one line', () => {
    const above = mesh.flatMap(({ hz }) => [2, 3].map((n) => line(hz + n * 25)));
    expect(findPicture(spectrumOf([...carriers, ...above]), picture())).toBeNull();
  });

  it('say nothing where their comb goes on beyond them', () => {
    const comb = Array.from({ length: 80 }, (_, n) => line(25 * (n + 1)));
    expect(findPicture(spectrumOf([...carriers, ...comb]), picture())?.chance).toBeGreaterThan(0.1);
  });

  it('say nothing where most of their comb goes on beyond them, as strong as they are', () => {
    // Sixteen spacings from line to line: five orders either side are the picture, three more are beyond it.
    const stepHz = meshHz / 16;
    const at = (orders: readonly number[], dB: number) =>
      mesh.flatMap(({ hz }) => orders.map((n) => line(hz + n * stepHz, 4, dB)));
    const own = at([-5, -4, -3, -2, -1, 1, 2, 3, 4, 5], 12);
    const found = (beyond: readonly number[]) =>
      findPicture(spectrumOf([...carriers, ...own, ...at(beyond, 15)]), picture({ stepHz }))?.chance;
    expect(found([-7])).toBeLessThan(1e-8);
    expect(found([-7, -6, 6, 7])).toBe(1);
  });

  it('have no room where their orders would meet those of the next line', () => {
    const of = { carriers: mesh, betweenHz: meshHz, windowHz: 0, mostOrders: 5, firstPart: 0, leastPart: 0 };
    expect(sidebandPicture({ ...of, stepHz: meshHz / 3, counts: () => true })).toBeNull();
    expect(sidebandPicture({ ...of, stepHz: meshHz / 4, counts: () => true })?.places).toHaveLength(6);
  });
});

describe('the chance of accident of a picture', () => {
  // Lines at random places: whatever is found is accident, and must be said to be.
  it.each([
    ['few lines', 20, uniformly, 0.1],
    ['many lines', 120, uniformly, 0.1],
    ['many lines, a spacing that is not known well', 120, uniformly, 3],
    ['lines crowded at low frequencies', 60, crowded, 0.1],
    ['lines crowded beside the carriers', 60, nearMesh, 1],
  ] as const)('is not understated: %s', (_name, count, place, windowHz) => {
    const random = seededRandom(20261201);
    const trials = 1500;
    const within = { 0.1: 0, 0.01: 0 };
    for (let n = 0; n < trials; n++) {
      const stepHz = 10 + 60 * random.uniform();
      const lines = Array.from({ length: count }, () =>
        line(place(random), 5, 3 - 4 * Math.log(1 - random.uniform())),
      );
      const chance =
        findPicture(spectrumOf([...carriers, ...lines]), picture({ stepHz, windowHz }))?.chance ?? 1;
      if (chance <= 0.1) within[0.1]++;
      if (chance <= 0.01) within[0.01]++;
    }
    // Three standard deviations above the rate that it says.
    expect(within[0.1]).toBeLessThan(0.1 * trials + 3 * Math.sqrt(0.1 * trials));
    expect(within[0.01]).toBeLessThan(0.01 * trials + 3 * Math.sqrt(0.01 * trials));
  });
});

function uniformly(random: SeededRandom): number {
  return 4 + 2396 * random.uniform();
}

function crowded(random: SeededRandom): number {
  return 4 * 600 ** random.uniform();
}

function nearMesh(random: SeededRandom): number {
  return meshHz * (1 + Math.floor(3 * random.uniform())) + 120 * random.gaussian();
}
