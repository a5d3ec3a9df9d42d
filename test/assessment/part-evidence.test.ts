import { describe, expect, it } from 'vitest';
import { assess } from '../../src/assessment/assess.ts';
import type { Part } from '../../src/config/parts.ts';
import { speaksForFault } from '../../src/manipulation/evidence.ts';
import type { MeasuredSpeed, SpectralPeak } from '../../src/manipulation/measurement.ts';
import { bearing, belt, gearPair, motor, wheel } from './parts.ts';

const rpm = (value: number): MeasuredSpeed => ({
  rpm: value,
  origin: 'pulses',
  uncertaintyRpm: 0.02,
  usableForNames: true,
  rangeRpm: null,
  inSpectrum: null,
});
const line = (frequencyHz: number, level = 1, aboveFloorDb = 15): SpectralPeak => ({
  ...{ frequencyHz, level, aboveFloorDb, kind: 'tone', order: null, names: [] },
});
const plain = (lineSpacingHz: number, lines: readonly SpectralPeak[]) => ({
  ...{ kind: 'plain' as const, peaks: lines, lineSpacingHz, toHz: 3000 },
});
const named = <P extends Part>(part: P, name: string): P => ({ ...part, id: name, name });
const told = (part: Part, speedRpm: number, spacingHz: number, lines: readonly SpectralPeak[]) => {
  const { evidence, peaks } = assess([plain(spacingHz, lines)], rpm(speedRpm), [part], [part]);
  return { evidence, words: evidence.map((one) => `${one.grade}: ${one.words}`), names: peaks[0] ?? [] };
};
const namesAt = (names: readonly SpectralPeak[], hz: number) =>
  names.find(({ frequencyHz }) => Math.abs(frequencyHz - hz) < 1e-6)?.names;

describe('what is said of gears', () => {
  // 23/67 teeth at 29.5 Hz: mesh 678.5 Hz, wheel 10.127 Hz.
  const gearbox = named(gearPair(23, 67), 'gearbox drive');
  const matingHz = (23 * 29.5) / 67;
  const mesh = [1, 2, 3].map((m) => line(m * 678.5, 10 / m, 30));
  const beside = (stepHz: number, orders: readonly number[], part: number) =>
    [1, 2, 3].flatMap((m) =>
      orders.flatMap((n) => [-n, n].map((k) => line(m * 678.5 + k * stepHz, (part * 10) / m))),
    );

  it('nothing of a mesh alone, nor of a weak first pair of sidebands', () => {
    expect(told(gearbox, 1770, 1, mesh).evidence).toEqual([]);
    expect(
      told(gearbox, 1770, 1, [...mesh, ...beside(29.5, [1], 0.2), ...beside(matingHz, [1], 0.2)]).evidence,
    ).toEqual([]);
  });

  it('whose sidebands stand there, by how far apart they are', () => {
    const wheelGear = told(gearbox, 1770, 1, [...mesh, ...beside(matingHz, [1, 2], 0.5)]);
    expect(wheelGear.words).toEqual([
      'strong: twelve sidebands at mating shaft 1x around three harmonics of the mesh of the gearbox drive (678.5 Hz), the strongest 6 dB under its line, 15 dB over the floor; common practice: the mating gear: wear, run-out or a tooth',
    ]);
    expect(namesAt(wheelGear.names, 678.5 + 2 * matingHz)).toEqual([
      'gear mesh + mating shaft 2x, gearbox drive',
    ]);
    const pinion = told(gearbox, 1770, 1, [...mesh, ...beside(29.5, [1, 2], 0.5)]);
    expect(pinion.evidence.map(({ fault }) => fault)).toEqual(['gear on the shaft']);
    // One every 0.44 Hz: the same two teeth.
    const hunting = told(gearbox, 1770, 0.1, [...mesh, ...beside(678.5 / (23 * 67), [1, 2], 0.2)]);
    expect(hunting.evidence.map(({ fault }) => fault)).toEqual(['two teeth that meet']);
  });

  it('one gear only, where the sidebands of a slower shaft meet those of a faster one', () => {
    // 38/67 teeth at 26.66 Hz: seven turns of the one shaft are four of the other, to less than a line.
    const close = named(gearPair(38, 67), 'gears');
    const [fastHz, slowHz] = [26.66, (38 * 26.66) / 67];
    const around = (stepHz: number, orders: readonly number[], level: number) =>
      [1, 2, 3].flatMap((m) =>
        orders.flatMap((n) => [-n, n].map((k) => line(m * 38 * fastHz + k * stepHz, level / m))),
      );
    const meshes = [1, 2, 3].map((m) => line(m * 38 * fastHz, 10 / m, 30));
    const slow = [...meshes, ...around(slowHz, [1, 2, 3, 4, 5, 6, 7, 8], 3)];
    const faults = (lines: readonly SpectralPeak[]) =>
      told(close, 60 * fastHz, 0.78, lines).evidence.map(({ fault }) => fault);
    expect(faults([...slow, ...around(fastHz, [1], 0.5)])).toEqual(['mating gear']);
    // Both are found where both stand: the lines of the one do not hide those of the other.
    expect(faults([...slow, ...around(fastHz, [1, 2], 0.5)])).toEqual(['mating gear', 'gear on the shaft']);
  });

  it('nothing where the harmonics of 1x stand throughout', () => {
    const comb = Array.from({ length: 90 }, (_, n) => line(29.5 * (n + 1), 3)).filter(
      ({ frequencyHz }) => frequencyHz % 678.5 > 1,
    );
    expect(told(gearbox, 1770, 1, [...mesh, ...comb]).evidence).toEqual([]);
  });

  it('nothing where lines lie wider than 1/25 of the shaft speed', () => {
    expect(told(gearbox, 1770, 1.3, [...mesh, ...beside(29.5, [1, 2], 0.5)]).evidence).toEqual([]);
  });
});

describe('what is said of electric motors', () => {
  // Two poles at 2960 r/min: 2x at 98.667 Hz, pole pass 1.333 Hz.
  const drive = named(motor(50, 2, 44), 'motor');
  const shaft = (...turns: readonly number[]) => turns.map((n) => line((n * 2960) / 60, 10 / n, 30));

  it('twice line is told from 2x, where the lines can; it names no fault', () => {
    const fine = told(drive, 2960, 0.25, [...shaft(1, 2), line(100, 3), line(200)]);
    expect(fine.words).toEqual([
      'weak: two harmonics of twice line of motor (100 Hz), 1.33 Hz from 2x, 15 dB over the floor; common practice: electrical, of no fault while it stays as it is',
    ]);
    expect(fine.evidence.some(speaksForFault)).toBe(false);
  });

  it('and where they cannot, so it is said, with the spacing that would do', () => {
    // 1.333 Hz asks for lines 0.33 Hz apart; the pole pass for 0.28, as the grid may be off by 0.2 Hz.
    const coarse = told(drive, 2960, 1.6, [...shaft(1), line(99, 10, 30)]);
    expect(coarse.words).toEqual([
      'not separable: twice line of motor (100 Hz) cannot be told from 2x (98.67 Hz) in the spectrum; lines 0.33 Hz apart or closer would',
      'not separable: pole-pass sidebands of motor (1.333 Hz beside it) cannot be told from 1x in the spectrum; lines 0.28 Hz apart or closer would',
    ]);
  });

  it('rotor bars by sidebands at the pole pass', () => {
    const beside = [1, 2, 3].flatMap((n) => [-1, 1].map((side) => line((n * 2960) / 60 + side * 1.32, 0.6)));
    const { evidence, names } = told(drive, 2960, 0.15, [...shaft(1, 2, 3), ...beside, line(20), line(330)]);
    expect(evidence.map(({ fault, grade }) => [fault, grade])).toEqual([['rotor bars', 'clear']]);
    expect(namesAt(names, 2960 / 60 - 1.32)).toEqual(['1x - pole pass, motor']);
    // 1 % of their line is what every rotor shows.
    const weak = beside.map((one) => ({ ...one, level: 0.04 }));
    expect(told(drive, 2960, 0.15, [...shaft(1, 2, 3), ...weak]).evidence).toEqual([]);
  });

  it('the passing of the bars with sidebands at twice line, which sound motors may show', () => {
    const passHz = (44 * 2960) / 60;
    const lines = [line(passHz, 5, 25), ...[-2, -1, 1, 2].map((k) => line(passHz + 100 * k, 1))];
    const { evidence } = told(drive, 2960, 0.15, [...shaft(1, 2), ...lines]);
    expect(evidence.map((one) => [one.fault, speaksForFault(one)])).toEqual([['rotor bar pass', false]]);
  });

  it('their lines count for no bearing', () => {
    // BPFO at 3.0405x falls on twice line of a motor of four poles: 100, 200, 300 Hz.
    const four = named(motor(50, 4), 'motor');
    const near = {
      ...bearing([9, 7.9, 38.5]),
      geometry: null,
      multiples: { ftf: null, bsf: null, bpfo: 4.21, bpfi: null },
    };
    const lines = [1, 2, 3].map((n) => line(n * 100));
    const of = (parts: readonly Part[]) =>
      assess([plain(0.5, [...lines, line(23.75, 5)])], rpm(1425), [near], parts).evidence.filter(
        speaksForFault,
      );
    expect(of([near])).toHaveLength(1);
    expect(of([near, four])).toEqual([]);
  });
});

describe('what is said of belts, wheels and couplings', () => {
  it('multiples of the belt frequency, two of them below 1x', () => {
    // Pulley of 200 mm, belt of 2 m, 24 Hz: 7.54 Hz, here with 0.5 % of creep.
    const seen = 7.539822 * 0.995;
    const lines = [1, 2, 3].map((n) => line(n * seen));
    const { words } = told(named(belt({}), 'belt drive'), 1440, 0.4, [
      line(24, 5, 25),
      line(48, 2),
      ...lines,
    ]);
    expect(words).toHaveLength(1);
    expect(words[0]).toMatch(
      /^(weak|clear): three multiples of the belt frequency of the belt drive \(7\.502 Hz\), three of them below 1x, 15 dB over the floor; common practice: the belt, worn, uneven or loose$/,
    );
  });

  it('nothing where one multiple alone stands below 1x', () => {
    // 9.6 Hz at 24 Hz: two multiples below it.
    const short = belt({ length: (Math.PI * 0.2) / 0.4 });
    const of = (...multiples: readonly number[]) =>
      told(short, 1440, 0.4, [line(24, 5, 25), line(48, 2), ...multiples.map((n) => line(n * 9.6))]).evidence;
    expect(of(1, 2, 3)).toHaveLength(1);
    expect(of(1, 3, 4)).toEqual([]);
  });

  it('vane pass with sidebands is told and names no fault; without them it is nothing', () => {
    const impeller = named(wheel('vanes', 11), 'impeller');
    const pass = [1, 2, 3].map((m) => line(m * 275, 5, 25));
    const beside = [1, 2, 3].flatMap((m) => [-2, -1, 1, 2].map((k) => line(m * 275 + 25 * k, 1)));
    expect(told(impeller, 1500, 0.9, pass).evidence).toEqual([]);
    const { evidence } = told(impeller, 1500, 0.9, [...pass, ...beside]);
    expect(evidence.map((one) => [one.fault, speaksForFault(one)])).toEqual([['vane pass', false]]);
  });

  it('many harmonics of 1x and half orders are told as what they are, and as no fault', () => {
    const claw: Part = {
      kind: 'coupling',
      id: 'coupling',
      name: 'coupling',
      at: ['de-h'],
      shaft: 1,
      elements: null,
    };
    const few = Array.from({ length: 6 }, (_, n) => line(25 * (n + 1)));
    expect(told(claw, 1500, 0.9, few).evidence).toEqual([]);
    const many = Array.from({ length: 15 }, (_, n) => line(25 * (n + 1)));
    const halves = [0.5, 1.5, 2.5, 3.5].map((n) => line(25 * n));
    const { evidence, words } = told(claw, 1500, 0.9, [...many, ...halves]);
    expect(evidence.some(speaksForFault)).toBe(false);
    expect(words.map((one) => one.replace(/^\w+: /, ''))).toEqual([
      'twelve harmonics from 4x on, up to 15x, 15 dB over the floor; common practice: looseness, a rub, a worn coupling, or a shape that is no sine',
      'half orders (0.5x, 1.5x, 2.5x, 3.5x), 15 dB over the floor; common practice: looseness or a rub',
    ]);
  });
});

describe('a fault that both spectra of a point show', () => {
  const driveEnd = named(bearing([9, 7.9375, 38.5]), 'drive-end bearing');
  const outer = 3.572 * 25;
  const of = (kind: 'envelope' | 'plain', harmonics: readonly number[]) => ({
    ...plain(
      0.5,
      harmonics.map((k) => line(k * outer, 1, kind === 'envelope' ? 14 : 9)),
    ),
    kind,
  });

  it('is one sentence, which says so', () => {
    const { evidence } = assess(
      [of('envelope', [1, 2, 3, 4]), of('plain', [1, 2, 3])],
      rpm(1500),
      [driveEnd],
      [driveEnd],
    );
    expect(evidence).toHaveLength(1);
    expect(evidence[0]).toMatchObject({ spectrum: 'envelope', alsoIn: 'plain', harmonics: 4 });
    expect(evidence[0]?.words).toBe(
      'four harmonics of BPFO of the drive-end bearing in the envelope (89.3 Hz), 14 dB over the floor; three harmonics in the spectrum as well, 9 dB over the floor',
    );
  });
});
