import { nothingSaid, type SampleLayout } from '../config/sample-layout.ts';
import { arrayShape } from './array-shape.ts';
import { type BinarySamples, binaryBlocks, endsInZeros, framesHeld } from './binary-blocks.ts';
import { npyHeader, npyMagic } from './npy-header.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
} from './recording.ts';
import { samplesOf } from './sample-numbers.ts';

/**
 * NumPy array files (NEP 1, versions 1 to 3): floats of 32, 64 bits, integers of 8 to 64 bits in either byte order, C or
 * Fortran order, one dimension or two. They carry neither rate, unit nor start. Memory is two buffers of fixed size.
 * Reports: damaged (the header makes no sense), unsupported (other numbers, a shape that leaves the channels open),
 * truncated (frames that are not there are told, the ones ahead given).
 */
export const npyReader: RecordingReader = { format: 'NPY', recognise, header, samples };

function recognise(head: Uint8Array, fileName: string): boolean {
  const begun = head.subarray(0, npyMagic.length);
  if (begun.length === npyMagic.length && npyMagic.every((byte, at) => head[at] === byte)) return true;
  if (!/\.npy$/i.test(fileName)) return false;
  // Only just being written, or its space reserved first.
  return begun.every((byte, at) => byte === npyMagic[at]) || head.subarray(0, 12).every((byte) => byte === 0);
}

/** Null where the header is not all there yet. */
function arrayOf(source: ByteSource, { channelsIn }: SampleLayout): BinarySamples | Refusal | null {
  const head = npyHeader(source);
  if (head === null || 'refused' in head) return head;
  const { number, fortranOrder, shape: sides, dataOffset } = head;
  const shape = arrayShape(sides, channelsIn, 'the array');
  if (isRefusal(shape)) return shape;
  const { frames, channels } = shape;
  if (frames === 0) return { refused: 'unsupported', reason: 'the array is empty: no samples were saved' };
  if (!Number.isSafeInteger(frames * channels * number.bytes + dataOffset)) {
    return {
      refused: 'damaged',
      reason: `header: a shape of ${sides.join(' x ')} is more than any file holds`,
    };
  }
  const channelByChannel = channels > 1 && (shape.channelsIn === 'rows') !== fortranOrder;
  return { number, offset: dataOffset, frames, channels, channelByChannel };
}

function header(source: ByteSource, layout: SampleLayout = nothingSaid): RecordingHeader | Refusal {
  if (isReserved(source)) return unfinished(['only zero bytes yet']);
  const array = arrayOf(source, layout);
  if (array === null) return unfinished(['the header is not all there yet']);
  if (isRefusal(array)) return array;
  const { number, offset, frames, channels } = array;
  const bytes = frames * channels * number.bytes;
  const whole = source.size - offset >= bytes;
  const zeroTail = whole && endsInZeros(source, offset, bytes);
  const remarks: string[] = [];
  if (!whole)
    remarks.push(`the header promises ${bytes} bytes of samples, ${source.size - offset} are there`);
  else if (source.size - offset > bytes)
    remarks.push(`${source.size - offset - bytes} bytes behind the samples are left out`);
  if (zeroTail) remarks.push('the samples end in zeros: perhaps not copied yet');
  return {
    format: npyReader.format,
    sampleRateHz: null,
    channelNames: Array.from({ length: channels }, (_, index) => String(index + 1)),
    channelUnits: Array.from({ length: channels }, () => null),
    samples: samplesOf(number),
    framesClaimed: frames,
    complete: whole && !zeroTail,
    ...(zeroTail ? { zeroTail } : {}),
    start: null,
    remarks,
  };
}

function unfinished(remarks: readonly string[]): RecordingHeader {
  return {
    format: npyReader.format,
    sampleRateHz: null,
    channelNames: [],
    channelUnits: [],
    samples: 'number',
    framesClaimed: null,
    complete: false,
    start: null,
    remarks,
  };
}

function isReserved(source: ByteSource): boolean {
  const first = new Uint8Array(12);
  source.read(0, first);
  return first.every((byte) => byte === 0);
}

function* samples(
  source: ByteSource,
  _header: RecordingHeader,
  layout: SampleLayout = nothingSaid,
): Generator<SampleBlock, SamplesEnd | Refusal> {
  const array = isReserved(source) ? null : arrayOf(source, layout);
  if (array === null)
    return { refused: 'damaged', reason: `the file ends at byte ${source.size}, within its header` };
  if (isRefusal(array)) return array;
  const { frames: promised } = array;
  const held = framesHeld(source, array);
  const given = yield* binaryBlocks(source, array);
  const truncated =
    given < held
      ? `the file shrank to ${given} frames while it was read`
      : held < promised
        ? `the file ends at byte ${source.size}: ${held} of ${promised} promised frames are there`
        : null;
  return { frames: given, truncated, timeStepDeviation: null, measuredRateHz: null };
}
