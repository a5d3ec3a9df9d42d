import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type QualityFlag, qualityFlags } from '../../src/acquisition/recording.ts';
import { subjectKey } from '../../src/detection/alarm.ts';
import { rank } from '../../src/detection/alarm-event.ts';
import { type DetectionInput, detect, subjectsOf } from '../../src/detection/detect.ts';
import { AlarmBook, hourMs, levelOf, limitWith, measurementWith, pointWith } from './site-parts.ts';

const once = limitWith({ onDelay: { recordings: 1 } });
const bearing = limitWith({ ...once, id: 'bearing-fixed-upper', bandId: 'bearing', alert: 10, danger: 20 });
const [overall] = pointWith().bands;
const point = pointWith({
  bands: [overall, { ...overall, id: 'bearing' }],
  limits: [once, bearing],
});

function inputWith(parts: Partial<DetectionInput> & { level?: number; flags?: readonly QualityFlag[] } = {}) {
  const { level = 1, flags = [], ...rest } = parts;
  const input: DetectionInput = {
    point,
    measurement: measurementWith({ levels: [levelOf(level)], flags }),
    machineState: 'running',
    readsStopped: null,
    usedMs: hourMs,
    late: false,
    recordingFlags: [],
    condition: '',
    situations: new Map(),
    earlier: new Map(),
    ...rest,
  };
  return input;
}

/** A book in which the overall alarm stands, acknowledged by nobody. */
function standingBook(): AlarmBook {
  const book = new AlarmBook();
  book.take(detect(inputWith({ level: 3 })));
  return book;
}

describe('one measurement of one point', () => {
  it('moves limits in the order of the site file, then troubles; each says what it was judged by', () => {
    const measurement = measurementWith({
      levels: [levelOf(12, { bandId: 'bearing' }), levelOf(3)],
      flags: ['wrong-rate', 'uneven-time'],
    });
    const changes = detect(inputWith({ measurement }));
    expect(changes.map(({ subject }) => subjectKey(subject))).toEqual([
      'limit:blower-1/de-h/overall/overall-fixed-upper',
      'limit:blower-1/de-h/bearing/bearing-fixed-upper',
      'trouble:wrong-rate:blower-1/de-h',
      'trouble:uneven-time:blower-1/de-h',
    ]);
    expect(changes[0]?.journal[0]).toMatchObject({
      event: 'raised',
      usedMs: hourMs,
      reason: { level: 3, alert: 2.8, danger: 4.5, averages: 31, flags: ['wrong-rate', 'uneven-time'] },
    });
    expect(JSON.parse(JSON.stringify(changes))).toEqual(changes);
  });

  it('asks for no state that subjectsOf does not name', () => {
    const asked = new Set<string>();
    const earlier = { get: (key: string) => void asked.add(key) } as unknown as DetectionInput['earlier'];
    detect(inputWith({ level: 3, readsStopped: true, earlier }));
    const measurement = measurementWith({ levels: [levelOf(3), levelOf(3, { bandId: 'bearing' })] });
    detect(inputWith({ measurement, readsStopped: true, earlier }));
    expect([...asked].sort()).toEqual(subjectsOf(point).map(subjectKey).sort());
  });

  it('proves a danger at once by its segments, past any on-delay', () => {
    const slow = pointWith({ limits: [limitWith({ onDelay: { recordings: 9 } })] });
    const of = (exceededBy80Percent: number, averages: number) =>
      detect(
        inputWith({
          point: slow,
          measurement: measurementWith({ levels: [levelOf(5, { exceededBy80Percent })], averages }),
        }),
      ).map(({ journal, tell }) => [journal[0]?.event, tell?.severity ?? null]);
    expect(of(4.6, 5)).toEqual([['raised', 'danger']]);
    expect(of(4.4, 31)).toEqual([['danger-unconfirmed', null]]);
    expect(of(4.6, 4)).toEqual([['danger-unconfirmed', null]]);
  });

  it.each(qualityFlags.filter((flag) => flag !== 'speed-doubtful'))(
    'flagged %s does not clear an alarm, and does not keep one from being raised',
    (flag) => {
      for (const parts of [{ flags: [flag] }, { recordingFlags: [flag] }]) {
        const book = standingBook();
        book.take(detect(inputWith({ level: 0, earlier: book.states, usedMs: 2 * hourMs, ...parts })));
        expect(book.states.get(subjectKey(subjectsOf(point)[0] as never))?.condition).toBe('alert');
        expect(detect(inputWith({ level: 3, ...parts }))[0]?.tell?.severity).toBe('alert');
      }
    },
  );

  it('flagged speed-doubtful clears an alarm of a band in Hz, but none of a band in orders', () => {
    for (const inOrders of [false, true]) {
      const bands = point.bands.map((band) => ({ ...band, inOrders }));
      const book = standingBook();
      const calm = { level: 0, earlier: book.states, usedMs: 2 * hourMs, flags: ['speed-doubtful'] as const };
      book.take(detect(inputWith({ ...calm, point: { ...point, bands } })));
      const { condition } = book.states.get(subjectKey(subjectsOf(point)[0] as never)) ?? {};
      expect(condition).toBe(inOrders ? 'alert' : 'normal');
    }
  });

  it("reads 'at least' where it is clipped: it clears nothing, even if no flag says so", () => {
    const measurement = measurementWith({ levels: [levelOf(0, { atLeast: true })] });
    expect(detect(inputWith({ measurement, earlier: standingBook().states }))).toEqual([]);
  });

  it.each(['stopped', 'transient'] as const)('of a %s machine is not held against limits', (machineState) => {
    expect(detect(inputWith({ level: 99, machineState }))).toEqual([]);
    const { states } = standingBook();
    expect(detect(inputWith({ level: 0, machineState, earlier: states }))).toEqual([]);
  });

  it('without a level neither raises nor clears', () => {
    const measurement = measurementWith({ flags: ['too-short'], waveform: null });
    expect(detect(inputWith({ measurement, earlier: standingBook().states }))).toEqual([]);
  });

  it('that comes late changes no state; over a limit that does not stand it is told', () => {
    const { states } = standingBook();
    const late = (level: number) => detect(inputWith({ level, late: true, earlier: states, usedMs: 0 }));
    expect(late(0)).toEqual([]);
    expect(late(3)).toEqual([]);
    const [change, ...more] = late(5);
    expect(more).toEqual([]);
    expect(change?.state).toBe(states.get('limit:blower-1/de-h/overall/overall-fixed-upper'));
    expect(change?.journal).toMatchObject([{ event: 'exceeded-came-late', before: 'alert', after: 'alert' }]);
    expect(change?.tell).toEqual({ severity: 'danger', event: 'exceeded-came-late', level: 5 });
  });

  it('that comes late neither raises nor clears trouble', () => {
    expect(detect(inputWith({ flags: ['wrong-rate'], late: true, readsStopped: true }))).toEqual([]);
  });

  it('gives the same answer for the same input, and no exceedance of a running machine is silent', () => {
    const recording = fc.record({
      level: fc.double({ min: 0, max: 9, noNaN: true }),
      flag: fc.constantFrom<QualityFlag | null>(null, 'dropouts', 'flat', 'unsteady'),
      late: fc.boolean(),
    });
    fc.assert(
      fc.property(fc.array(recording, { maxLength: 25 }), (recordings) => {
        const book = new AlarmBook();
        for (const [i, { level, flag, late }] of recordings.entries()) {
          const flags = flag === null ? [] : [flag];
          const input = inputWith({ level, flags, late, usedMs: i * hourMs, earlier: new Map(book.states) });
          const changes = detect(input);
          expect(detect(input)).toEqual(changes);
          book.take(changes);
          const stands = rank(
            book.states.get('limit:blower-1/de-h/overall/overall-fixed-upper')?.condition ?? null,
          );
          const told = Math.max(0, ...changes.map(({ tell }) => rank(tell?.severity ?? null)));
          const severity = level > 4.5 ? 3 : level > 2.8 ? 2 : 0;
          expect(Math.max(stands, told)).toBeGreaterThanOrEqual(severity);
        }
      }),
      { seed: 20261201, numRuns: 500 },
    );
  });
});
