import { describe, expect, it } from 'vitest';
import { Kept } from '../../src/signal/kept.ts';

describe('what is remembered', () => {
  it('is made once, whatever it is', () => {
    const kept = new Kept<string, number | null>(2);
    let made = 0;
    const make = () => {
      made++;
      return null;
    };
    expect([kept.get('a', make), kept.get('a', make), made]).toEqual([null, null, 1]);
  });

  it('is bounded: what was asked for longest ago is made again', () => {
    const kept = new Kept<string, string>(2);
    const made: string[] = [];
    for (const key of ['a', 'b', 'a', 'c', 'a', 'b', 'c']) {
      kept.get(key, () => {
        made.push(key);
        return key;
      });
    }
    expect(made.join('')).toBe('abcbc');
  });
});
