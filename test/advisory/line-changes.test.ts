import { describe, expect, it } from 'vitest';
import { compareLines, lineCourse } from '../../src/advisory/line-changes.ts';
import type { SpectralPeak } from '../../src/manipulation/measurement.ts';

const peak = (frequencyHz: number, level: number, order: number | null = null): SpectralPeak => ({
  frequencyHz,
  level,
  order,
  names: [],
  aboveFloorDb: 20,
  kind: 'tone',
});
const at = (...peaks: SpectralPeak[]) => ({ peaks, lineSpacingHz: 1 });

describe('lines now against a week ago', () => {
  it('are paired within a line, the nearest first, each used once', () => {
    const lines = compareLines(at(peak(100, 2), peak(101, 1)), at(peak(100.9, 0.9)));
    expect(lines.map(({ frequencyHz, levelBefore }) => [frequencyHz, levelBefore])).toEqual([
      [100, null],
      [101, 0.9],
    ]);
  });

  it('follow the running speed: the same order is the same line', () => {
    const lines = compareLines(at(peak(150, 2, 3.0)), at(peak(141, 1, 3.001)));
    expect(lines).toHaveLength(1);
    expect(lines[0]?.levelBefore).toBe(1);
  });

  it('are told as gone when they no longer stand out, strongest first, no more than asked for', () => {
    const lines = compareLines(at(peak(50, 1)), at(peak(80, 3), peak(90, 0.1)), 2);
    expect(lines.map(({ frequencyHz }) => frequencyHz)).toEqual([80, 50]);
    expect(lines.map(lineCourse)).toEqual(['gone', 'new']);
  });

  it('rose or fell only beyond 3 dB', () => {
    const course = (level: number) =>
      lineCourse({ frequencyHz: 50, order: null, names: [], level, levelBefore: 1 });
    expect([course(1.42), course(1.41), course(0.71), course(0.7)]).toEqual(['rose', 'same', 'same', 'fell']);
  });
});
