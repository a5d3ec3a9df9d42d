import { basename } from 'node:path';
import { readHead } from '../../acquisition/byte-source.ts';
import { nameOf, sidecarNameOf } from '../../acquisition/file-name.ts';
import { readerFor } from '../../acquisition/readers.ts';
import { isRefusal, type RecordingHeader } from '../../acquisition/recording.ts';
import { sweepFolder } from '../../acquisition/sweep.ts';
import { nothingSaid } from '../../config/sample-layout.ts';
import { openRegularFile } from '../../service/file-source.ts';
import type { NamedFile } from './name-parts.ts';
import type { NameSeries } from './name-series.ts';

/** What draft looks at, and how much of it at most. */
const mostFiles = 5000;
const deepest = 8;
const headersASeries = 3;
/** A file without a stated length is read through up to this size; a longer one tells no duration. */
const largestReadThrough = 100_000_000;
const largestFile = 4e9;

export interface FolderLook {
  readonly recordings: readonly NamedFile[];
  readonly sidecars: ReadonlySet<string>;
  /** There was more than is looked at. */
  readonly cut: boolean;
  /** Links, pipes, unusable names: how many, and the first. */
  readonly leftAlone: readonly string[];
}

/** The names in the folder; in words where it cannot be read. Nothing is opened. */
export async function lookAtFolder(
  folder: string,
  except: readonly string[],
): Promise<FolderLook | { readonly reason: string }> {
  const sweep = await sweepFolder(folder, except, { mostFiles, deepest });
  if (sweep.state !== 'read') return { reason: sweep.reason.replace('drop folder', 'folder') };
  const named = sweep.files.filter((file) => file.nameProblem === null);
  const unusable = sweep.files.filter((file) => file.nameProblem !== null).map(({ path }) => path);
  const isSidecar = ({ path }: NamedFile) => /\.json$/i.test(path);
  return {
    recordings: named.filter((file) => !isSidecar(file) && !/\.(tmp|part|ya?ml)$/i.test(file.path)),
    sidecars: new Set(named.filter(isSidecar).map(({ path }) => path)),
    cut: sweep.cut,
    leftAlone: [...sweep.leftAlone.map(({ path }) => path), ...unusable],
  };
}

/** What the headers of a few recordings of a series say. */
export interface SeriesLook {
  readonly header: RecordingHeader;
  readonly sampleRateHz: number | null;
  /** Shortest of those looked at. */
  readonly durationS: number | null;
  readonly ratesDiffer: boolean;
  readonly durationsDiffer: boolean;
  readonly lookedAt: number;
}

/** Newest, oldest and middle recording of a series; or why none of them can be read. */
export async function lookAtSeries(
  folder: string,
  series: NameSeries,
): Promise<SeriesLook | { readonly reason: string }> {
  const order = series.files.toSorted((a, b) => b.mtimeMs - a.mtimeMs);
  const picked = new Set([0, order.length - 1, order.length >> 1].slice(0, headersASeries));
  const looks: Look[] = [];
  let reason = 'no file of it can be read';
  for (const index of picked) {
    const look = await lookAtFile(`${folder}/${order[index]?.path}`);
    if ('reason' in look) reason = look.reason;
    else looks.push(look);
  }
  const whole = looks.filter(({ header }) => header.complete && header.channelNames.length > 0);
  const [first] = whole.length > 0 ? whole : looks.filter(({ header }) => header.channelNames.length > 0);
  if (first === undefined) return { reason: looks.length === 0 ? reason : 'its files are not complete yet' };
  const rates = new Set(
    whole.flatMap(({ sampleRateHz }) => (sampleRateHz === null ? [] : [figures(sampleRateHz)])),
  );
  const durations = whole.flatMap(({ durationS }) => (durationS === null ? [] : [durationS]));
  const shortest = durations.length === 0 ? first.durationS : Math.min(...durations);
  return {
    header: first.header,
    sampleRateHz: first.sampleRateHz,
    durationS: shortest,
    ratesDiffer: rates.size > 1,
    durationsDiffer: shortest !== null && durations.some((one) => one > 1.01 * shortest),
    lookedAt: looks.length,
  };
}

interface Look {
  readonly header: RecordingHeader;
  readonly sampleRateHz: number | null;
  readonly durationS: number | null;
}

async function lookAtFile(path: string): Promise<Look | { readonly reason: string }> {
  const file = openRegularFile(path, largestFile);
  if ('reason' in file) return file;
  try {
    const reader = readerFor(readHead(file.source), basename(path));
    if (isRefusal(reader)) return { reason: reader.reason };
    await reader.prepare?.();
    const header = reader.header(file.source, nothingSaid);
    if (isRefusal(header)) return { reason: header.reason };
    const { framesClaimed, sampleRateHz } = header;
    if (framesClaimed !== null && sampleRateHz !== null)
      return { header, sampleRateHz, durationS: framesClaimed / sampleRateHz };
    if (file.source.size > largestReadThrough) return { header, sampleRateHz, durationS: null };
    const blocks = reader.samples(file.source, header, nothingSaid);
    let next = blocks.next();
    while (next.done !== true) next = blocks.next();
    if (isRefusal(next.value)) return { reason: next.value.reason };
    const measured = next.value.measuredRateHz ?? sampleRateHz;
    const rateHz = measured === null ? null : figures(measured);
    return { header, sampleRateHz: rateHz, durationS: rateHz === null ? null : next.value.frames / rateHz };
  } finally {
    file.close();
  }
}

/** A rate measured from times is good to a few parts in ten thousand, not to its last digit. */
function figures(rateHz: number): number {
  return Number(rateHz.toPrecision(4));
}

/** Whether sidecars stand beside all, some or none of these recordings. */
export function sidecarsOf(series: NameSeries, sidecars: ReadonlySet<string>): 'all' | 'some' | 'none' {
  const with_ = series.files.filter(({ path }) => {
    const name = nameOf(path);
    return sidecars.has(path.slice(0, path.length - name.length) + sidecarNameOf(name));
  }).length;
  return with_ === 0 ? 'none' : with_ === series.files.length ? 'all' : 'some';
}
