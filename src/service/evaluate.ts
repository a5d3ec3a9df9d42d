import type { QualityFinding, QualityFlag } from '../acquisition/recording.ts';
import type { Point } from '../config/site.ts';
import { type AlarmChange, type AlarmState, type AlarmSubject, subjectKey } from '../detection/alarm.ts';
import { conditionOf } from '../detection/condition.ts';
import { lowSignal } from '../detection/low-signal.ts';
import { type MachineMemory, type MachineState, machineStep, readingOf } from '../detection/machine-state.ts';
import { type TroubleLook, type TroubleSubject, troubleStep } from '../detection/trouble.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { loadAlarms } from '../store/alarms.ts';
import { lastGoodRms } from '../store/good-signals.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import { loadMachine, saveMachine } from '../store/sources.ts';
import { judgeHeld } from './judge-held.ts';
import type { PointJudged } from './judge-point.ts';
import type { SiteView } from './site-view.ts';

/**
 * Detection of one recording inside its transaction: earlier states are read here, the pure blocks decide, what they
 * return is stored by the caller.
 */
export interface Evaluated extends PointJudged {
  readonly point: Point;
  readonly machineState: MachineState;
  /** Operating condition; null: outside all of them, or the machine does not run. */
  readonly condition: string | null;
  readonly runningHours: number;
}

export interface EvaluationInput {
  readonly view: SiteView;
  readonly measurements: readonly Measurement[];
  readonly usedMs: number;
  readonly late: boolean;
  /** False for repeated content and for second versions: nothing is judged, nothing learned. */
  readonly judged: boolean;
  readonly recordingFlags: readonly QualityFlag[];
}

/** How many good recordings stand behind the usual signal of a point. */
const goodRecordings = 20;

export async function evaluate(writer: Writer, input: EvaluationInput): Promise<Evaluated[]> {
  const evaluated: Evaluated[] = [];
  const machineIds = [...new Set(input.measurements.map(({ machineId }) => machineId))];
  for (const machineId of machineIds) {
    const ofMachine = input.measurements.filter((measurement) => measurement.machineId === machineId);
    evaluated.push(...(await evaluateMachine(writer, input, machineId, ofMachine)));
  }
  return evaluated;
}

async function evaluateMachine(
  writer: Writer,
  input: EvaluationInput,
  machineId: string,
  measurements: readonly Measurement[],
): Promise<Evaluated[]> {
  const { view, usedMs } = input;
  const machine = view.machine(machineId);
  const ledgerId = view.ids.machineId(machineId);
  const stored = await loadMachine(writer, ledgerId);
  const memory = stored === null ? null : (JSON.parse(stored.state) as MachineMemory);
  const readings = new Map(measurements.map((one) => [one.pointId, readingOf(machine.running, one)]));
  const step = machineStep(machine, memory, readings, usedMs);
  if (input.judged && !input.late) {
    const version = (stored?.version ?? 0) + 1;
    await saveMachine(writer, { machineId: ledgerId, state: JSON.stringify(step.memory), usedMs, version });
  }
  const evaluated: Evaluated[] = [];
  for (const measured of measurements) {
    const point = machine.points.find(({ id }) => id === measured.pointId);
    const own = step.points[measured.pointId];
    if (point === undefined || own === undefined)
      throw new Error(`measured ${measured.pointId}, which ${machineId} has not`);
    const findings = await findingsOfState(writer, view, measured, own.state);
    const measurement =
      findings.length === 0 ? measured : { ...measured, quality: [...measured.quality, ...findings] };
    const condition = own.state === 'running' ? conditionOf(machine.conditions ?? [], measured) : null;
    const judged = await judgeHeld(writer, {
      ...input,
      point,
      measurement,
      machineState: own.state,
      readsStopped: own.readsStopped,
      condition,
    });
    evaluated.push({
      ...judged,
      point,
      machineState: own.state,
      condition,
      runningHours: (step.memory.ranMs ?? 0) / 3_600_000,
    });
  }
  return evaluated;
}

async function findingsOfState(
  reader: Reader,
  view: SiteView,
  measurement: Measurement,
  state: MachineState,
): Promise<QualityFinding[]> {
  if (state === 'stopped') return [{ flag: 'not-running', detail: 'the machine stands still' }];
  if (state === 'transient')
    return [{ flag: 'transient', detail: 'the machine was started a short while ago' }];
  if (measurement.waveform === null) return [];
  const pointId = view.ids.pointId(measurement.machineId, measurement.pointId);
  const low = lowSignal(measurement.waveform.rms, await lastGoodRms(reader, pointId, goodRecordings));
  return low === null ? [] : [low];
}

/** Alarm states of the subjects, by key; what is missing is normal. */
export async function statesOf(
  reader: Reader,
  subjects: readonly AlarmSubject[],
): Promise<Map<string, AlarmState>> {
  const stored = await loadAlarms(reader, subjects.map(subjectKey));
  return new Map([...stored].map(([key, alarm]) => [key, alarm.state]));
}

/** One look at one trouble, read inside the transaction; null where it changes nothing. */
export async function lookAtTrouble(
  reader: Reader,
  subject: TroubleSubject,
  look: TroubleLook,
): Promise<AlarmChange | null> {
  const states = await statesOf(reader, [subject]);
  return troubleStep(subject, states.get(subjectKey(subject)), look);
}

export function sourceTrouble(trouble: TroubleSubject['trouble'], source: string): TroubleSubject {
  return { kind: 'trouble', trouble, machineId: null, pointId: null, source };
}
