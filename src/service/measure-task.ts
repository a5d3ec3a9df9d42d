import type { ChosenBands } from './envelope-choices.ts';
import type { MeasureTask } from './recording-task.ts';
import type { ReadyRecording } from './verdicts.ts';

/** What a worker thread is asked of a recording. */
export function measureTask(ready: ReadyRecording, chosenBandOf: ChosenBands): MeasureTask {
  const { view, archived } = ready;
  return {
    task: 'measure',
    path:
      archived === null ? `${view.site.folders.drop}/${ready.path}` : `${view.site.folders.data}/${archived}`,
    largestBytes: view.site.largestFileBytes,
    seen: ready.header.look,
    sidecar: ready.header.sidecar,
    points: ready.points.map((point) => ({
      point,
      nominalHz: view.machine(point.machineId).runningSpeedHz,
      speed: view.machine(point.machineId).speed,
      parts: view.machine(point.machineId).parts,
      chosenBand: chosenBandOf(ready, point),
    })),
  };
}
