import type { QualityFlag } from '../acquisition/recording.ts';
import type { Reader } from './lent-connection.ts';
import type { MachineStateName } from './trends.ts';

/** What stands beside a level in a trend: how far it can be trusted, and how the machine ran. */
export interface TrendMarks {
  /** Of the point's measurement and of its recording as a whole, each once. */
  readonly flags: readonly QualityFlag[];
  readonly machineState: MachineStateName;
  readonly speedRpm: number | null;
  /** Measured, not the nominal one. */
  readonly speedMeasured: boolean;
  readonly condition: string | null;
  readonly loadPercent: number | null;
  readonly confidencePercent: number | null;
}

const idsAtOnce = 500;

/** By measurement id. */
export async function trendMarks(
  reader: Reader,
  measurementIds: readonly number[],
): Promise<Map<number, TrendMarks>> {
  const marks = new Map<number, TrendMarks>();
  for (let from = 0; from < measurementIds.length; from += idsAtOnce) {
    const rows = await reader
      .selectFrom('measurements')
      .innerJoin('recordings', 'recordings.id', 'measurements.recording_id')
      .select([
        'measurements.id',
        'machine_state',
        'speed_rpm',
        'speed_origin',
        'condition',
        'load_percent',
        'confidence_percent',
        'measurements.quality',
        'recordings.quality as ofRecording',
      ])
      .where('measurements.id', 'in', measurementIds.slice(from, from + idsAtOnce))
      .orderBy('measurements.id')
      .execute();
    for (const row of rows) {
      const findings = [row.quality, row.ofRecording].flatMap(
        (text) => JSON.parse(text) as { readonly flag: QualityFlag }[],
      );
      marks.set(row.id, {
        flags: [...new Set(findings.map(({ flag }) => flag))],
        machineState: row.machine_state as MachineStateName,
        speedRpm: row.speed_rpm,
        speedMeasured: row.speed_rpm !== null && row.speed_origin !== 'nominal',
        condition: row.condition,
        loadPercent: row.load_percent,
        confidencePercent: row.confidence_percent,
      });
    }
  }
  return marks;
}
