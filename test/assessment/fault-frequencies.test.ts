import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  bearingMultiples,
  characteristicFrequencies,
  shaftsOf,
} from '../../src/assessment/fault-frequencies.ts';
import { planetarySpeeds } from '../../src/assessment/planetary-frequencies.ts';
import { bearing, belt, gearPair, hzOf, motor, planetary, wheel } from './parts.ts';

describe('the frequencies of a rolling bearing are those of published examples', () => {
  // Multiples of the shaft: bearing data centre of Case Western Reserve University, drive end and fan end, inches. Its
  // 'rolling element' is twice the spin. Its last digits differ from its geometry by up to 3e-5 of them.
  it.each([
    ['drive end', [9, 0.3126, 1.537], { bpfi: 5.4152, bpfo: 3.5848, ftf: 0.39828, twiceBsf: 4.7135 }],
    ['fan end', [8, 0.2656, 1.122], { bpfi: 4.9469, bpfo: 3.053, ftf: 0.3817, twiceBsf: 3.9874 }],
    // G. Forbes, data set of 21 November 2012, Curtin University, millimetres.
    ['Curtin', [9, 7.9375, 38.5], { bpfi: 5.428, bpfo: 3.572, ftf: 0.3969, twiceBsf: 4.64 }],
  ])('%s', (_name, geometry, published) => {
    const { ftf, bsf, bpfo, bpfi } = bearingMultiples(bearing(geometry));
    const near = (value: number | null, wanted: number) =>
      expect(Math.abs((value ?? 0) / wanted - 1)).toBeLessThan(1e-3);
    near(bpfi, published.bpfi);
    near(bpfo, published.bpfo);
    near(ftf, published.ftf);
    near(2 * (bsf ?? 0), published.twiceBsf);
  });

  it.each([
    // Wang, Lei, Li & Li, IEEE Trans. Reliab. 69(1), 2020, at 35 Hz and at 40 Hz.
    ['XJTU-SY', [8, 7.92, 34.55], 35, { BPFO: 107.91, BPFI: 172.09, BSF: 72.33, FTF: 13.49 }, 0.005],
    ['XJTU-SY', [8, 7.92, 34.55], 40, { BPFO: 123.32, BPFI: 196.68 }, 0.005],
    // E. Bechhoefer, fault data of the MFPT society, 2013, inches.
    ['MFPT', [8, 0.235, 1.245], 25, { BPFO: 81.12, BPFI: 118.88 }, 0.005],
    // Qiu, Lee, Lin & Yu, J. Sound Vib. 289, 2006: 2000 r/min, inches, 15.17 degrees.
    ['IMS', [16, 0.331, 2.815, 15.17], 2000 / 60, { BPFO: 236.4, BPFI: 296.9, BSF: 139.9, FTF: 14.8 }, 0.05],
    // Nectoux et al., IEEE PHM 2012: 1800 r/min, millimetres.
    ['FEMTO', [13, 3.5, 25.6], 30, { BPFO: 168.3, BPFI: 221.7 }, 0.05],
    // By hand: q = cos(15 deg)/6 = 0.16099.
    [
      'arithmetic',
      [8, 2, 12, 15],
      25,
      { BPFO: 83.90124, BPFI: 116.09876, BSF: 73.05622, FTF: 10.48765 },
      5e-6,
    ],
  ] as const)('%s', (_name, geometry, runningHz, published, within) => {
    for (const [kind, hz] of Object.entries(published))
      expect(Math.abs(hzOf(bearing([...geometry]), kind as 'BPFO', runningHz) - hz)).toBeLessThanOrEqual(
        within,
      );
  });

  it('BPFO + BPFI is one pass of every element a turn, BPFO = n FTF, whatever the geometry', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 5, max: 30 }),
        fc.double({ min: 0.05, max: 0.4, noNaN: true }),
        fc.double({ min: 0, max: 60, noNaN: true }),
        (n, ratio, angle) => {
          const { ftf, bpfo, bpfi } = bearingMultiples(bearing([n, ratio, 1, angle]));
          expect((bpfo ?? 0) + (bpfi ?? 0)).toBeCloseTo(n, 9);
          expect(n * (ftf ?? 0)).toBeCloseTo(bpfo ?? 0, 9);
          expect(n * (1 - (ftf ?? 0))).toBeCloseTo(bpfi ?? 0, 9);
        },
      ),
      { seed: 20261201 },
    );
  });

  it('with the outer ring turning the cage is faster and the races are passed as often', () => {
    const geometry = [9, 7.9375, 38.5];
    const inner = bearingMultiples(bearing(geometry));
    const outer = bearingMultiples(bearing(geometry, { turningRing: 'outer' }));
    expect(outer.bpfo).toBeCloseTo(inner.bpfo ?? 0, 12);
    expect(outer.bpfi).toBeCloseTo(inner.bpfi ?? 0, 12);
    // FTF = (fi (1 - q) + fo (1 + q)) / 2; BPFO = n |FTF - fo|, with fi = 0 and fo = 1.
    expect(9 * Math.abs((outer.ftf ?? 0) - 1)).toBeCloseTo(inner.bpfo ?? 0, 12);
  });

  it('the multiples that a maker gives stand in place of the formulas, on a shaft of their own ratio', () => {
    const given = bearing([], {
      geometry: null,
      shaft: 0.5,
      multiples: { ftf: null, bsf: null, bpfo: 3.585, bpfi: null },
    });
    expect(characteristicFrequencies(given).map(({ kind, perTurn }) => [kind, perTurn])).toEqual([
      ['BPFO', 1.7925],
    ]);
  });
});

describe('the frequencies of other parts', () => {
  it('gears: 23 and 67 teeth at 29.5 Hz mesh at 678.5 Hz, turn the wheel at 10.13 Hz, meet again at 0.4403 Hz', () => {
    const pair = gearPair(23, 67);
    expect(hzOf(pair, 'gear mesh', 29.5)).toBeCloseTo(678.5, 9);
    expect(hzOf(pair, 'shaft', 29.5)).toBeCloseTo(10.126866, 6);
    expect(hzOf(pair, 'hunting tooth', 29.5)).toBeCloseTo(0.440299, 6);
    // A common divisor of 12: the same teeth meet twelve times as often.
    expect(hzOf(gearPair(24, 60), 'hunting tooth', 30)).toBeCloseTo(6, 9);
  });

  it('a planetary set of 28 and 80 teeth, sun at 20 Hz: carrier 5.185 Hz, mesh 414.8 Hz, from either side', () => {
    expect(hzOf(planetary({}), 'shaft', 20)).toBeCloseTo(5.185185, 6);
    expect(hzOf(planetary({}), 'gear mesh', 20)).toBeCloseTo(414.8148, 4);
    // Driven by the carrier at that speed, the sun turns at 20 Hz again.
    const driven = planetary({ onShaft: 'carrier', shaft: 28 / 108 });
    expect(planetarySpeeds(driven).sun).toBeCloseTo(1, 12);
    expect(hzOf(driven, 'gear mesh', 20)).toBeCloseTo(414.8148, 4);
    // Held carrier: a fixed train, the ring turns the other way at 28/80.
    expect(planetarySpeeds(planetary({ held: 'carrier' })).ring).toBeCloseTo(-28 / 80, 12);
    // Each planet strikes a tooth of the sun once a turn of the sun against the carrier.
    expect(hzOf(planetary({}), 'sun defect', 20)).toBeCloseTo(3 * (20 - 5.185185), 4);
    expect(hzOf(planetary({}), 'planet defect', 20)).toBeCloseTo((2 * 414.8148) / 26, 4);
  });

  it('vanes and blades pass at their number times the speed: 7 at 1480 r/min, 172.7 Hz', () => {
    expect(hzOf(wheel('vanes', 7), 'vane pass', 1480 / 60)).toBeCloseTo(172.6667, 4);
    expect(hzOf(wheel('blades', 7), 'blade pass', 1480 / 60)).toBeCloseTo(172.6667, 4);
  });

  it('a belt of 2 m on a pulley of 200 mm at 24 Hz comes round 7.540 times a second', () => {
    expect(hzOf(belt({}), 'belt', 24)).toBeCloseTo(7.539822, 6);
    expect(hzOf(belt({ otherPulleyDiameter: 0.4 }), 'shaft', 24)).toBeCloseTo(12, 12);
  });

  it('a motor: slip 0.333 Hz and pole pass 1.333 Hz at 1480 r/min on 50 Hz; 2.0 Hz at 1770 r/min on 60 Hz', () => {
    expect(hzOf(motor(50, 4), 'slip', 1480 / 60)).toBeCloseTo(0.333333, 6);
    expect(hzOf(motor(50, 4), 'pole pass', 1480 / 60)).toBeCloseTo(1.333333, 6);
    expect(hzOf(motor(60, 4), 'pole pass', 1770 / 60)).toBeCloseTo(2, 9);
    expect(hzOf(motor(60, 4), 'twice line', 1770 / 60)).toBe(120);
    expect(hzOf(motor(60, 4, 44), 'rotor bar pass', 1770 / 60)).toBeCloseTo(1298, 9);
  });

  it('the shafts of a machine are its own, those of its parts, and those that they drive', () => {
    expect(shaftsOf([gearPair(20, 40), gearPair(20, 60, 0.5), wheel('vanes', 5)])).toEqual([
      1,
      0.5,
      0.5 * (20 / 60),
    ]);
  });
});
