import { describe, expect, it } from 'vitest';
import { subjectKey } from '../../src/detection/alarm.ts';
import { dropFolderSubject, type OverdueLook, overdue } from '../../src/detection/overdue.ts';
import { AlarmBook, hourMs, pointWith } from './site-parts.ts';

const points = [pointWith(), pointWith({ id: 'nde-h' })];
const both = (ms: number) => new Map(points.map((point) => [`blower-1/${point.id}`, ms]));
/** Two hours and the settling time of 5 s. */
const allowedMs = 2 * hourMs + 5000;

const look = (parts: Partial<OverdueLook>): OverdueLook => ({
  points,
  lastArrivedMs: new Map(),
  nowMs: 100 * hourMs,
  startedMs: 0,
  waitingFor: new Set(),
  dropFolderReadable: true,
  earlier: new Map(),
  ...parts,
});
const named = (parts: Partial<OverdueLook>) =>
  overdue(look(parts)).map(({ subject, journal }) => [subjectKey(subject), journal[0]?.event]);

describe('a point that should have sent by now', () => {
  it('is overdue when more than overdue_after and settle have passed since its last arrival', () => {
    expect(named({ lastArrivedMs: both(100 * hourMs - allowedMs) })).toEqual([]);
    expect(named({ lastArrivedMs: both(100 * hourMs - allowedMs - 1) })).toEqual([
      ['trouble:overdue:blower-1/de-h', 'raised'],
      ['trouble:overdue:blower-1/nde-h', 'raised'],
    ]);
  });

  it('is judged only when nothing waits for it, and from one interval after the start on', () => {
    const lastArrivedMs = both(0);
    expect(named({ lastArrivedMs, waitingFor: new Set(['blower-1/de-h']) })).toEqual([
      ['trouble:overdue:blower-1/nde-h', 'raised'],
    ]);
    expect(named({ lastArrivedMs, waitingFor: null })).toEqual([]);
    expect(named({ lastArrivedMs, startedMs: 99 * hourMs + 1 })).toEqual([]);
    expect(named({ lastArrivedMs, startedMs: 99 * hourMs })).toHaveLength(2);
  });

  it('that never sent is waited for from the start of the service', () => {
    expect(named({ startedMs: 100 * hourMs - allowedMs })).toEqual([]);
    expect(named({ startedMs: 100 * hourMs - allowedMs - 1 })).toHaveLength(2);
  });

  it('returns when something arrives, also while files wait and right after a start', () => {
    const book = new AlarmBook();
    book.take(overdue(look({ lastArrivedMs: both(0) })));
    const later = {
      nowMs: 101 * hourMs,
      startedMs: 101 * hourMs,
      waitingFor: null,
      lastArrivedMs: new Map([['blower-1/de-h', 101 * hourMs]]),
      earlier: book.states,
    };
    expect(named(later)).toEqual([['trouble:overdue:blower-1/de-h', 'returned']]);
  });

  it('does not return by a restart of the service alone', () => {
    const book = new AlarmBook();
    book.take(overdue(look({})));
    expect(named({ startedMs: 100 * hourMs, earlier: book.states })).toEqual([]);
  });

  it('is not news a second time', () => {
    const book = new AlarmBook();
    book.take(overdue(look({ lastArrivedMs: both(0) })));
    expect(named({ nowMs: 101 * hourMs, lastArrivedMs: both(0), earlier: book.states })).toEqual([]);
  });
});

describe('a drop folder that cannot be read', () => {
  it('is one trouble of the site instead of one for each point', () => {
    const book = new AlarmBook();
    const dark = { lastArrivedMs: both(0), dropFolderReadable: false };
    expect(book.take(overdue(look(dark)))).toMatchObject([
      { subject: dropFolderSubject, tell: { severity: 'trouble' } },
    ]);
    expect(named({ ...dark, earlier: book.states })).toEqual([]);
    expect(named({ lastArrivedMs: both(100 * hourMs), earlier: book.states })).toEqual([
      ['trouble:drop-folder:site', 'returned'],
    ]);
  });
});
