/** Mid-bands and edges as tabulated from IEC 61260-1:2014, 5.2 to 5.5 (base ten); nominal names of ISO 266. */
import { describe, expect, test } from 'vitest';
import { octaveBands } from '../../src/signal/octaves.ts';

const thirds = [
  [10, 10, 8.91251, 11.22018],
  [12.5, 12.58925, 11.22018, 14.12538],
  [16, 15.84893, 14.12538, 17.78279],
  [20, 19.95262, 17.78279, 22.38721],
  [25, 25.11886, 22.38721, 28.18383],
  [31.5, 31.62278, 28.18383, 35.48134],
  [40, 39.81072, 35.48134, 44.66836],
  [50, 50.11872, 44.66836, 56.23413],
  [63, 63.09573, 56.23413, 70.79458],
  [80, 79.43282, 70.79458, 89.12509],
  [100, 100, 89.12509, 112.20185],
  [125, 125.89254, 112.20185, 141.25375],
  [160, 158.48932, 141.25375, 177.82794],
  [200, 199.52623, 177.82794, 223.87211],
  [250, 251.18864, 223.87211, 281.83829],
  [315, 316.22777, 281.83829, 354.81339],
  [400, 398.10717, 354.81339, 446.68359],
  [500, 501.18723, 446.68359, 562.34133],
  [630, 630.95734, 562.34133, 707.94578],
  [800, 794.32823, 707.94578, 891.25094],
  [1000, 1000, 891.25094, 1122.01845],
  [1250, 1258.92541, 1122.01845, 1412.53754],
  [1600, 1584.89319, 1412.53754, 1778.27941],
  [2000, 1995.26231, 1778.27941, 2238.72114],
  [2500, 2511.88643, 2238.72114, 2818.38293],
  [3150, 3162.27766, 2818.38293, 3548.13389],
  [4000, 3981.07171, 3548.13389, 4466.83592],
  [5000, 5011.87234, 4466.83592, 5623.41325],
  [6300, 6309.57344, 5623.41325, 7079.45784],
  [8000, 7943.28235, 7079.45784, 8912.50938],
  [10000, 10000, 8912.50938, 11220.18454],
];

const octaves = [
  [16, 15.84893, 11.22018, 22.38721],
  [31.5, 31.62278, 22.38721, 44.66836],
  [63, 63.09573, 44.66836, 89.12509],
  [125, 125.89254, 89.12509, 177.82794],
  [250, 251.18864, 177.82794, 354.81339],
  [500, 501.18723, 354.81339, 707.94578],
  [1000, 1000, 707.94578, 1412.53754],
  [2000, 1995.26231, 1412.53754, 2818.38293],
  [4000, 3981.07171, 2818.38293, 5623.41325],
  [8000, 7943.28235, 5623.41325, 11220.18454],
];

describe.each([
  ['one-third octave', 3, thirds],
  ['octave', 1, octaves],
] as const)('%s bands', (_, fraction, table) => {
  const bands = octaveBands(fraction, table[0][0], table[table.length - 1][0]);

  test('have the tabulated nominal names, exact mid-bands and edges', () => {
    expect(bands.map(({ nominalHz }) => nominalHz)).toEqual(table.map(([nominal]) => nominal));
    bands.forEach(({ midHz, fromHz, toHz }, i) => {
      [midHz, fromHz, toHz].forEach((value, k) => {
        expect(value).toBeCloseTo(table[i][k + 1], 5);
      });
    });
  });

  test('meet: the upper edge of one is the lower edge of the next, to the last bit', () => {
    for (let i = 1; i < bands.length; i++) expect(bands[i].fromHz).toBe(bands[i - 1].toHz);
  });

  test('have edges half a band off the mid: G^(1/2b), G = 10^(3/10)', () => {
    for (const { midHz, fromHz, toHz } of bands) {
      const half = 10 ** (0.3 / (2 * fraction));
      expect(toHz / midHz).toBeCloseTo(half, 12);
      expect(midHz / fromHz).toBeCloseTo(half, 12);
    }
  });
});

test('are chosen by their nominal names, ends included, also where exact and nominal differ', () => {
  const names = (from: number, to: number) => octaveBands(3, from, to).map(({ nominalHz }) => nominalHz);
  expect(names(12.5, 16)).toEqual([12.5, 16]);
  expect(names(12.55, 15.9)).toEqual([]);
  expect(names(0.1, 0.2)).toEqual([0.1, 0.125, 0.16, 0.2]);
  expect(names(315, 200)).toEqual([]);
  expect(octaveBands(1, 1, 40).map(({ nominalHz }) => nominalHz)).toEqual([1, 2, 4, 8, 16, 31.5]);
});
