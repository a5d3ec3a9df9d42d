/** The long run (`evidence.long.ts`) proves the figures; here is a part of each of its questions. */
import { describe, expect, it } from 'vitest';
import { assess, observedSpeed } from '../../src/assessment/assess.ts';
import type { Evidence } from '../../src/manipulation/evidence.ts';
import type { MeasuredSpeed, SpectralPeak } from '../../src/manipulation/measurement.ts';
import { seededRandom } from '../signal/random.ts';
import { bearingMachine, bearingNearHarmonic } from './bearing-machine.ts';
import { named, namedByDeclaredSpeed, rightlyNamed, simulatedFaults } from './evidence-trials.ts';
import { bearing } from './parts.ts';

const seed = 20261201;

describe('evidence on simulated machines', () => {
  it('names most faults rightly, and none on healthy machines', { timeout: 120_000 }, () => {
    const right = simulatedFaults.map((fault, kind) => rightlyNamed({ fault }, 6, seed + 1000 * kind));
    for (const count of right) expect(count).toBeGreaterThanOrEqual(4);
    expect(named((n) => ({ fault: null, oncePerTurn: n % 3 === 0 }), 10, seed + 10_000)).toBe(0);
  });

  it('names none where a shaft harmonic lies within 2 % of a fault frequency; a window around the declared speed does', {
    timeout: 120_000,
  }, () => {
    const kindOf = (n: number) => ({
      fault: null,
      oncePerTurn: true,
      bearing: bearingNearHarmonic(seededRandom(seed + n)),
    });
    expect(named(kindOf, 8, seed + 20_000)).toBe(0);
    const machines = Array.from({ length: 4 }, (_, n) =>
      bearingMachine(seededRandom(seed + 20_000 + n), kindOf(n)),
    );
    expect(machines.filter(namedByDeclaredSpeed).length).toBeGreaterThanOrEqual(3);
  });
});

const speed = (more: Partial<MeasuredSpeed> = {}): MeasuredSpeed => ({
  rpm: 1500,
  origin: 'sidecar',
  uncertaintyRpm: 1,
  usableForNames: true,
  rangeRpm: null,
  inSpectrum: null,
  ...more,
});
const peak = (frequencyHz: number, aboveFloorDb = 14): SpectralPeak => ({
  frequencyHz,
  level: 1,
  aboveFloorDb,
  kind: 'tone',
  order: null,
  names: [],
});
const driveEnd = { ...bearing([9, 7.9375, 38.5]), id: 'de-bearing', name: 'drive-end bearing' };
const envelope = (lineSpacingHz: number, ...frequencies: number[]) => ({
  kind: 'envelope' as const,
  peaks: frequencies.map((hz) => peak(hz)),
  lineSpacingHz,
  toHz: 3000,
});
const words = (evidence: readonly Evidence[]) => evidence.map((one) => `${one.grade}: ${one.words}`);

describe('what is said of a family', () => {
  const outer = 3.572 * 25 * 0.995;
  const inner = 5.428 * 25 * 1.004;

  it('in plain words, graded, and its lines are named', () => {
    const found = assess([envelope(0.5, outer, 2 * outer, 3 * outer, 50)], speed(), [driveEnd], [driveEnd]);
    expect(words(found.evidence)).toEqual([
      'clear: three harmonics of BPFO of the drive-end bearing in the envelope (88.85 Hz), 14 dB over the floor',
    ]);
    expect(found.peaks[0]?.map(({ names }) => names)).toEqual([
      ['BPFO, drive-end bearing'],
      ['BPFO x2, drive-end bearing'],
      ['BPFO x3, drive-end bearing'],
      ['2x'],
    ]);
  });

  it('with its sidebands', () => {
    const lines = [1, 2].flatMap((k) => [k * inner, k * inner - 25, k * inner + 25]);
    const { evidence, peaks } = assess([envelope(0.5, ...lines)], speed(), [driveEnd], [driveEnd]);
    expect(words(evidence)).toEqual([
      'clear: two harmonics of BPFI of the drive-end bearing in the envelope (136.2 Hz), 14 dB over the floor, sidebands at 1x',
    ]);
    expect(peaks[0]?.[1]?.names).toEqual(['BPFI - 1x, drive-end bearing']);
  });

  it('nothing, where the speed is not known, contradicted, or the lines lie wider than 1/25 of it', () => {
    const lines = [outer, 2 * outer, 3 * outer];
    const of = (spacing: number, known: MeasuredSpeed | null) =>
      assess([envelope(spacing, ...lines)], known, [driveEnd], [driveEnd]).evidence;
    expect(of(0.5, speed())).toHaveLength(1);
    expect(of(0.5, null)).toEqual([]);
    expect(of(0.5, speed({ usableForNames: false }))).toEqual([]);
    expect(of(1.2, speed()).filter(({ grade }) => grade !== 'not separable')).toEqual([]);
  });

  it('by the speed that the spectrum shows, not by the one that was declared', () => {
    const inSpectrum = { rpm: 1492, uncertaintyRpm: 0.5, score: 100 };
    expect(observedSpeed(speed({ inSpectrum }))?.hz).toBeCloseTo(1492 / 60, 12);
    expect(observedSpeed(speed({ inSpectrum, usableForNames: false }))).toBeNull();
  });

  it('by a speed no better than it held still, and not at all in a run-up', () => {
    const moved = (lowest: number, highest: number) => speed({ rangeRpm: { lowest, highest } });
    expect(observedSpeed(moved(1490, 1510))?.uncertaintyHz).toBeCloseTo(10 / 60, 12);
    expect(observedSpeed(moved(1499.5, 1500.5))?.uncertaintyHz).toBeCloseTo(1 / 60, 12);
    expect(observedSpeed(moved(1350, 1650))).toBeNull();
    // A line of something else at 4x of the mean speed: 4x itself lies smeared over 1 Hz.
    const named = (of: MeasuredSpeed) =>
      assess([envelope(0.5, 100)], of, [driveEnd], [driveEnd]).peaks[0]?.[0]?.names;
    expect(named(speed())).toEqual(['4x']);
    expect(named(moved(1490, 1510))).toEqual([]);
  });

  it('that it cannot be told from the shaft, and what spacing would tell it', () => {
    // BPFO at 3.04 turns: 1 Hz from 3x at 25 Hz.
    const near = { ...driveEnd, geometry: null, multiples: { ftf: null, bsf: null, bpfo: 3.04, bpfi: null } };
    const sure = speed({ uncertaintyRpm: 0 });
    const { evidence, peaks } = assess([envelope(0.8, 75, 150, 225)], sure, [near], [near]);
    expect(words(evidence)).toEqual([
      'not separable: BPFO of the drive-end bearing (76 Hz) cannot be told from 3x (75 Hz) in the envelope; lines 0.5 Hz apart or closer would',
    ]);
    expect(peaks[0]?.map(({ names }) => names)).toEqual([['3x'], ['6x'], ['9x']]);
    expect(assess([envelope(0.4, 75, 150, 225)], sure, [near], [near]).evidence).toEqual([]);
  });

  // Two bearings of 3.572 and 3.58 turns: the same lines, and no way to tell whose.
  it('by both names, where two parts would make the same lines', () => {
    const maker = { geometry: null, multiples: { ftf: null, bsf: null, bpfo: 3.58, bpfi: null } };
    const far = { ...driveEnd, ...maker, id: 'nde-bearing', name: 'far bearing' };
    const heard = [driveEnd, far];
    const { evidence, peaks } = assess([envelope(0.5, outer, 2 * outer, 3 * outer)], speed(), heard, heard);
    expect(evidence).toHaveLength(1);
    expect(evidence[0]?.words).toContain('would lie there as well');
    expect([...(peaks[0]?.[1]?.names ?? [])].sort()).toEqual([
      'BPFO x2, drive-end bearing',
      'BPFO x2, far bearing',
    ]);
  });

  it('once, by the spectrum that shows it better, where the other would fit another part too', () => {
    const maker = { geometry: null, multiples: { ftf: null, bsf: null, bpfo: 3.55, bpfi: null } };
    const far = { ...driveEnd, ...maker, id: 'nde-bearing', name: 'far bearing' };
    const heard = [driveEnd, far];
    const seen = 3.572 * 25 * 0.999;
    const many = envelope(0.5, ...[1, 2, 3, 4, 5, 6, 7].map((k) => k * seen));
    const few = { ...envelope(0.5, ...[1, 2, 3].map((k) => k * 3.551 * 25)), kind: 'plain' as const };
    const { evidence, peaks } = assess([few, many], speed(), heard, heard);
    expect(evidence.map(({ partId, spectrum }) => [partId, spectrum])).toEqual([['de-bearing', 'envelope']]);
    expect(peaks[0]?.[0]?.names).toEqual([]);
  });

  // An element that is damaged passes the load zone with the cage, which makes lines at the cage's own frequency.
  it('of no cage, where an element explains its lines', () => {
    const cage = 0.3969 * 25;
    const element = 2 * 2.3221 * 25;
    const lines = [1, 2, 3, 4].flatMap((k) => [k * element, k * element - cage, k * element + cage]);
    const shocks = envelope(0.25, ...lines, cage, 2 * cage, 3 * cage, 4 * cage);
    const { evidence } = assess([shocks], speed(), [driveEnd], [driveEnd]);
    expect(evidence.map(({ fault }) => fault)).toEqual(['rolling element']);
  });
});
