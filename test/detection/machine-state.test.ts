import { describe, expect, it } from 'vitest';
import type { Machine } from '../../src/config/site.ts';
import {
  type MachineMemory,
  type MachineStep,
  machineStep,
  readingOf,
} from '../../src/detection/machine-state.ts';
import type { SpeedOrigin } from '../../src/manipulation/measurement.ts';
import { hourMs, levelOf, machineWith, measurementWith, minuteMs } from './site-parts.ts';

const bySpeed = machineWith({ running: { by: 'speed', aboveRpm: 300 } });
const byLevel = machineWith({ running: { by: 'level', bandId: 'overall', above: 0.5 } });

type Heard = Readonly<Record<string, boolean | null>>;

/** Plays readings at the given hours; answers the last step. */
function played(
  machine: Machine,
  heard: readonly (readonly [hours: number, readings: Heard])[],
): MachineStep {
  let memory: MachineMemory | null = null;
  let last: MachineStep | null = null;
  for (const [hours, readings] of heard) {
    last = machineStep(machine, memory, new Map(Object.entries(readings)), hours * hourMs);
    memory = last.memory;
  }
  if (last === null) throw new Error('nothing was heard');
  return last;
}

describe('what a recording says of its machine', () => {
  const speed = (rpm: number, origin: SpeedOrigin) =>
    measurementWith({
      speed: {
        rpm,
        origin,
        uncertaintyRpm: 1,
        usableForNames: true,
        rangeRpm: null,
        inSpectrum: null,
      },
    });

  it('by speed: over the threshold it runs; a nominal speed or shaft lines say nothing', () => {
    expect(readingOf(bySpeed.running, speed(301, 'sidecar'))).toBe(true);
    expect(readingOf(bySpeed.running, speed(300, 'sidecar'))).toBe(false);
    expect(readingOf(bySpeed.running, speed(301, 'pulses'))).toBe(true);
    expect(readingOf(bySpeed.running, speed(290, 'pulses'))).toBe(false);
    expect(readingOf(bySpeed.running, speed(2970, 'nominal'))).toBeNull();
    expect(readingOf(bySpeed.running, speed(2970, 'spectrum'))).toBeNull();
    expect(readingOf(bySpeed.running, measurementWith())).toBeNull();
  });

  it("by the sidecar's word, where there is one", () => {
    for (const said of [true, false, null]) {
      expect(readingOf({ by: 'sidecar' }, measurementWith({ runningSaid: said }))).toBe(said);
    }
  });

  it('by a level of the named band; clipped is running, missing is nothing', () => {
    const of = (levels: ReturnType<typeof levelOf>[]) =>
      readingOf(byLevel.running, measurementWith({ levels }));
    expect(of([levelOf(0.6)])).toBe(true);
    expect(of([levelOf(0.5)])).toBe(false);
    expect(of([levelOf(0.1, { atLeast: true })])).toBe(true);
    expect(of([levelOf(0.1, { bandId: 'bearing' })])).toBeNull();
    expect(of([levelOf(Number.NaN)])).toBeNull();
  });

  it('without a rule it says nothing, and the machine always runs', () => {
    expect(readingOf(null, speed(0, 'sidecar'))).toBeNull();
    const step = played(machineWith(), [
      [0, { 'de-h': false, 'nde-h': false }],
      [1, { 'de-h': false, 'nde-h': false }],
    ]);
    expect(step.memory).toMatchObject({ state: 'running', sinceMs: 0, runningSinceMs: null });
    expect(step.points['de-h']).toEqual({ state: 'running', readsStopped: null });
  });
});

describe('running, stopped, transient', () => {
  it('one word stops a machine judged by speed, two points must agree where it is judged by level', () => {
    expect(played(bySpeed, [[0, { 'de-h': false }]]).memory.state).toBe('stopped');
    expect(played(byLevel, [[0, { 'de-h': false }]]).memory.state).toBe('running');
    expect(played(byLevel, [[0, { 'de-h': false, 'nde-h': false }]]).memory.state).toBe('stopped');
    expect(
      played(byLevel, [
        [0, { 'de-h': false }],
        [0.5, { 'nde-h': false }],
      ]).memory.state,
    ).toBe('stopped');
  });

  it('a reading one expected interval old agrees with nobody and contradicts nobody', () => {
    const seen = [
      [0, { 'de-h': true }],
      [1, { 'nde-h': false }],
    ] as const;
    expect(played(bySpeed, seen).memory.state).toBe('stopped');
    expect(played(bySpeed, [seen[0], [0.9, { 'nde-h': false }]]).memory.state).toBe('running');
    expect(
      played(byLevel, [
        [0, { 'de-h': false }],
        [1, { 'nde-h': false }],
      ]).memory.state,
    ).toBe('running');
  });

  it('a recording whose own point reads stopped is never judged, whatever the machine does', () => {
    const step = played(byLevel, [[0, { 'de-h': false, 'nde-h': true }]]);
    expect(step.memory.state).toBe('running');
    expect(step.points).toEqual({
      'de-h': { state: 'stopped', readsStopped: true },
      'nde-h': { state: 'running', readsStopped: false },
    });
  });

  it('when all stand still nobody can tell a cut cable: neither trouble nor its return', () => {
    const step = played(byLevel, [[0, { 'de-h': false, 'nde-h': false }]]);
    expect(step.points['de-h']).toEqual({ state: 'stopped', readsStopped: null });
  });

  it('a recording without a word follows the fresh words of the others, and runs where there are none', () => {
    const others = played(bySpeed, [
      [0, { 'de-h': false }],
      [0.5, { 'nde-h': null }],
    ]);
    expect(others.points['nde-h']).toEqual({ state: 'stopped', readsStopped: null });
    const alone = played(bySpeed, [
      [0, { 'de-h': false }],
      [48, { 'nde-h': null }],
    ]);
    expect(alone.points['nde-h']?.state).toBe('running');
    expect(alone.memory.runningSinceMs).toBeNull();
  });

  it('is transient for after_start from the first running recording after a stop, not when the watch begins', () => {
    const machine = { ...bySpeed, afterStartMs: 10 * minuteMs };
    const stop = [0, { 'de-h': false }] as const;
    const at = (minutes: number) => [1 + minutes / 60, { 'de-h': true }] as const;
    expect(played(machine, [at(0)]).memory.state).toBe('running');
    expect(played(machine, [stop, at(0)]).points['de-h']?.state).toBe('transient');
    expect(played(machine, [stop, at(0), at(9)]).points['de-h']?.state).toBe('transient');
    const settled = played(machine, [stop, at(0), at(9), at(10)]);
    expect(settled.points['de-h']?.state).toBe('running');
    expect(settled.memory).toMatchObject({ sinceMs: hourMs, runningSinceMs: hourMs });
    expect(played({ ...machine, afterStartMs: 0 }, [stop, at(0)]).memory.state).toBe('running');
  });

  it('keeps plain data that survives the ledger, and forgets points that left the site file', () => {
    const { memory } = played(byLevel, [[0, { 'de-h': false, 'nde-h': false }]]);
    const back: MachineMemory = JSON.parse(JSON.stringify(memory));
    expect(back).toEqual(memory);
    const smaller = { ...byLevel, points: byLevel.points.slice(0, 1) };
    const next = machineStep(smaller, back, new Map([['de-h', false]]), hourMs / 2);
    expect(Object.keys(next.memory.readings)).toEqual(['de-h']);
  });
});

describe('the hours that a machine ran', () => {
  const ran = (heard: readonly (readonly [number, boolean | null])[]) =>
    (played(
      bySpeed,
      heard.map(([hours, running]) => [hours, { 'de-h': running }] as const),
    ).memory.ranMs ?? 0) / hourMs;

  it('are counted from recording to recording while it runs', () => {
    expect(ran([[0, true]])).toBe(0);
    expect(
      ran([
        [0, true],
        [1, true],
        [2, true],
        [3, false],
        [9, false],
        [10, true],
        [11, true],
      ]),
    ).toBe(3);
  });

  it('are one interval where nothing came for longer than two', () => {
    expect(
      ran([
        [0, true],
        [2, true],
      ]),
    ).toBe(2);
    expect(
      ran([
        [0, true],
        [100, true],
        [101, true],
      ]),
    ).toBe(2);
  });
});
