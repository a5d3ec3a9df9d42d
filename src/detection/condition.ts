import type { OperatingCondition } from '../config/site.ts';
import type { Measurement, RunningSpeed } from '../manipulation/measurement.ts';

/** Name of the one condition of a machine whose site file lists none. */
export const anyCondition = '';

/**
 * The operating condition of a recording of a running machine: the first of the list that it fits. A condition that asks
 * for a speed is met by a measured one only, never by the nominal: what the machine usually does says nothing of
 * this recording. A load that nobody gave fits no condition that asks for one.
 *
 * @returns null: outside every condition, 'not judged' by what is compared within one
 */
export function conditionOf(
  conditions: readonly OperatingCondition[],
  {
    speed,
    loadPercent,
  }: Pick<Measurement, 'loadPercent'> & { readonly speed: Pick<RunningSpeed, 'rpm' | 'origin'> | null },
): string | null {
  if (conditions.length === 0) return anyCondition;
  const speedHz = speed === null || speed.origin === 'nominal' ? null : speed.rpm / 60;
  const found = conditions.find(
    (condition) => isWithin(condition.speedHz, speedHz) && isWithin(condition.loadPercent, loadPercent),
  );
  return found?.id ?? null;
}

function isWithin(range: OperatingCondition['speedHz'], value: number | null): boolean {
  if (range === null) return true;
  return value !== null && value >= range.from && value <= range.to;
}
