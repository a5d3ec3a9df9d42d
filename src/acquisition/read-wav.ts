import { readFully } from './byte-source.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
} from './recording.ts';
import { type WavData, type WavLayout, walkWav } from './wav-chunks.ts';
import type { WavFormat } from './wav-format.ts';
import { frameDecoder } from './wav-samples.ts';

/** Samples of all channels in one block: 128 KiB of numbers out, which stay in the processor's cache while they are used. */
export const samplesPerBlock = 16_384;

const topIds = ['RIFF', 'RIFX', 'RF64', 'BW64'];
const zeroTailBytes = 4096;
const leastZeroTailBytes = 1024;

/**
 * WAV (RIFF, RIFX, RF64, BW64): PCM of 8, 16, 24, 32 bits, float of 32, 64 bits. Memory is two buffers of fixed
 * size whatever the header says. Reports: foreign (not a WAVE file), damaged (broken header, offset named),
 * unsupported (another sample format), truncated (the file ends early; the frames ahead of it are given).
 */
export const wavReader: RecordingReader = { format: 'WAV', recognise, header, samples };

function recognise(head: Uint8Array, fileName: string): boolean {
  const letters = String.fromCharCode(...head.subarray(0, 12));
  if (letters.length === 12) {
    if (topIds.includes(letters.slice(0, 4)) && letters.endsWith('WAVE')) return true;
  } else if (letters.length >= 4 && topIds.includes(letters.slice(0, 4))) {
    return true;
  }
  // A file that is only just being written, or whose space was reserved first, is known by its name alone.
  const begun = head.length < 4 || head.subarray(0, 12).every((byte) => byte === 0);
  return begun && /\.(wav|wave|bwf|rf64)$/i.test(fileName);
}

function header(source: ByteSource): RecordingHeader | Refusal {
  const layout = walkWav(source, 'end');
  if (isRefusal(layout)) return layout;
  const { format, data, start } = layout;
  const remarks = [...layout.remarks];
  if (layout.missing !== null) remarks.push(layout.missing);
  const channels = format?.channels ?? 0;
  const fill = format === null || data === null ? 'short' : fillOf(source, format, data, remarks);
  const claimed = data?.claimedBytes ?? null;
  return {
    format: wavReader.format,
    sampleRateHz: format?.sampleRateHz ?? null,
    channelNames: Array.from({ length: channels }, (_, index) => String(index + 1)),
    channelUnits: Array.from({ length: channels }, () => null),
    samples: format?.encoding === 'float' ? 'number' : 'integer',
    framesClaimed: format === null || claimed === null ? null : Math.floor(claimed / format.frameBytes),
    complete: fill === 'whole',
    ...(fill === 'zero tail' ? { zeroTail: true } : {}),
    start,
    remarks,
  };
}

/** Whole: all promised bytes are there, and the last of them are not the zeros of a copy still under way. */
function fillOf(
  source: ByteSource,
  format: WavFormat,
  data: WavData,
  remarks: string[],
): 'whole' | 'short' | 'zero tail' {
  const held = Math.max(0, source.size - data.offset);
  const bytes = data.claimedBytes ?? held;
  if (bytes > held) {
    remarks.push(`the header promises ${bytes} bytes of samples, ${held} are there`);
    return 'short';
  }
  if (bytes < format.frameBytes) {
    remarks.push('no samples yet');
    return 'short';
  }
  if (bytes < leastZeroTailBytes) return 'whole';
  const tail = new Uint8Array(Math.min(zeroTailBytes, bytes));
  const count = readFully(source, data.offset + bytes - tail.length, tail);
  if (count < tail.length) return 'short';
  if (!tail.every((byte) => byte === 0)) return 'whole';
  remarks.push(`the last ${tail.length} bytes of samples are zero: perhaps not copied yet`);
  return 'zero tail';
}

function* samples(source: ByteSource): Generator<SampleBlock, SamplesEnd | Refusal> {
  // Not beyond the samples' beginning: the file shall be read once, from front to back.
  const layout = walkWav(source, 'data');
  if (isRefusal(layout)) return layout;
  const { format, data } = layout;
  if (format === null || data === null) {
    return { refused: 'damaged', reason: `${layout.missing}; the recording was cut short, record again` };
  }
  return yield* decodedBlocks(source, layout, format, data);
}

function* decodedBlocks(
  source: ByteSource,
  layout: WavLayout,
  format: WavFormat,
  data: WavData,
): Generator<SampleBlock, SamplesEnd> {
  const { frameBytes } = format;
  const held = Math.max(0, source.size - data.offset);
  const usable = Math.min(held, data.claimedBytes ?? held);
  const framesHeld = Math.floor(usable / frameBytes);
  const blockFrames = Math.min(Math.floor(samplesPerBlock / format.channels), Math.max(1, framesHeld));
  const bytes = new Uint8Array(blockFrames * frameBytes);
  const channels = Array.from({ length: format.channels }, () => new Float64Array(blockFrames));
  const decode = frameDecoder(format, layout.bigEndian);

  let frame = 0;
  while (frame < framesHeld) {
    const wanted = Math.min(blockFrames, framesHeld - frame);
    const count = readFully(source, data.offset + frame * frameBytes, bytes.subarray(0, wanted * frameBytes));
    const frames = Math.floor(count / frameBytes);
    if (frames > 0) {
      decode(bytes, frames, channels);
      yield {
        firstFrame: frame,
        frames,
        channels: frames === blockFrames ? channels : channels.map((values) => values.subarray(0, frames)),
      };
    }
    frame += frames;
    if (frames < wanted) return ended(frame, `the file shrank to ${frame} frames while it was read`);
  }
  const promised = data.claimedBytes;
  if (promised !== null && promised > held) {
    const all = Math.floor(promised / frameBytes);
    return ended(frame, `the file ends at byte ${source.size}: ${frame} of ${all} promised frames are there`);
  }
  const rest = usable - framesHeld * frameBytes;
  if (rest === 0) return ended(frame, null);
  const at = data.offset + framesHeld * frameBytes;
  return ended(frame, `the last frame at byte ${at} has ${rest} of ${frameBytes} bytes, dropped`);
}

function ended(frames: number, truncated: string | null): SamplesEnd {
  return { frames, truncated, timeStepDeviation: null, measuredRateHz: null };
}
