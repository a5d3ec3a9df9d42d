import { bytesSource } from '../../src/acquisition/byte-source.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SamplesEnd,
} from '../../src/acquisition/recording.ts';
import type { SampleLayout } from '../../src/config/sample-layout.ts';

export interface Whole {
  readonly header: RecordingHeader;
  readonly channels: number[][];
  readonly end: SamplesEnd | Refusal;
  readonly blocks: number;
}

/** Reads a recording whole and checks what every block promises. Throws where the header is a refusal. */
export function readAll(
  reader: RecordingReader,
  file: Uint8Array | ByteSource,
  layout?: SampleLayout,
): Whole {
  const source = file instanceof Uint8Array ? bytesSource(file) : file;
  const header = reader.header(source, layout);
  if (isRefusal(header)) throw new Error(`refused: ${header.reason}`);
  const channels: number[][] = header.channelNames.map(() => []);
  const blocks = reader.samples(source, header, layout);
  let count = 0;
  let frames = 0;
  for (;;) {
    const step = blocks.next();
    if (step.done) return { header, channels, end: step.value, blocks: count };
    const block = step.value;
    count++;
    if (block.firstFrame !== frames)
      throw new Error(`block begins at frame ${block.firstFrame}, not ${frames}`);
    if (block.frames < 1 || block.channels.some((channel) => channel.length !== block.frames)) {
      throw new Error('a block whose channels have other lengths than it says');
    }
    frames += block.frames;
    for (const [index, channel] of block.channels.entries()) {
      for (const value of channel) channels[index].push(value);
    }
  }
}

/** The samples of a file that must be whole. */
export function wholeChannels(reader: RecordingReader, file: Uint8Array): number[][] {
  const { channels, end } = readAll(reader, file);
  if (isRefusal(end)) throw new Error(`refused: ${end.reason}`);
  if (end.truncated !== null) throw new Error(`truncated: ${end.truncated}`);
  return channels;
}

/** The one line by which a file is refused, by its header or its samples. */
export function refusalOf(reader: RecordingReader, file: Uint8Array, layout?: SampleLayout): Refusal | null {
  const source = bytesSource(file);
  const header = reader.header(source, layout);
  if (isRefusal(header)) return header;
  const { end } = readAll(reader, file, layout);
  return isRefusal(end) ? end : null;
}

/** Gives at most `most` bytes a read, as pipes and network shares do. */
export function shortReads(bytes: Uint8Array, most: number): ByteSource {
  const source = bytesSource(bytes);
  return { size: source.size, read: (offset, into) => source.read(offset, into.subarray(0, most)) };
}
