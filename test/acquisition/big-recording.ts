import { wavReader } from '../../src/acquisition/read-wav.ts';
import type { ByteSource } from '../../src/acquisition/recording.ts';
import { isRefusal } from '../../src/acquisition/recording.ts';
import { chunk, fields, fmtPayload, joined, letters } from './wav-writer.ts';

/** A WAV file of any size that is nowhere: header bytes, then 16-bit samples made as they are read. */
export function endlessWav(dataBytes: number, id: 'RIFF' | 'RF64'): ByteSource {
  const wide = id === 'RF64';
  const header = joined(
    letters(id),
    fields(true, [32, wide ? 0xffffffff : dataBytes + 36]),
    letters('WAVE'),
    wide
      ? chunk(true, 'ds64', fields(true, [64, dataBytes + 72], [64, dataBytes], [64, dataBytes / 2], [32, 0]))
      : letters(''),
    chunk(true, 'fmt ', fmtPayload({})),
    letters('data'),
    fields(true, [32, wide ? 0xffffffff : dataBytes]),
  );
  return {
    size: header.length + dataBytes,
    read(offset, into) {
      if (offset >= header.length + dataBytes) return 0;
      if (offset < header.length) {
        const part = header.subarray(offset, offset + into.length);
        into.set(part);
        return part.length;
      }
      const count = Math.min(into.length, header.length + dataBytes - offset);
      // Every sample is 0x0101; what is read must be written, or a reader could leave old bytes unseen.
      into.fill(1, 0, count);
      return count;
    },
  };
}

/** Streams a recording and returns its frames and the most memory that array buffers took meanwhile. */
export function streamed(source: ByteSource): { frames: number; mostBytes: number; right: boolean } {
  const header = wavReader.header(source);
  if (isRefusal(header)) throw new Error(header.reason);
  const before = process.memoryUsage().arrayBuffers;
  let mostBytes = 0;
  let frames = 0;
  let right = true;
  for (const block of wavReader.samples(source, header)) {
    const [values] = block.channels;
    right &&= values[0] === 257 / 32_768 && values[block.frames - 1] === 257 / 32_768;
    frames += block.frames;
    mostBytes = Math.max(mostBytes, process.memoryUsage().arrayBuffers - before);
  }
  return { frames, mostBytes, right };
}
