import { type Parsed, refused, understood } from './quantity.ts';

/**
 * Where the samples stand in a file that may hold many things, or hold them in more than one order; null: not said.
 * Points that take one file agree on it.
 */
export interface SampleLayout {
  /** HDF5: path of the data set, or of the group whose data sets are the channels. */
  readonly dataset: string | null;
  /** HDF5: name of the attribute that gives the sample rate in Hz; at the data set or at a group above it. */
  readonly sampleRateAttribute: string | null;
  /** Arrays of two dimensions: whether a channel is a column (samples x channels) or a row (channels x samples). */
  readonly channelsIn: 'columns' | 'rows' | null;
}

export const nothingSaid: SampleLayout = { dataset: null, sampleRateAttribute: null, channelsIn: null };

export function sameLayout(one: SampleLayout, other: SampleLayout): boolean {
  return (
    one.dataset === other.dataset &&
    one.sampleRateAttribute === other.sampleRateAttribute &&
    one.channelsIn === other.channelsIn
  );
}

/** From the root on, so that it reads the same whatever stands above it. */
export function parseDatasetPath(text: string): Parsed<string> {
  const path = text.trim();
  if (!path.startsWith('/')) return refused(`'${path}' does not begin at the root of the file`, `/${path}`);
  return understood(path.length > 1 ? path.replace(/\/+$/, '') : path);
}
