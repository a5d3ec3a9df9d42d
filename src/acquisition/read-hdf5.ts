import { nothingSaid, type SampleLayout } from '../config/sample-layout.ts';
import { readHead } from './byte-source.ts';
import { type Hdf5Channels, hdf5Channels, printable } from './hdf5-channels.ts';
import { type Hdf5Dataset, type Hdf5File, Hdf5Trouble, openHdf5 } from './hdf5-file.ts';
import { discardHdf5, prepareHdf5 } from './hdf5-library.ts';
import { beginsHdf5, hdf5SignatureAt, hdf5Superblock } from './hdf5-superblock.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
} from './recording.ts';
import { pickSamples } from './sample-numbers.ts';

/**
 * HDF5: one data set of one or two dimensions, or the data sets of a group as channels; floats of 32, 64 bits, integers;
 * in one run or in chunks, with the library's own filters (gzip, shuffle, checksum, scale and offset). The site file says
 * which data set and where the sample rate stands. Memory: the library's heap is bounded, a chunk to 32 MiB, one step
 * through all channels to as many samples. Reports: damaged (with the library's innermost reason), unsupported (which
 * data set is not said, numbers or filters that are not read, chunks beyond the bound); a file that is shorter than its
 * superblock says, or still open for writing, is not complete.
 */
export const hdf5Reader: RecordingReader = {
  format: 'HDF5',
  recognise,
  prepare: prepareHdf5,
  header,
  samples,
};

const samplesPerStep = 131_072;
const mostStepSamples = 4_194_304;
const mostChunkBytes = 33_554_432;
/** Deflate makes a thousandth of what is all the same, and not less. */
const mostCompression = 1100;
/** Samples of all channels in one block. */
const samplesPerBlock = 16_384;

function recognise(head: Uint8Array, fileName: string): boolean {
  if (hdf5SignatureAt(head) >= 0) return true;
  if (!/\.(h5|hdf5|hdf|he5)$/i.test(fileName)) return false;
  return beginsHdf5(head) || head.every((byte) => byte === 0);
}

/** Why nothing can be read of it yet; null where it is all there. */
function unfinished(source: ByteSource): string | Refusal | null {
  const at = hdf5SignatureAt(readHead(source));
  if (at < 0) return 'the file ends within its first bytes';
  const block = hdf5Superblock(source, at);
  if (block === null) return 'the file ends within its superblock, or its writer has not closed it';
  if (isRefusal(block)) return block;
  if (block.endsAt > source.size)
    return `the file ends at byte ${source.size}, its superblock promises ${block.endsAt}`;
  return block.openForWriting ? 'its writer has not closed it' : null;
}

function header(source: ByteSource, layout: SampleLayout = nothingSaid): RecordingHeader | Refusal {
  const missing = unfinished(source);
  if (missing !== null && typeof missing !== 'string') return missing;
  const channels = missing === null ? channelsOf(source, layout) : null;
  if (channels !== null && isRefusal(channels)) return channels;
  return {
    format: hdf5Reader.format,
    sampleRateHz: channels?.sampleRateHz ?? null,
    channelNames: channels?.names ?? [],
    channelUnits: channels?.units ?? [],
    samples: channels?.samples ?? 'number',
    framesClaimed: channels?.shape.frames ?? null,
    complete: channels !== null,
    start: null,
    remarks: missing === null ? (channels?.remarks ?? []) : [missing],
  };
}

function channelsOf(source: ByteSource, layout: SampleLayout): Hdf5Channels | Refusal {
  try {
    const file = openHdf5(source);
    const channels = readable(file, layout, source.size);
    file.close();
    return channels;
  } catch (error) {
    discardHdf5();
    return refusalOf(error);
  }
}

function readable(file: Hdf5File, layout: SampleLayout, size: number): Hdf5Channels | Refusal {
  const channels = hdf5Channels(file, layout);
  if (isRefusal(channels)) return channels;
  return beyondBounds(channels, size) ?? channels;
}

function refusalOf(error: unknown): Refusal {
  if (!(error instanceof Hdf5Trouble)) throw error;
  if (error.message.includes('external raw data file'))
    return { refused: 'unsupported', reason: 'its samples lie in another file, which is not followed' };
  return { refused: 'damaged', reason: `the HDF5 library cannot read it: ${error.message}` };
}

function beyondBounds({ datasets, shape }: Hdf5Channels, size: number): Refusal | null {
  const { frames, channels } = shape;
  if (frames === 0) return { refused: 'unsupported', reason: 'the data set is empty' };
  for (const dataset of datasets) {
    const { path, number, sides, chunk, strangeFilter } = dataset;
    if (strangeFilter !== null)
      return {
        refused: 'unsupported',
        reason: `${printable(path)}: packed with ${printable(strangeFilter)}; save it with gzip or uncompressed`,
      };
    const chunkBytes = (chunk ?? []).reduce((product, side) => product * side, number.bytes);
    if (chunkBytes > mostChunkBytes)
      return {
        refused: 'unsupported',
        reason: `${printable(path)}: chunks of ${chunkBytes} bytes; at most ${mostChunkBytes} are read: save it in smaller chunks`,
      };
    const bytes = sides.reduce((product, side) => product * side, number.bytes);
    if (bytes > (chunk === null ? 1 : mostCompression) * size)
      return {
        refused: 'damaged',
        reason: `${printable(path)}: promises ${bytes} bytes, the file has ${size}`,
      };
  }
  const step = stepFrames(datasets, shape);
  if (step * channels > mostStepSamples)
    return {
      refused: 'unsupported',
      reason: `chunks of ${step} samples of ${channels} channels; at most ${mostStepSamples} samples are read at a time: save it in smaller chunks`,
    };
  return null;
}

/** Frames that are read at a time: whole chunks, so that none is unpacked twice. */
function stepFrames(
  datasets: readonly Hdf5Dataset[],
  { frames, channels, channelsIn }: Hdf5Channels['shape'],
): number {
  const side = channelsIn === 'columns' ? 0 : 1;
  const chunkFrames = Math.max(1, ...datasets.map(({ chunk }) => chunk?.[side] ?? 1));
  const chunks = Math.max(1, Math.floor(samplesPerStep / channels / chunkFrames));
  return Math.min(frames, chunks * chunkFrames);
}

function* samples(
  source: ByteSource,
  _header: RecordingHeader,
  layout: SampleLayout = nothingSaid,
): Generator<SampleBlock, SamplesEnd | Refusal> {
  const missing = unfinished(source);
  if (typeof missing === 'string')
    return { refused: 'damaged', reason: `${missing}; copy or record it again` };
  if (missing !== null) return missing;
  let closed = false;
  try {
    const file = openHdf5(source);
    const channels = readable(file, layout, source.size);
    const end = isRefusal(channels) ? channels : yield* allFrames(file, channels);
    file.close();
    closed = true;
    return end;
  } catch (error) {
    return refusalOf(error);
  } finally {
    // Failed, or left half way: nothing of this instance is trusted any more.
    if (!closed) discardHdf5();
  }
}

function* allFrames(file: Hdf5File, { datasets, shape }: Hdf5Channels): Generator<SampleBlock, SamplesEnd> {
  const { frames, channels: channelCount } = shape;
  const step = stepFrames(datasets, shape);
  const channels = Array.from({ length: channelCount }, () => new Float64Array(step));
  const most = Math.max(1, Math.floor(samplesPerBlock / channelCount));
  for (let at = 0; at < frames; at += step) {
    const count = Math.min(step, frames - at);
    readStep(file, datasets, shape, at, count, channels);
    for (let from = 0; from < count; from += most) {
      const to = Math.min(count, from + most);
      yield {
        firstFrame: at + from,
        frames: to - from,
        channels: channels.map((values) => values.subarray(from, to)),
      };
    }
  }
  return { frames, truncated: null, timeStepDeviation: null, measuredRateHz: null };
}

function readStep(
  file: Hdf5File,
  datasets: readonly Hdf5Dataset[],
  { channelsIn }: Hdf5Channels['shape'],
  at: number,
  count: number,
  channels: readonly Float64Array[],
): void {
  const [array] = datasets as [Hdf5Dataset];
  if (array.sides.length === 1) {
    for (const [index, dataset] of datasets.entries()) {
      const bytes = file.read(dataset, [at], [count]);
      pickSamples(bytes, dataset.number, { first: 0, step: 1, count }, channels[index] as Float64Array);
    }
    return;
  }
  const columns = channelsIn === 'columns';
  const bytes = columns
    ? file.read(array, [at, 0], [count, channels.length])
    : file.read(array, [0, at], [channels.length, count]);
  for (const [index, values] of channels.entries()) {
    const places = columns ? { first: index, step: channels.length } : { first: index * count, step: 1 };
    pickSamples(bytes, array.number, { ...places, count }, values);
  }
}
