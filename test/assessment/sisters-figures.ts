import { besideSisters, type MachineDay, sisterRules } from '../../src/assessment/sisters.ts';
import { hasLeft } from '../../src/service/sister-facts.ts';
import { dayLevels, plantLogLevels } from '../prognosis/plant-levels.ts';
import { seededRandom } from '../signal/random.ts';

export const seed = 20261201;
const bands = 12;

/** What the summary names. */
export function leaves(own: readonly MachineDay[], sisters: readonly (readonly MachineDay[])[]): boolean {
  const beside = besideSisters(own, sisters);
  return beside !== null && hasLeft(beside);
}

/**
 * Share of the bands of a machine that are named after 30 days beside `sisters` others; each band of each machine
 * differs from its sisters' for good by 20 % or so (standard deviation of ln).
 *
 * @param course ln of the machine's level over days, beside its spread
 */
export function shareNamed(groups: number, sisters: number, course: (days: number) => number): number {
  let named = 0;
  for (let group = 0; group < groups; group++) {
    const random = seededRandom(seed + group);
    const machines = Array.from({ length: sisters + 1 }, (_, machine) => {
      const apart = Array.from({ length: bands }, () => 0.2 * random.gaussian());
      return plantLogLevels(seed + group * 16 + machine, {
        bands,
        days: sisterRules.windowDays,
        course: machine === 0 ? course : () => 0,
      }).map((logs, band) => daysOf(logs.map((log) => log + apart[band])));
    });
    const [own, ...others] = machines as [MachineDay[][], ...MachineDay[][][]];
    named += own.filter((days, band) =>
      leaves(
        days,
        others.map((other) => other[band] ?? []),
      ),
    ).length;
  }
  return named / (groups * bands);
}

function daysOf(logs: Float64Array): MachineDay[] {
  return dayLevels(logs).map(({ level }, day) => ({ day, level }));
}
