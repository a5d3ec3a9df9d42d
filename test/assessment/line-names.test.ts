import { describe, expect, it } from 'vitest';
import { LineNames } from '../../src/assessment/line-names.ts';
import type { Part } from '../../src/config/parts.ts';
import { bearing, gearPair, motor, wheel } from './parts.ts';

const named = (part: Part, name: string): Part => ({ ...part, id: name, name });
const impeller = named(wheel('vanes', 7), 'impeller');
const drive = named(motor(50, 2), 'motor');
const at = (parts: readonly Part[], hz: number, lineSpacingHz: number, uncertaintyHz = 0.01) =>
  new LineNames(parts, { hz, uncertaintyHz }, lineSpacingHz);

describe('names of lines', () => {
  it('harmonics of the shaft, and what is locked to it: seven vanes pass at 7x, and both are said', () => {
    const names = at([impeller], 24.67, 0.4);
    expect(names.namesOf(24.7)).toEqual(['1x']);
    expect(names.namesOf(7 * 24.67)).toEqual(['7x', 'vane pass, impeller']);
    expect(names.namesOf(14 * 24.67)).toEqual(['14x', 'vane pass x2, impeller']);
    expect(names.namesOf(61)).toEqual([]);
  });

  it('a two-pole motor at 2960 r/min: 2x at 98.67 Hz and twice line at 100 Hz are named only where lines tell them', () => {
    // 1.333 Hz apart: half of it tells them.
    const fine = at([drive], 2960 / 60, 0.33);
    expect(fine.namesOf(98.67)).toEqual(['2x']);
    expect(fine.namesOf(100.02)).toContain('twice line, motor');
    const coarse = at([drive], 2960 / 60, 1.6);
    expect(coarse.namesOf(98.67)).toEqual([]);
    expect(coarse.namesOf(100.02)).toEqual([]);
  });

  it('no higher than the speed is known: 0.5 % of 25 Hz is a line of 1.6 Hz at the 12th harmonic', () => {
    const names = at([], 25, 1.6, 0.125);
    expect(names.namesOf(300)).toEqual(['12x']);
    expect(names.namesOf(325)).toEqual([]);
  });

  it('without a speed only what the supply fixes', () => {
    const names = new LineNames([drive, impeller], null, 0.5);
    expect(names.namesOf(100)).toEqual(['twice line, motor']);
    expect(names.namesOf(172.7)).toEqual([]);
  });

  it('a mesh, its sidebands at the mating shaft, and that shaft', () => {
    const names = at([named(gearPair(23, 67), 'gearbox')], 29.5, 0.5);
    expect(names.namesOf(678.5)).toContain('gear mesh, gearbox');
    expect(names.namesOf(678.5 - 10.127)).toEqual(['gear mesh - mating shaft 1x, gearbox']);
    expect(names.namesOf(10.13)).toEqual(['mating shaft 1x, gearbox']);
  });

  it('never of what slips: a bearing is named by its family alone', () => {
    const names = at([bearing([9, 7.9375, 38.5])], 25, 0.5);
    expect(names.namesOf(3.57224 * 25)).toEqual([]);
  });
});
