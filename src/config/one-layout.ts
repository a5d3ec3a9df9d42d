import type { BuiltMachine } from './build-machines.ts';
import type { BuiltPoint } from './build-point.ts';
import { expandPattern } from './file-pattern.ts';
import type { Build } from './layers.ts';
import { nothingSaid, type SampleLayout, sameLayout } from './sample-layout.ts';
import { type Point, pointPath } from './site.ts';

/** Points that take the same files but say otherwise where the samples stand in them: a file is read in one way. */
export function tellOtherLayouts({ reading }: Build, machines: readonly BuiltMachine[]): void {
  const first = new Map<string, BuiltPoint>();
  for (const built of machines.flatMap(({ points }) => points)) {
    const key = filesOf(built.point);
    const earlier = first.get(key);
    if (earlier === undefined) first.set(key, built);
    else if (!sameLayout(layoutOf(earlier.point), layoutOf(built.point))) {
      const what = `${pointPath(built.point)} and ${pointPath(earlier.point)} take the same files, but say otherwise where the samples stand in them`;
      const right =
        'give both the same dataset, sample_rate_attribute and channels_in; of a group, channel: NAME chooses the data set';
      reading.problem(built.idAt, what, right, 'layout');
    }
  }
}

function layoutOf({ recordings }: Point): SampleLayout {
  return recordings.layout ?? nothingSaid;
}

function filesOf({ machineId, id, recordings }: Point): string {
  const { files, filesRegex } = recordings;
  return files === null ? `regex ${filesRegex}` : JSON.stringify(expandPattern(files, machineId, id));
}
