import type { SampleLayout } from '../config/sample-layout.ts';
import { type ArrayShape, arrayShape, mostChannels } from './array-shape.ts';
import { distinctNames, nameAndUnit } from './csv-heading.ts';
import type { Hdf5Dataset, Hdf5File } from './hdf5-file.ts';
import { isRefusal, type Refusal } from './recording.ts';
import { samplesOf } from './sample-numbers.ts';

/** What is read of a file: one array, or data sets of one dimension side by side. */
export interface Hdf5Channels {
  readonly datasets: readonly Hdf5Dataset[];
  readonly shape: ArrayShape;
  readonly names: readonly string[];
  readonly units: readonly (string | null)[];
  readonly samples: 'integer' | 'number';
  readonly sampleRateHz: number | null;
  readonly remarks: readonly string[];
}

/** Objects of a file that are looked through for its data sets. */
const mostObjects = 10_000;
const mostShown = 6;

/** What the site file names, or the only data set of numbers that the file has. */
export function hdf5Channels(file: Hdf5File, layout: SampleLayout): Hdf5Channels | Refusal {
  const path = layout.dataset ?? onlyDataset(file);
  if (typeof path !== 'string') return path;
  const kind = kindOf(file, path);
  if (kind === 'other') return unsupported(`no ${printable(path)} in it, but ${shown(arraysOf(file))}`);
  return kind === 'dataset' ? ofArray(file, path, layout) : ofGroup(file, path, layout);
}

/** Asked from the root on, for below a data set the library takes a path for damage. */
function kindOf(file: Hdf5File, path: string): ReturnType<Hdf5File['kind']> {
  for (let end = path.indexOf('/', 1); end > 0; end = path.indexOf('/', end + 1))
    if (file.kind(path.slice(0, end)) !== 'group') return 'other';
  return file.kind(path);
}

function unsupported(reason: string): Refusal {
  return { refused: 'unsupported', reason };
}

function shown(paths: readonly string[]): string {
  if (paths.length === 0) return 'no data set of numbers';
  const first = paths.slice(0, mostShown).map(printable).join(', ');
  return paths.length > mostShown ? `${first} and ${paths.length - mostShown} more` : first;
}

/** A name in the file, as people may be shown it. */
export function printable(text: string): string {
  return text.replace(/[^ -~\u00a0-\u00ff]/g, '?').slice(0, 80);
}

function arraysOf(file: Hdf5File): string[] {
  return file
    .names('/', true)
    .slice(0, mostObjects)
    .map((name) => `/${name}`)
    .filter((path) => {
      if (file.kind(path) !== 'dataset') return false;
      const dataset = file.dataset(path);
      return typeof dataset !== 'string' && dataset.sides.length >= 1 && dataset.sides.length <= 2;
    });
}

function onlyDataset(file: Hdf5File): string | Refusal {
  const paths = arraysOf(file);
  const [first] = paths;
  if (paths.length === 1 && first !== undefined) return first;
  if (first === undefined) return unsupported('no data set of numbers in it');
  return unsupported(
    `${paths.length} data sets in it (${shown(paths)}); say which: dataset: ${printable(first)}, or the group whose data sets are the channels`,
  );
}

function ofArray(file: Hdf5File, path: string, layout: SampleLayout): Hdf5Channels | Refusal {
  const dataset = file.dataset(path);
  if (typeof dataset === 'string') return unsupported(`${printable(path)}: ${dataset}`);
  const shape = arrayShape(dataset.sides, layout.channelsIn, printable(path));
  if (isRefusal(shape)) return shape;
  const rate = rateOf(file, [path], layout);
  const unit = unitOf(file, path);
  return {
    datasets: [dataset],
    shape,
    names: Array.from({ length: shape.channels }, (_, index) => String(index + 1)),
    units: Array.from({ length: shape.channels }, () => unit),
    samples: samplesOf(dataset.number),
    ...rate,
  };
}

function ofGroup(file: Hdf5File, path: string, layout: SampleLayout): Hdf5Channels | Refusal {
  const base = path === '/' ? '' : path;
  const datasets = file
    .names(path, false)
    .slice(0, mostObjects)
    .map((name) => `${base}/${name}`)
    .filter((child) => file.kind(child) === 'dataset')
    .map((child) => file.dataset(child))
    .filter((dataset) => typeof dataset !== 'string')
    .filter(({ sides }) => sides.length === 1);
  const [first] = datasets;
  if (first === undefined)
    return unsupported(`${printable(path)}: a group without data sets of one dimension`);
  if (datasets.length > mostChannels)
    return unsupported(
      `${printable(path)}: ${datasets.length} data sets, more than ${mostChannels} channels`,
    );
  for (const { path: other, sides, number } of datasets) {
    if (sides[0] !== first.sides[0])
      return unsupported(
        `${printable(other)} has ${sides[0]} values, ${printable(first.path)} ${first.sides[0]}; channels of one recording are equally long`,
      );
    if (samplesOf(number) !== samplesOf(first.number))
      return unsupported(
        `${printable(other)} and ${printable(first.path)}: integers beside floats in one recording`,
      );
  }
  const paths = datasets.map((dataset) => dataset.path);
  const names = paths.map((child) => nameAndUnit(child.slice(base.length + 1)).name);
  return {
    datasets,
    shape: { frames: first.sides[0] as number, channels: datasets.length, channelsIn: 'columns' },
    names: distinctNames(names),
    units: paths.map((child) => unitOf(file, child)),
    samples: samplesOf(first.number),
    ...rateOf(file, paths, layout),
  };
}

/** The attribute at the data sets, which then agree, or at the nearest group above them. */
function rateOf(
  file: Hdf5File,
  paths: readonly string[],
  { sampleRateAttribute: name }: SampleLayout,
): Pick<Hdf5Channels, 'sampleRateHz' | 'remarks'> {
  if (name === null) return { sampleRateHz: null, remarks: [] };
  const none = (remark: string) => ({ sampleRateHz: null, remarks: [remark] });
  const own = paths.map((path) => file.attribute(path, name));
  const [first = null] = own;
  const shownName = printable(name);
  if (own.some((value) => value !== first))
    return none(`its data sets differ in ${shownName}, no sample rate is taken from it`);
  const value = first ?? above(file, paths[0] as string, name);
  if (value === null)
    return none(`no attribute ${shownName} of one number at ${printable(paths[0] as string)} or above it`);
  const rateHz = typeof value === 'string' && value !== '' ? Number(value) : value;
  if (typeof rateHz !== 'number' || !(rateHz > 0 && Number.isFinite(rateHz)))
    return none(`its attribute ${shownName} is no sample rate in Hz`);
  return { sampleRateHz: rateHz, remarks: [] };
}

function above(file: Hdf5File, path: string, name: string): number | string | null {
  for (let group = path; group !== '/'; ) {
    group = group.slice(0, group.lastIndexOf('/')) || '/';
    const value = file.attribute(group, name);
    if (value !== null) return value;
  }
  return null;
}

function unitOf(file: Hdf5File, path: string): string | null {
  for (const name of ['units', 'unit']) {
    const value = file.attribute(path, name);
    if (typeof value === 'string' && value !== '') return printable(value).slice(0, 20);
  }
  return null;
}
