import type { AlarmChange } from '../detection/alarm.ts';
import { pointTrouble } from '../detection/detect.ts';
import { overdueSubject } from '../detection/overdue.ts';
import type { Writer } from '../store/lent-connection.ts';
import type { Source } from '../store/sources.ts';
import { lookAtTrouble, sourceTrouble } from './evaluate.ts';
import type { RecordingTime } from './recording-time.ts';
import type { TakenFile } from './taken-file.ts';

/** Troubles that a file's coming says something about: of its source, and of each point that takes it. */
export async function troublesOf(
  writer: Writer,
  { ready, answer }: TakenFile,
  time: RecordingTime,
  source: Source,
): Promise<AlarmChange[]> {
  const usedMs = Math.round(time.usedMs);
  const measured = new Set(answer.measurements.map(({ machineId, pointId }) => `${machineId}/${pointId}`));
  const changes = [
    await lookAtTrouble(writer, sourceTrouble('unreadable', ready.source), {
      present: false,
      usedMs,
      reason: {},
    }),
    await lookAtTrouble(writer, sourceTrouble('clock', ready.source), {
      present: time.clock.offsetMs !== 0,
      usedMs,
      reason: { offsetMs: time.clock.offsetMs, statedMs: time.start.startMs, arrivedMs: ready.arrivedMs },
    }),
    await lookAtTrouble(writer, sourceTrouble('repeats-itself', ready.source), {
      present: time.repeated && source.repeatsInARow >= 1,
      usedMs,
      reason: { file: ready.path },
    }),
    ready.header.sidecar === null
      ? null
      : await lookAtTrouble(writer, sourceTrouble('late-sidecar', ready.source), {
          present: false,
          usedMs,
          reason: {},
        }),
  ];
  for (const point of ready.points) {
    const here = measured.has(`${point.machineId}/${point.id}`);
    const missing = answer.missing.find((text) => text.startsWith(`${point.machineId}/${point.id}:`));
    const reason = { file: ready.path, detail: missing ?? null };
    changes.push(
      await lookAtTrouble(writer, pointTrouble(point, 'unreadable'), { present: !here, usedMs, reason }),
      here
        ? await lookAtTrouble(writer, overdueSubject(point), {
            present: false,
            usedMs: ready.arrivedMs,
            reason: {},
          })
        : null,
    );
  }
  return changes.filter((change) => change !== null);
}
