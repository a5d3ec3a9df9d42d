import { describe, expect, it } from 'vitest';
import { type Flood, floodOf, floodStep } from '../../src/advisory/flood.ts';

describe('a flood', () => {
  it('begins with more than 10 alarms in 10 minutes and ends below 5 (ANSI/ISA-18.2-2016)', () => {
    expect(floodStep(false, 10)).toBeNull();
    expect(floodStep(false, 11)).toBe('begins');
    expect(floodStep(true, 5)).toBeNull();
    expect(floodStep(true, 4)).toBe('ends');
    expect(floodStep(true, 40)).toBeNull();
  });

  it('has what came in its time and in no backlog', () => {
    const floods: Flood[] = [
      { id: 1, fromMs: 100, begunMs: 200, endedMs: 300 },
      { id: 2, fromMs: 400, begunMs: 500, endedMs: null },
    ];
    const of = (wallMs: number, fromBacklog = false) => floodOf(floods, { wallMs, fromBacklog })?.id ?? null;
    expect([99, 100, 300, 301, 400, 9999].map((ms) => of(ms))).toEqual([null, 1, 1, null, 2, 2]);
    expect(of(150, true)).toBeNull();
  });
});
