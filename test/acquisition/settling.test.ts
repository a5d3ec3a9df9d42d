import { describe, expect, it } from 'vitest';
import {
  type FileObservation,
  type HeaderLook,
  headerLook,
  type Settling,
  type SettlingVerdict,
  settle,
} from '../../src/acquisition/settling.ts';

const waits = { settleMs: 5000, incompleteAfterMs: 600_000 };
const whole: HeaderLook = { complete: true, zeroTail: false, refused: null };
const short: HeaderLook = { complete: false, zeroTail: false, refused: null };

/** Observes one file as time passes; what is not said stays as it was. */
function watching() {
  let state: Settling | null = null;
  let seen: Omit<FileObservation, 'monotonicMs' | 'header'> = {
    sizeBytes: 1000,
    modifiedMs: 1,
    changedMs: 1,
    inode: '1:1',
  };
  return (atMs: number, changes: Partial<FileObservation> = {}): SettlingVerdict => {
    const { header = null, monotonicMs: _, ...rest } = changes;
    seen = { ...seen, ...rest };
    const next = settle(state, { ...seen, header, monotonicMs: atMs }, waits);
    state = next.state;
    return next.verdict;
  };
}

describe('a file in the drop folder', () => {
  it('is looked into when nothing changed for the settling time, then is ready', () => {
    const observe = watching();
    expect(observe(0)).toEqual({ verdict: 'wait', againInMs: 5000 });
    expect(observe(3000)).toEqual({ verdict: 'wait', againInMs: 2000 });
    expect(observe(5000)).toEqual({ verdict: 'look' });
    expect(observe(5001, { header: whole })).toEqual({ verdict: 'ready', zeroTail: false });
  });

  it.each<Partial<FileObservation>>([
    { sizeBytes: 1001 },
    { modifiedMs: 2 },
    { changedMs: 2 },
    { inode: '1:2' },
  ])('waits anew after %o', (change) => {
    const observe = watching();
    observe(0);
    expect(observe(4999, change)).toEqual({ verdict: 'wait', againInMs: 5000 });
    expect(observe(9998)).toEqual({ verdict: 'wait', againInMs: 1 });
    expect(observe(9999)).toEqual({ verdict: 'look' });
  });

  it('is not ready by a header that was read before it changed again', () => {
    const observe = watching();
    observe(0);
    expect(observe(5000, { header: whole, sizeBytes: 2000 }).verdict).toBe('wait');
  });

  it('is not ready by an old header even where no settling time is asked for', () => {
    const first = { sizeBytes: 1, modifiedMs: 1, changedMs: 1, inode: '1:1', monotonicMs: 0, header: null };
    const none = { settleMs: 0, incompleteAfterMs: 1000 };
    const { state } = settle(null, first, none);
    const changed = { ...first, sizeBytes: 2, monotonicMs: 1, header: whole };
    expect(settle(state, changed, none).verdict).toEqual({ verdict: 'look' });
  });

  it('waits while it is shorter than its header says, and is given up with the reason', () => {
    const observe = watching();
    observe(0);
    expect(observe(5000, { header: short })).toEqual({ verdict: 'wait', againInMs: 595_000 });
    expect(observe(599_999, { header: short }).verdict).toBe('wait');
    expect(observe(600_000, { header: short })).toEqual({
      verdict: 'give-up',
      reason: expect.stringContaining('shorter than its own header'),
    });
  });

  it('is ready when the rest comes within the wait', () => {
    const observe = watching();
    observe(0);
    observe(5000, { header: short });
    observe(300_000, { sizeBytes: 2000, modifiedMs: 2, changedMs: 2 });
    expect(observe(305_000, { header: whole }).verdict).toBe('ready');
  });

  it('waits over a tail of zeros, then is read and flagged', () => {
    const observe = watching();
    const zeros = { ...whole, zeroTail: true };
    observe(0);
    expect(observe(5000, { header: zeros }).verdict).toBe('wait');
    expect(observe(600_000, { header: zeros })).toEqual({ verdict: 'ready', zeroTail: true });
  });

  it('is given up when it still grows after the wait, and may settle when it stops just before', () => {
    const growing = watching();
    for (let at = 0; at <= 600_000; at += 1000) {
      expect(growing(at, { sizeBytes: at }).verdict).toBe('wait');
    }
    expect(growing(601_000, { sizeBytes: 1 })).toEqual({
      verdict: 'give-up',
      reason: expect.stringContaining('still growing'),
    });
    const stopped = watching();
    for (let at = 0; at < 600_000; at += 1000) stopped(at, { sizeBytes: at });
    expect(stopped(604_000, { header: whole }).verdict).toBe('ready');
  });

  it('is refused at once where its first bytes say that it is no recording', () => {
    const observe = watching();
    observe(0);
    const look = headerLook({ refused: 'foreign', reason: 'no reader knows it' }, 1000, false, false);
    expect(observe(5000, { header: look })).toEqual({ verdict: 'give-up', reason: 'no reader knows it' });
  });

  it('is not refused yet where it is empty or its first bytes are zeros: a file share may only have made room', () => {
    for (const [sizeBytes, headIsZeros] of [
      [0, true],
      [1000, true],
    ] as const) {
      const observe = watching();
      const look = headerLook({ refused: 'foreign', reason: 'nothing there' }, sizeBytes, headIsZeros, true);
      observe(0, { sizeBytes });
      expect(observe(5000, { header: look }).verdict).toBe('wait');
      expect(observe(600_000, { header: look })).toEqual({ verdict: 'give-up', reason: 'nothing there' });
    }
  });

  it('counts its waits anew when another file takes its name', () => {
    const observe = watching();
    observe(0);
    observe(599_000, { inode: '1:2' });
    expect(observe(700_000, { header: short }).verdict).toBe('wait');
  });
});
