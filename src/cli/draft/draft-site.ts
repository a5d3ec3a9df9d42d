import { counted } from '../../advisory/level-words.ts';
import { lookAtFolder, lookAtSeries, sidecarsOf } from './look.ts';
import { type NameSeries, nameSeries } from './name-series.ts';
import { channelsLeftOut, planSite, type ReadSeries } from './plan.ts';
import { type DraftFrame, writeSite } from './write-site.ts';

export interface Drafted {
  readonly text: string;
  readonly machines: number;
  readonly points: number;
  /** Recordings that the patterns take. */
  readonly files: number;
  readonly leftOut: readonly string[];
}

/** Series that are drafted, those with most files first. */
const mostSeries = 1000;
const mostLeftOut = 8;

/** The text of a first site file for the recordings in a folder; in words why there can be none. */
export async function draftSite(
  folder: string,
  frame: Pick<DraftFrame, 'siteName' | 'timeZone' | 'drop' | 'data'> & { readonly dataPath: string },
): Promise<Drafted | { readonly reason: string }> {
  const look = await lookAtFolder(folder, [frame.dataPath]);
  if ('reason' in look) return look;
  if (look.recordings.length === 0)
    return { reason: `${folder} holds no files to draft from; let the logger record first` };
  const all = nameSeries(look.recordings).sort((a, b) => b.files.length - a.files.length);
  const read: ReadSeries[] = [];
  const leftOut: string[] = [];
  const others: string[] = [];
  const leave = (series: NameSeries, why: string) => {
    others.push(...series.files.map(({ path }) => path));
    leftOut.push(`${namesOf(series)}: ${why}`);
  };
  for (const series of all) {
    const found =
      read.length < mostSeries ? await lookAtSeries(folder, series) : { reason: 'too many kinds of names' };
    if ('reason' in found) leave(series, found.reason);
    else read.push({ series, look: found, sidecars: sidecarsOf(series, look.sidecars) });
  }
  read.sort((a, b) => compare(a.series.files[0]?.path ?? '', b.series.files[0]?.path ?? ''));
  const site = planSite(read, others, frame.timeZone);
  for (const { series } of site.noRoom) leave(series, 'its machine has too many points');
  if (site.machines.length === 0) return { reason: `no recording in ${folder} can be read; ${leftOut[0]}` };
  const told = [
    ...shortened(leftOut),
    ...channelsLeftOut(read),
    ...(look.leftAlone.length === 0
      ? []
      : [`${look.leftAlone[0]}${more(look.leftAlone.length - 1)}: no plain file`]),
    ...(look.cut
      ? [`the folder holds more files than the ${look.recordings.length} that were looked at`]
      : []),
  ];
  const points = site.machines.flatMap((machine) => machine.points);
  const files = new Set(points.flatMap((point) => point.files)).size;
  const text = writeSite(site, { ...frame, files, leftOut: told });
  return { text, machines: site.machines.length, points: points.length, files, leftOut: told };
}

function namesOf({ files }: NameSeries): string {
  return `${files[0]?.path}${more(files.length - 1)}`;
}

function more(count: number): string {
  return count <= 0 ? '' : ` and ${counted(count, 'other')}`;
}

function shortened(leftOut: readonly string[]): readonly string[] {
  if (leftOut.length <= mostLeftOut) return leftOut;
  return [...leftOut.slice(0, mostLeftOut), `and ${leftOut.length - mostLeftOut} more kinds of names`];
}

/** Numbers in names by their value, so that blower-2 stands before blower-10. */
function compare(a: string, b: string): number {
  return a.localeCompare(b, 'en', { numeric: true });
}
