import type { Machine, Point, RunningRule } from '../config/site.ts';
import type { Measurement } from '../manipulation/measurement.ts';

/**
 * Running, stopped or transient, decided for each machine from its own rule, and kept as plain data.
 *
 * - Every recording of a point gives a reading: running, stopped, or none (no speed, no word, no such level).
 * - The machine runs while any fresh reading says so. Fresh: less than one expected interval of its point away. It
 *   is stopped only when all fresh readings say so, and by the level rule only when two points agree: one cut cable
 *   must not stop the watch over the others.
 * - A recording whose own point reads stopped is not judged, whatever the machine does; with another point of the
 *   machine running it speaks for trouble 'reads-stopped', because a cut cable looks like a standing machine.
 * - A recording without a reading takes the machine's state by the others' fresh readings, and counts as running
 *   where there are none, without a start being seen: better one alarm too many than a blind point.
 * - Transient within `afterStartMs` after the first running recording that follows a stop. When the watch begins on a
 *   running machine its start is unknown and long past.
 * - Machines without a rule always run.
 * - Running time is cumulated from recording to recording: baselines and trends count the hours that a machine ran.
 */
export type MachineState = 'running' | 'stopped' | 'transient';

export interface MachineMemory {
  readonly state: MachineState;
  /** Used time since when it runs (transient included) or stands. */
  readonly sinceMs: number;
  /** Used time of the start that was seen; null while stopped and where no start was seen. */
  readonly runningSinceMs: number | null;
  /** Time that the machine has run since the ledger knows it, in ms of used time; ledgers before it was counted have none. */
  readonly ranMs?: number;
  /** Used time of the step that made this memory. */
  readonly usedMs?: number;
  /** Newest reading of each point, by point id. */
  readonly readings: Readonly<Record<string, PointReading>>;
}

export interface PointReading {
  readonly running: boolean;
  readonly usedMs: number;
}

export interface MachineStep {
  readonly memory: MachineMemory;
  /** For each point that took part in this step. */
  readonly points: Readonly<Record<string, PointMachineState>>;
}

export interface PointMachineState {
  /** What its recording is to be treated as. */
  readonly state: MachineState;
  /**
   * True: it reads stopped while another point of its machine runs. False: it reads running. null: it gives no
   * reading, or all stand still, and then nobody can tell a cut cable from a standing machine.
   */
  readonly readsStopped: boolean | null;
}

/**
 * What one recording says of its machine, by the machine's rule. A speed counts from the sidecar and from pulses only:
 * the nominal one is what the machine does when it runs, and shaft lines in a spectrum may be those of a neighbour. A
 * level that is known to be 'at least' so high still counts as running.
 *
 * @returns null where it says nothing
 */
export function readingOf(
  rule: RunningRule | null,
  measurement: Pick<Measurement, 'speed' | 'runningSaid' | 'levels'>,
): boolean | null {
  if (rule === null) return null;
  switch (rule.by) {
    case 'speed': {
      const { speed } = measurement;
      if (speed === null || (speed.origin !== 'sidecar' && speed.origin !== 'pulses')) return null;
      return speed.rpm > rule.aboveRpm;
    }
    case 'sidecar':
      return measurement.runningSaid;
    case 'level': {
      const level = measurement.levels.find(({ bandId }) => bandId === rule.bandId);
      if (level === undefined || !Number.isFinite(level.level)) return null;
      return level.atLeast || level.level > rule.above;
    }
  }
}

/**
 * One recording of a machine: the readings of all its points in it, at one used time. For a late recording the
 * answer's memory is to be thrown away.
 *
 * @param readings by point id, as `readingOf` gives them
 */
export function machineStep(
  machine: Machine,
  earlier: MachineMemory | null,
  readings: ReadonlyMap<string, boolean | null>,
  usedMs: number,
): MachineStep {
  const known = machine.points.flatMap((point) => {
    const now = machine.running === null ? null : (readings.get(point.id) ?? null);
    const reading = now === null ? earlier?.readings[point.id] : { running: now, usedMs };
    return reading === undefined ? [] : [{ point, reading }];
  });
  const fresh = known.filter(({ point, reading }) => isFresh(point, reading, usedMs));
  const runs = doesRun(machine.running, fresh);
  const { state, sinceMs, runningSinceMs } = moved(machine, earlier, runs, fresh.length > 0, usedMs);
  const memory: MachineMemory = {
    state,
    sinceMs,
    runningSinceMs,
    ranMs: (earlier?.ranMs ?? 0) + ranSince(machine, earlier, runs, usedMs),
    usedMs: Math.max(usedMs, earlier?.usedMs ?? usedMs),
    readings: Object.fromEntries(known.map(({ point, reading }) => [point.id, reading])),
  };
  const anyRuns = fresh.some(({ reading }) => reading.running);
  const points = [...readings].map(([id, heard]): [string, PointMachineState] => {
    const own = machine.running === null ? null : heard;
    const readsStopped = own === null || !anyRuns ? null : !own;
    return [id, { state: own === false ? 'stopped' : state, readsStopped }];
  });
  return { memory, points: Object.fromEntries(points) };
}

/**
 * Running time between two steps: it counts where the machine ran at both. Over a longer gap than two expected intervals
 * nobody knows; then one interval counts.
 */
function ranSince(machine: Machine, earlier: MachineMemory | null, runs: boolean, usedMs: number): number {
  if (!runs || earlier === null || earlier.state === 'stopped' || earlier.usedMs === undefined) return 0;
  const intervalMs = Math.min(...machine.points.map(({ recordings }) => recordings.expectedEveryMs));
  const gapMs = Math.max(0, usedMs - earlier.usedMs);
  return gapMs > 2 * intervalMs ? intervalMs : gapMs;
}

interface KnownReading {
  readonly point: Point;
  readonly reading: PointReading;
}

function isFresh(point: Point, reading: PointReading, usedMs: number): boolean {
  return Math.abs(usedMs - reading.usedMs) < point.recordings.expectedEveryMs;
}

function doesRun(rule: RunningRule | null, fresh: readonly KnownReading[]): boolean {
  if (rule === null || fresh.length === 0) return true;
  if (fresh.some(({ reading }) => reading.running)) return true;
  return rule.by === 'level' && fresh.length < 2;
}

function moved(
  machine: Machine,
  earlier: MachineMemory | null,
  runs: boolean,
  isKnown: boolean,
  usedMs: number,
): Pick<MachineMemory, 'state' | 'sinceMs' | 'runningSinceMs'> {
  const ran = earlier === null ? null : earlier.state !== 'stopped';
  const sinceMs = earlier !== null && ran === runs ? earlier.sinceMs : usedMs;
  if (!runs) return { state: 'stopped', sinceMs, runningSinceMs: null };
  const startMs = isKnown ? usedMs : null;
  const runningSinceMs = ran === false ? startMs : (earlier?.runningSinceMs ?? null);
  const isStarting = runningSinceMs !== null && usedMs - runningSinceMs < machine.afterStartMs;
  return { state: isStarting ? 'transient' : 'running', sinceMs, runningSinceMs };
}
