import type { RecordingHeader, SampleBlock, SamplesEnd, Sidecar } from '../acquisition/recording.ts';
import { appliedSignal } from '../acquisition/scaling.ts';
import type { Point } from '../config/site.ts';
import { type PulseSettings, usualSpeed } from '../config/speed-settings.ts';
import { unevenStepRatio } from '../manipulation/measure-findings.ts';
import type { SearchedDensity } from '../manipulation/measure-levels.ts';
import { runningSpeed, type SpeedAnswer } from '../manipulation/running-speed.ts';
import { type NoTurnSpeed, PulseSpeed, type TurnSpeed } from '../signal/pulse-speed.ts';
import type { PointTask } from './read-recording.ts';

/** What a recording says of the speed of one of its machines. */
export interface MachineSpeed {
  readonly answer: SpeedAnswer;
  /** The turns of its shaft, where a pulse channel gave them and nothing contradicts it. */
  readonly turning: TurnSpeed | null;
}

interface Pulses {
  /** Of the channel in the file; null where the file has none such, or it cannot be read. */
  readonly index: number | null;
  readonly reader: PulseSpeed | null;
  readonly refused: string;
}

/** A column of the file, from 0; null where it has none such. */
export function channelIndex(header: RecordingHeader, channel: number | string): number | null {
  const index = typeof channel === 'number' ? channel - 1 : header.channelNames.indexOf(channel);
  return index >= 0 && index < header.channelNames.length ? index : null;
}

export function noSuchChannel(header: RecordingHeader, channel: number | string): string {
  const names = header.channelNames.slice(0, 8).join(', ');
  return typeof channel === 'number'
    ? `the file has ${header.channelNames.length} channels, none number ${channel}`
    : `the file has no column "${channel}"; it has ${names}`;
}

/**
 * The running speeds of the machines whose points take part in a recording. Pulse channels are read in the same pass as
 * the points' own.
 */
export class RecordingSpeeds {
  readonly #sidecar: Sidecar | null;
  /** By machine: its first point stands for it. */
  readonly #tasks = new Map<string, PointTask>();
  readonly #pulses = new Map<string, Pulses>();

  constructor(header: RecordingHeader, sidecar: Sidecar | null, tasks: readonly PointTask[]) {
    this.#sidecar = sidecar;
    for (const task of tasks) {
      const { machineId } = task.point;
      if (this.#tasks.has(machineId)) continue;
      this.#tasks.set(machineId, task);
      const { pulses } = task.speed ?? usualSpeed;
      if (pulses !== null) this.#pulses.set(machineId, pulsesOf(header, sidecar, task.point, pulses));
    }
  }

  add({ channels }: SampleBlock): void {
    for (const { index, reader } of this.#pulses.values())
      if (index !== null) reader?.add(channels[index] as Float64Array);
  }

  /** When all is read. `spectra`: of the machine's points. */
  of(
    machineId: string,
    spectra: readonly (SearchedDensity | null)[],
    { timeStepDeviation }: Pick<SamplesEnd, 'timeStepDeviation'>,
  ): MachineSpeed {
    const task = this.#tasks.get(machineId);
    const pulses = this.#pulses.get(machineId);
    const isUneven = timeStepDeviation !== null && timeStepDeviation > unevenStepRatio;
    const turns = pulses === undefined ? null : isUneven ? unevenTime : turnsOf(pulses);
    const answer = runningSpeed({
      sidecarRpm: this.#sidecar?.speedRpm ?? null,
      nominalHz: task?.nominalHz ?? null,
      pulses: turns,
      spectra: spectra
        .filter((one) => one !== null)
        .map(({ density: { averages }, settings, search }) => ({ averages, settings, search })),
      findWithinPercent: (task?.speed ?? usualSpeed).findWithinPercent,
    });
    const isTurning = turns !== null && !('refused' in turns) && answer.speed?.usableForNames === true;
    return { answer, turning: isTurning ? turns : null };
  }
}

const unevenTime: NoTurnSpeed = { refused: 'the time steps are uneven' };

function turnsOf({ reader, refused }: Pulses): TurnSpeed | NoTurnSpeed {
  return reader === null ? { refused } : reader.finish();
}

function pulsesOf(
  header: RecordingHeader,
  sidecar: Sidecar | null,
  point: Point,
  { channel, pulsesPerTurn, thresholdV }: PulseSettings,
): Pulses {
  const none = (refused: string): Pulses => ({ index: null, reader: null, refused });
  const index = channelIndex(header, channel);
  if (index === null) return none(noSuchChannel(header, channel));
  const sampleRateHz = header.sampleRateHz ?? point.recordings.sampleRateHz;
  if (sampleRateHz === null) return none('the sample rate is not known');
  const volts = voltsPerSample(header, sidecar, point, index);
  if (thresholdV !== null && volts === null)
    return none(
      'pulse_threshold is in V, and nothing says what a sample is in V; give full_scale in V, or leave it out',
    );
  const threshold = thresholdV === null || volts === null ? null : thresholdV / volts;
  return { index, reader: new PulseSpeed({ sampleRateHz, pulsesPerTurn, threshold }), refused: '' };
}

/** By the settings of the machine's recordings; a column of numbers whose unit is another's is taken to be in V. */
function voltsPerSample(
  { channelNames, samples }: RecordingHeader,
  sidecar: Sidecar | null,
  point: Point,
  index: number,
): number | null {
  const said = sidecar?.channels[channelNames[index] as string] ?? sidecar?.channels[String(index + 1)];
  const { samplesIn, fullScale } = appliedSignal(point.signal, said);
  if (samples === 'number') return samplesIn.quantity === 'voltage' ? samplesIn.inSi : 1;
  return samplesIn.quantity === 'voltage' && fullScale !== null ? fullScale * samplesIn.inSi : null;
}
