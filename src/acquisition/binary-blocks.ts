import { readFully } from './byte-source.ts';
import type { ByteSource, SampleBlock } from './recording.ts';
import { pickSamples, type SampleNumber, toMachineOrder } from './sample-numbers.ts';

/** Where samples of equal size lie in a file. */
export interface BinarySamples {
  readonly number: SampleNumber;
  /** Of the first sample. */
  readonly offset: number;
  /** That the file promises. */
  readonly frames: number;
  readonly channels: number;
  /** One channel's samples behind each other, rather than one frame's. */
  readonly channelByChannel: boolean;
}

/** Samples of all channels in one block: 1 MiB of numbers, so that channels behind each other are read in long runs. */
const samplesPerBlock = 131_072;
const zeroTailBytes = 4096;
const leastZeroTailBytes = 1024;

/** Frames of which every channel's sample is there, of those that the file promises. */
export function framesHeld({ size }: ByteSource, samples: BinarySamples): number {
  const { number, offset, frames, channels, channelByChannel } = samples;
  const numbers = Math.max(0, Math.floor((size - offset) / number.bytes));
  if (!channelByChannel) return Math.min(frames, Math.floor(numbers / channels));
  return Math.max(0, Math.min(frames, numbers - (channels - 1) * frames));
}

/** Frames in blocks, through two buffers of fixed size; returns how many were given. */
export function* binaryBlocks(source: ByteSource, samples: BinarySamples): Generator<SampleBlock, number> {
  const { channels: channelCount, number } = samples;
  const held = framesHeld(source, samples);
  const blockFrames = Math.min(Math.max(1, Math.floor(samplesPerBlock / channelCount)), Math.max(1, held));
  const bytes = new Uint8Array(blockFrames * channelCount * number.bytes);
  const channels = Array.from({ length: channelCount }, () => new Float64Array(blockFrames));
  let frame = 0;
  while (frame < held) {
    const wanted = Math.min(blockFrames, held - frame);
    const frames = samples.channelByChannel
      ? readChannels(source, samples, frame, wanted, bytes, channels)
      : readFrames(source, samples, frame, wanted, bytes, channels);
    if (frames > 0) {
      const full = frames === blockFrames;
      yield {
        firstFrame: frame,
        frames,
        channels: full ? channels : channels.map((values) => values.subarray(0, frames)),
      };
    }
    frame += frames;
    if (frames < wanted) break;
  }
  return frame;
}

function readFrames(
  source: ByteSource,
  { number, offset }: BinarySamples,
  frame: number,
  wanted: number,
  bytes: Uint8Array,
  channels: readonly Float64Array[],
): number {
  const frameBytes = channels.length * number.bytes;
  const part = bytes.subarray(0, wanted * frameBytes);
  const frames = Math.floor(readFully(source, offset + frame * frameBytes, part) / frameBytes);
  toMachineOrder(part, number);
  for (const [index, values] of channels.entries())
    pickSamples(part, number, { first: index, step: channels.length, count: frames }, values);
  return frames;
}

function readChannels(
  source: ByteSource,
  { number, offset, frames: promised }: BinarySamples,
  frame: number,
  wanted: number,
  bytes: Uint8Array,
  channels: readonly Float64Array[],
): number {
  const part = bytes.subarray(0, wanted * number.bytes);
  let least = wanted;
  for (const [index, values] of channels.entries()) {
    const at = offset + (index * promised + frame) * number.bytes;
    const count = Math.floor(readFully(source, at, part) / number.bytes);
    least = Math.min(least, count);
    toMachineOrder(part, number);
    pickSamples(part, number, { first: 0, step: 1, count }, values);
  }
  return least;
}

/** Whether the last of the `bytes` that begin at `offset` are the zeros of a copy still under way. */
export function endsInZeros(source: ByteSource, offset: number, bytes: number): boolean {
  if (bytes < leastZeroTailBytes) return false;
  const tail = new Uint8Array(Math.min(zeroTailBytes, bytes));
  const count = readFully(source, offset + bytes - tail.length, tail);
  return count < tail.length || tail.every((byte) => byte === 0);
}
